/* SPDX-License-Identifier: GPL-3.0-or-later */
/* prescribed.c: a capture by a rule that asks "is it flat now?" and makes no probability of its
 * own. Scatter alone covers the truth in few captures by such rules, so what may still be to come
 * is bounded by the half-windows, and the larger counts. */
#include "signal/judge.h"

#include <math.h>
#include <string.h>

#include "signal/halves.h"
#include "signal/noise.h"

#define K 2.0 /* about 95 % */

void sm_prescribed(const struct sm_judge *j, struct sm_settled *ret_settled)
{
    const double step_u = sm_step_uncertainty(j->step, j->sd);
    struct sm_settled *s = ret_settled;
    struct sm_window_sum sum;
    struct sm_halves halves;
    double mean_u;

    sm_window_sum(&j->stay->window, &sum);
    mean_u = sum.sd / sqrt(sum.n);
    memset(s, 0, sizeof *s);
    s->value = sum.mean;
    s->u95 = K * sqrt(mean_u * mean_u + step_u * step_u);
    s->part[SM_PART_NOISE] = (struct sm_maybe){ true, K * mean_u };
    if (j->step > 0)
        s->part[SM_PART_STEP] = (struct sm_maybe){ true, K * step_u };
    if (sm_halves_of(&j->stay->bins, j->sd, &halves)) {
        s->part[SM_PART_TO_COME] = (struct sm_maybe){ true, sm_halves_to_come(&halves) };
        s->u95 = fmax(s->u95, sm_halves_bound(&halves, K, step_u));
    }
    s->from_t_ns = sum.from_t_ns;
    s->to_t_ns = sum.to_t_ns;
    s->readings = sum.n;
    s->lifts = j->stay->lifts;
    s->sd = sum.sd;
    s->step = j->step;
    s->since_moved_ns = j->t_ns - j->stay->moved_t_ns;
    s->rule = j->rule->kind;
    s->prescribed = true;
    s->tolerance = j->rule->tolerance[j->class];
    memcpy(s->other_mean, sum.other_mean, sizeof s->other_mean);
    memcpy(s->other_range, sum.other_range, sizeof s->other_range);
}
