/* SPDX-License-Identifier: GPL-3.0-or-later */
/* spread.c: the rule that many procedures prescribe: largest less smallest reading within the
 * tolerance over a time. */
#include "signal/judge.h"

#include <math.h>

#define LEAST_READINGS 3 /* fewer show no spread, however long the gap between them */
/* A spread of just the tolerance counts as within it, whatever the last bits of two decimal numbers
 * make of their difference: relative to the tolerance, and to the readings. */
#define TIE 1e-9
#define TIE_READING 4e-16

bool sm_spread_settled(const struct sm_judge *j, struct sm_settled *ret_settled)
{
    const double tolerance = j->rule->tolerance[j->class];
    const struct sm_window *w = &j->stay->window;
    const double least = sm_window_least(w), largest = sm_window_largest(w);
    const double tie = TIE * tolerance + TIE_READING * fmax(fabs(least), fabs(largest));

    if (j->t_ns - j->stay->first_t_ns < j->rule->over_ns || largest - least > tolerance + tie)
        return false;
    if (w->end - w->first < LEAST_READINGS)
        return false;
    sm_prescribed(j, ret_settled);
    return true;
}
