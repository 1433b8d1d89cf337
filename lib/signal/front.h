/* SPDX-License-Identifier: GPL-3.0-or-later */
/* front.h: the front end that all rules share. It takes one reading after the other, keeps back
 * those that may be stray, tells departures by their acceleration (a settling signal only slows
 * down), and knows the noise and the display step. Of stays, captures and marks it knows nothing.
 */
#ifndef SM_SIGNAL_FRONT_H
#define SM_SIGNAL_FRONT_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "signal/blocks.h"
#include "signal/noise.h"
#include "signal/pace.h"
#include "signal/signal.h"

#define SM_FRONT_ODD 64 /* readings kept back at most: so many in a row are not stray */
#define SM_FRONT_LAST 4 /* accepted ones remembered: three slopes */

struct sm_departure {
    int64_t t_ns;         /* when it began */
    double level, before; /* after and before, u */
    double reach;         /* how far the readings lie about `level` */
    double slope_u_per_s; /* before */
    double alike;         /* how near two levels are told to be the same by their noise, u */
};

struct sm_front {
    struct sm_pace pace;
    struct sm_noise noise;
    struct sm_step step;
    struct sm_blocks blocks;
    struct {
        int64_t t_ns;
        double x;
    } last[SM_FRONT_LAST]; /* accepted ones, the newest first */
    unsigned n_last;
    double quiet;       /* noise of a reading when the signal was quietest of late, u; 0 unknown */
    int64_t swift_t_ns; /* the latest that was taken only because the signal was swift before it: a
                         * departure may hide in its change; INT64_MIN: none */
    double usual_dt_s;  /* spacing of readings, smoothed */
    int64_t seen_t_ns;  /* the latest reading, odd or not */
    bool seen;
    uint32_t odd_bits; /* the latest readings, a bit each: kept back? */
    struct sm_signal_reading odd[SM_FRONT_ODD];
    size_t n_odd;
    struct sm_signal_reading taken[SM_FRONT_ODD]; /* by the latest call, in order */
    size_t n_taken;
};

void sm_front_init(struct sm_front *f, struct sm_pace pace, double noise, double step);

/* Another method: its time constants from now on, the past forgotten. */
void sm_front_pace(struct sm_front *f, struct sm_pace pace);

/* The signal was lost: the next reading is compared with nothing. Noise and step are kept. */
void sm_front_forget(struct sm_front *f);

/* What was kept back is dropped (a mark: it is from before). */
void sm_front_drop(struct sm_front *f);

/* One usable reading, finite, not earlier than the last. True: a departure was seen. f->taken are
 * the readings that now count: those from the departure on if there was one, none while the reading
 * is kept back. */
bool sm_front_reading(struct sm_front *f, const struct sm_signal_reading *r, double tolerance,
                      struct sm_departure *ret_departure);

/* Median of the last three accepted, or of as many as there are. False: there are none. */
bool sm_front_level(const struct sm_front *f, double *ret_level);
/* Slope before now, u/s; 0 when unknown. */
double sm_front_slope(const struct sm_front *f);
#endif
