/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_clock.c: jumps and sleep are told apart from time that simply passes. */
#include "check.h"

#include "base/time.h"
#include "clock.h"

struct fake {
    struct sm_door door;
    int64_t boot_ns, mono_ns, utc_us;
    int fails;
};

static int fake_clock(const struct sm_door *d, clockid_t which, struct timespec *ret_ts)
{
    const struct fake *f = (const struct fake *)(const void *)d;
    const int64_t ns = which == CLOCK_REALTIME    ? f->utc_us * 1000
                       : which == CLOCK_MONOTONIC ? f->mono_ns
                                                  : f->boot_ns;

    ret_ts->tv_sec = ns / SM_NS_PER_S;
    ret_ts->tv_nsec = ns % SM_NS_PER_S;
    return f->fails ? -5 : 0;
}

static void pass(struct fake *f, int64_t ns)
{
    f->boot_ns += ns;
    f->mono_ns += ns;
    f->utc_us += ns / 1000;
}

static void jump_and_sleep_are_told_once_with_their_size(void **state)
{
    static const struct {
        const char *name;
        int64_t pass_ns, jump_us, sleep_us, want_jump_us, want_sleep_us;
    } cases[] = { { "time passes", 7 * SM_NS_PER_S, 0, 0, 0, 0 },
                  { "slewed a little", SM_NS_PER_S, 400000, 0, 0, 0 },
                  { "slewed back a little", SM_NS_PER_S, -400000, 0, 0, 0 },
                  { "set forward", SM_NS_PER_S, 3600000000, 0, 3600000000, 0 },
                  { "set back", SM_NS_PER_S, -3600000000, 0, -3600000000, 0 },
                  { "slept", SM_NS_PER_S, 0, 90000000, 0, 90000000 },
                  { "slept and set back", SM_NS_PER_S, -2000000, 90000000, -2000000, 90000000 },
                  { "slept a blink", SM_NS_PER_S, 0, 300000, 0, 0 } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct fake f = { .door = { .clock = fake_clock },
                          .boot_ns = 50 * SM_NS_PER_S,
                          .mono_ns = 40 * SM_NS_PER_S,
                          .utc_us = 1796112723000000 };
        struct sm_clock c;
        struct sm_now now;

        sm_clock_init(&c, &f.door);
        assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
        assert_int_equal(now.jump_us, 0);
        pass(&f, cases[i].pass_ns);
        f.utc_us += cases[i].jump_us + cases[i].sleep_us;
        f.boot_ns += cases[i].sleep_us * 1000;
        assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
        if (now.jump_us != cases[i].want_jump_us || now.asleep_us != cases[i].want_sleep_us)
            fail_msg("%s: jump %lld, want %lld; asleep %lld, want %lld", cases[i].name,
                     (long long)now.jump_us, (long long)cases[i].want_jump_us,
                     (long long)now.asleep_us, (long long)cases[i].want_sleep_us);
        assert_int_equal(now.boot_ns, f.boot_ns);
        assert_int_equal(now.utc_us, f.utc_us);
        pass(&f, SM_NS_PER_S);
        assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
        if (now.jump_us != 0 || now.asleep_us != 0)
            fail_msg("%s: told twice", cases[i].name);
    }
}

static void a_clock_that_fails_or_goes_back_makes_time_stand_still(void **state)
{
    struct fake f = { .door = { .clock = fake_clock },
                      .boot_ns = 50 * SM_NS_PER_S,
                      .mono_ns = 40 * SM_NS_PER_S,
                      .utc_us = 1796112723000000 };
    struct sm_clock c;
    struct sm_now now = { .boot_ns = 7 };

    (void)state;
    sm_clock_init(&c, &f.door);
    f.fails = 1;
    assert_int_equal(sm_clock_stamp(&c, &now), SM_EIO);
    assert_int_equal(now.boot_ns, 7); /* untouched before the first stamp */
    f.fails = 0;
    assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
    f.fails = 1;
    pass(&f, SM_NS_PER_S);
    assert_int_equal(sm_clock_stamp(&c, &now), SM_EIO);
    assert_int_equal(now.boot_ns, 50 * SM_NS_PER_S);
    f.fails = 0;
    f.boot_ns = 49 * SM_NS_PER_S;
    assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
    assert_int_equal(now.boot_ns, 50 * SM_NS_PER_S);
}

static void a_year_that_cannot_be_written_is_held_at_the_last_that_can(void **state)
{
    struct fake f = { .door = { .clock = fake_clock }, .utc_us = INT64_MAX / 1000 };
    struct sm_clock c;
    struct sm_now now;
    char utc[SM_UTC_SIZE];

    (void)state;
    sm_clock_init(&c, &f.door);
    assert_int_equal(sm_clock_stamp(&c, &now), SM_OK);
    assert_int_equal(sm_utc_write(utc, now.utc_us), 27); /* asserts years 0000 to 9999 inside */
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(jump_and_sleep_are_told_once_with_their_size),
        cmocka_unit_test(a_clock_that_fails_or_goes_back_makes_time_stand_still),
        cmocka_unit_test(a_year_that_cannot_be_written_is_held_at_the_last_that_can),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
