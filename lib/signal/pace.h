/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pace.h: the time constants of the front end, taken from the dwell.
 *
 * The constants of the method were found at one dwell, 22 s, for rinses of up to 20 s. What they
 * stand for is a share of the dwell: a disturbance must be seen in a small part of it, a lift that
 * is put back must be over well before it. So from a dwell of 22 s on they are what was found there
 * (an electrode does not get slower because a method waits longer), and below it they shrink with
 * it. */
#ifndef SM_SIGNAL_PACE_H
#define SM_SIGNAL_PACE_H
#include <stdint.h>

struct sm_pace {
    int64_t dwell_ns; /* least time in one place */
    int64_t odd_ns;   /* odd readings that span less may still be stray; 1 s */
    int64_t grow_ns;  /* a slope tells no further ahead than this; 5 s */
    int64_t block_ns; /* blocks that catch slow starts; 1 s, a sixth of the dwell at most: a rinse
                       * of half the dwell must hold the three blocks that show its end */
    int64_t bin_ns;   /* bins at first; 0.5 s */
    int64_t worth_ns; /* a stay younger than this is not worth putting back; 6 s */
    int64_t lift_ns;  /* a lift longer than this is not put back; 10 s, half the dwell at most */
    int64_t calm_ns; /* so long without a departure: the way is over. Departures closer than this in
                      * one direction are one going (a slow start seen twice). 2 s, a quarter of the
                      * dwell at most */
    int64_t away_ns; /* after a capture: so long beside the captured value is a departure; 3 s */
};

struct sm_pace sm_pace_of(int64_t dwell_ns); /* dwell_ns >= 0 */
#endif
