/* SPDX-License-Identifier: GPL-3.0-or-later */
/* noise.h: the noise of a reading from second differences, which no trend and few stray readings
 * disturb, and the display step with the uncertainty it leaves. Pure, O(1) a reading. */
#ifndef SM_SIGNAL_NOISE_H
#define SM_SIGNAL_NOISE_H
#include <stdbool.h>

#define SM_NOISE_KEPT 15 /* second differences */
#define SM_NOISE_LEAST 3 /* fewer tell nothing */

struct sm_noise {
    double size[SM_NOISE_KEPT]; /* |second difference|, scaled to the sd of one reading; a ring */
    unsigned n, next;
    double sd;  /* of a reading, u */
    bool known; /* sd comes from readings, or from the memory of the channel */
};

/* before: the sd remembered of this channel, which weighs as much as if all that is kept had said
 * so; 0 = unknown. */
void sm_noise_init(struct sm_noise *n, double before);

/* Three readings in a row, x the newest: x came dt after x1, x1 came dt1 after x2 (any unit, both
 * > 0). */
void sm_noise_add(struct sm_noise *n, double x, double dt, double x1, double dt1, double x2);

/* The display step: the reading's own where it has one, else the smallest change seen. */
struct sm_step {
    double given, learned; /* u; 0 = unknown */
    double last;
    bool has_last;
};

void sm_step_init(struct sm_step *s, double before);
void sm_step_see(struct sm_step *s, double value, double given);
double sm_step_now(const struct sm_step *s); /* u; 0 = unknown */

/* Standard uncertainty that a display step leaves in a mean, u: a still digit hides half a step
 * either way, noise dithers it away. */
double sm_step_uncertainty(double step, double sd);
#endif
