/* SPDX-License-Identifier: GPL-3.0-or-later */
/* halves.h: how far the end may still be, by two half-windows: the mean of the second half of the
 * stay against that of the quarter before it. A person can check it with a calculator. */
#ifndef SM_SIGNAL_HALVES_H
#define SM_SIGNAL_HALVES_H
#include <stdbool.h>

#include "signal/bins.h"

struct sm_halves {
    double mean;                     /* of the bins in [T/2, T], u */
    double difference;               /* of that and the mean in [T/4, T/2), u */
    double var_mean, var_difference; /* by the noise, u² */
};

/* sd: of a reading, from second differences. False: too few closed bins to say anything. */
bool sm_halves_of(const struct sm_bins *b, double sd, struct sm_halves *ret_halves);

/* What may still be to come at most: 2.41 |difference|. */
double sm_halves_to_come(const struct sm_halves *h);

/* That, and k times the noise and the step (step_u: its standard uncertainty): |mean - end| is
 * below it at about 95 % for k = 2. */
double sm_halves_bound(const struct sm_halves *h, double k, double step_u);
#endif
