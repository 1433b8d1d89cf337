/* SPDX-License-Identifier: GPL-3.0-or-later */
/* clock.c: stamps and what they tell when compared with the ones before. */
#include "clock.h"

#include "base/time.h"

#define UTC_FIRST_US INT64_C(-62167219200000000) /* 0000-01-01, the first that can be written */
#define UTC_LAST_US INT64_C(253402300799999999)  /* 9999-12-31 */

static int64_t ns_of(const struct timespec *ts)
{
    return (int64_t)ts->tv_sec * SM_NS_PER_S + ts->tv_nsec;
}

void sm_clock_init(struct sm_clock *c, const struct sm_door *door)
{
    *c = (struct sm_clock){ .door = door };
}

static int64_t utc_of(const struct timespec *ts)
{
    if ((int64_t)ts->tv_sec >= UTC_LAST_US / 1000000)
        return UTC_LAST_US;
    if ((int64_t)ts->tv_sec <= UTC_FIRST_US / 1000000)
        return UTC_FIRST_US;
    return (int64_t)ts->tv_sec * 1000000 + ts->tv_nsec / 1000;
}

static int64_t beyond(int64_t difference_us)
{
    return difference_us > SM_CLOCK_STEP_US || difference_us < -SM_CLOCK_STEP_US ? difference_us
                                                                                 : 0;
}

enum sm_status sm_clock_stamp(struct sm_clock *c, struct sm_now *ret_now)
{
    struct timespec boot, mono, real;
    struct sm_now now = { 0 };
    int64_t mono_ns;

    if (c->door->clock(c->door, CLOCK_BOOTTIME, &boot) < 0 ||
        c->door->clock(c->door, CLOCK_MONOTONIC, &mono) < 0 ||
        c->door->clock(c->door, CLOCK_REALTIME, &real) < 0) {
        if (c->started) {
            *ret_now = c->last;
            ret_now->jump_us = ret_now->asleep_us = 0;
        }
        return SM_EIO;
    }
    now.boot_ns = ns_of(&boot);
    now.utc_us = utc_of(&real);
    mono_ns = ns_of(&mono);
    if (c->started) {
        if (now.boot_ns < c->last.boot_ns)
            now.boot_ns = c->last.boot_ns;
        const int64_t passed_ns = now.boot_ns - c->last.boot_ns;
        now.jump_us = beyond(now.utc_us - c->last.utc_us - passed_ns / 1000);
        now.asleep_us = beyond((passed_ns - (mono_ns - c->mono_ns)) / 1000);
        if (now.asleep_us < 0)
            now.asleep_us = 0;
    }
    c->started = true;
    c->last = now;
    c->mono_ns = mono_ns;
    *ret_now = now;
    return SM_OK;
}
