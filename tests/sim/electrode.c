/* SPDX-License-Identifier: GPL-3.0-or-later */
/* electrode.c: see electrode.h. */
#include "sim/electrode.h"

#include <math.h>

static const double gas_j_per_mol_k = 8.31446261815324;
static const double faraday_c_per_mol = 96485.3321233100184;

static double thermal_mv(double celsius) /* RT/F */
{
    return 1000 * gas_j_per_mol_k * (celsius + 273.15) / faraday_c_per_mol;
}

double sm_sim_electrode_nernst_mv(double celsius)
{
    return log(10.0) * thermal_mv(celsius);
}

double sm_sim_electrode_signal(const struct sm_sim_electrode *e, double value, double celsius)
{
    switch (e->kind) {
    case SM_SIM_ELECTRODE_PH:
        return e->offset - e->slope * sm_sim_electrode_nernst_mv(celsius) * (value - 7);
    case SM_SIM_ELECTRODE_LOG:
        return e->offset + e->slope * sm_sim_electrode_nernst_mv(celsius) * log10(value);
    case SM_SIM_ELECTRODE_LINE:
        return e->offset + e->slope * value;
    case SM_SIM_ELECTRODE_NONE:
        break;
    }
    return value;
}

const char *sm_sim_response_name(enum sm_sim_response_kind k)
{
    static const char *const name[SM_SIM_RESPONSE_COUNT] = { "exponential", "double", "hyperbolic",
                                                             "sqrt", "layer" };
    return name[k];
}

double sm_sim_response_left(const struct sm_sim_response *r, double step, double t_s)
{
    const double x = t_s / r->fast_s;

    switch (r->kind) {
    case SM_SIM_RESPONSE_DOUBLE:
        return step * ((1 - r->share) * exp(-x) + r->share * exp(-t_s / r->slow_s));
    case SM_SIM_RESPONSE_HYPERBOLIC:
        return step / (1 + x);
    case SM_SIM_RESPONSE_SQRT:
        return step / (1 + sqrt(x));
    case SM_SIM_RESPONSE_LAYER: {
        const double k = thermal_mv(20);
        return k * log1p(expm1(step / k) * exp(-x));
    }
    case SM_SIM_RESPONSE_EXPONENTIAL:
    case SM_SIM_RESPONSE_COUNT:
        break;
    }
    return step * exp(-x);
}

/* The double exponential may overshoot and cross its end: walk back from a time by which both parts
 * are surely gone to the last moment outside, then halve. */
static double double_settle_s(const struct sm_sim_response *r, double step, double tolerance)
{
    const int grid = 20000;
    const double slowest = fmax(r->fast_s, r->slow_s);
    const double most = fabs(step) * (fabs(1 - r->share) + fabs(r->share));
    if (most <= tolerance)
        return 0;
    double in = slowest * log(most / tolerance);
    const double pace = in / grid;
    int at = grid - 1;

    while (at >= 0 && fabs(sm_sim_response_left(r, step, at * pace)) <= tolerance)
        at--;
    if (at < 0)
        return 0;
    double out = at * pace;
    in = (at + 1) * pace;
    for (int i = 0; i < 60; i++) {
        const double middle = 0.5 * (in + out);
        if (fabs(sm_sim_response_left(r, step, middle)) <= tolerance)
            in = middle;
        else
            out = middle;
    }
    return in;
}

double sm_sim_response_settle_s(const struct sm_sim_response *r, double step, double tolerance)
{
    const double times = fabs(step) / tolerance;

    if (r->kind == SM_SIM_RESPONSE_DOUBLE)
        return double_settle_s(r, step, tolerance);
    if (times <= 1)
        return 0;
    switch (r->kind) {
    case SM_SIM_RESPONSE_HYPERBOLIC:
        return r->fast_s * (times - 1);
    case SM_SIM_RESPONSE_SQRT:
        return r->fast_s * (times - 1) * (times - 1);
    case SM_SIM_RESPONSE_LAYER: {
        const double k = thermal_mv(20);
        return r->fast_s * log(expm1(step / k) / expm1(copysign(tolerance, step) / k));
    }
    case SM_SIM_RESPONSE_EXPONENTIAL:
    case SM_SIM_RESPONSE_DOUBLE:
    case SM_SIM_RESPONSE_COUNT:
        break;
    }
    return r->fast_s * log(times);
}
