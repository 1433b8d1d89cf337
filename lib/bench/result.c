/* SPDX-License-Identifier: GPL-3.0-or-later */
/* result.c: a capture read off an accepted curve. */
#include "bench/result.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define K95 1.96 /* a capture's U95 over its standard uncertainty */

const char *sm_result_state_name(enum sm_result_state s)
{
    static const char *const names[] = { "provisional", "released", "held", "amended", "voided" };

    return names[s];
}

/* |dy/dx| of the curve at x. */
static double sensitivity(const struct sm_curve *c, double x, double t_c)
{
    if (c->model == SM_MODEL_NERNST)
        return fabs(c->slope_fraction) * sm_nernst_mv(t_c);
    if (c->model == SM_MODEL_QUADRATIC)
        return fabs(c->coefficient[1].value + 2 * c->coefficient[2].value * x);
    return fabs(c->coefficient[c->n_coefficients - 1].value);
}

/* Outside the standards there is no number, only what would bring it inside. */
static void outside(const struct sm_method *m, const struct sm_curve *c, bool below,
                    struct sm_made_result *r)
{
    struct sm_text t;
    const char *unit = sm_unit_name(m->measures);

    snprintf(r->shown, sizeof r->shown, below ? "< %.6g" : "> %.6g", below ? c->x_from : c->x_to);
    r->held = !below || m->measures == SM_UNIT_PH;
    sm_text_init(&t, r->why, sizeof r->why);
    if (below && r->held)
        sm_text_addf(&t,
                     "below the lowest standard, %.6g %s: calibrate with a lower standard and "
                     "measure it again",
                     c->x_from, unit);
    else if (r->held && m->measures == SM_UNIT_PH)
        sm_text_addf(&t,
                     "above the highest standard, %.6g %s: calibrate with a higher standard and "
                     "measure it again",
                     c->x_to, unit);
    else if (r->held)
        sm_text_addf(&t, "above the highest standard, %.6g %s: dilute it and measure it again",
                     c->x_to, unit);
}

void sm_result_make(const struct sm_method *m, const struct sm_curve *curve, double signal,
                    double u95_signal, bool has_t, double t_c, double mean_u2,
                    struct sm_made_result *ret_result)
{
    struct sm_made_result *r = ret_result;
    struct sm_read_off read;
    double u_signal2, slope;

    memset(r, 0, sizeof *r);
    if (curve->model == SM_MODEL_NERNST && !has_t) {
        r->held = true;
        sm_text_copy(r->why, sizeof r->why,
                     "its temperature is not known: type it and measure it again");
        return;
    }
    if (sm_curve_read(curve, signal, 1, t_c, &read) != SM_OK || !isfinite(read.x)) {
        r->held = true;
        sm_text_copy(r->why, sizeof r->why, "the curve gives no value for this reading");
        return;
    }
    if (!read.between_standards) {
        outside(m, curve, read.x < curve->x_from, r);
        return;
    }
    slope = sensitivity(curve, read.x, t_c);
    u_signal2 = (u95_signal / K95) * (u95_signal / K95) +
                fmax(0, curve->residual_sd * curve->residual_sd - mean_u2);
    r->has_value = true;
    r->value = read.x;
    r->u95 = sm_t95(curve->dof) *
             sqrt(read.curve_uncertainty * read.curve_uncertainty + u_signal2 / (slope * slope));
}
