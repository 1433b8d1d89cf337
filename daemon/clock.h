/* SPDX-License-Identifier: GPL-3.0-or-later */
/* clock.h: the two clocks, stamped once per wake-up, and what they tell when compared: a jump of
 * the wall clock, and time spent suspended. */
#ifndef SM_DAEMON_CLOCK_H
#define SM_DAEMON_CLOCK_H
#include <stdbool.h>
#include <stdint.h>

#include "base/status.h"
#include "door.h"

#define SM_CLOCK_STEP_US INT64_C(500000) /* a smaller difference is no jump (ours) */

struct sm_now {
    int64_t boot_ns; /* CLOCK_BOOTTIME: never steps, counts while suspended; never earlier than
                        before */
    int64_t utc_us;  /* CLOCK_REALTIME */
    int64_t
        jump_us; /* the wall clock was moved since the stamp before, forward positive; 0: was not */
    int64_t asleep_us; /* the machine was suspended for so long since then; 0: was not */
};

struct sm_clock {
    const struct sm_door *door;
    bool started;
    struct sm_now last;
    int64_t mono_ns;
};

void sm_clock_init(struct sm_clock *c, const struct sm_door *door);

/* SM_EIO: a clock could not be read: ret_now is the last stamp again (untouched before the first).
 */
SM_MUST_CHECK enum sm_status sm_clock_stamp(struct sm_clock *c, struct sm_now *ret_now);
#endif
