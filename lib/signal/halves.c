/* SPDX-License-Identifier: GPL-3.0-or-later */
/* halves.c: the half-window bound. */
#include "signal/halves.h"

#include <math.h>

/* What is yet to come over what came between the half-windows, at most: 1 for exponential and
 * hyperbolic tails, 1 / (sqrt 2 - 1) for a square-root-of-time tail. */
#define FACTOR 2.41
#define FLOOR_SD2                                                                                  \
    0.6             /* the scatter of bins is never believed below 0.6 of the noise's variance     \
                     */
#define RHO_LEAST 8 /* bins for which neighbours can be compared */
#define RHO_MOST 0.85

struct sums {
    double n, t, x;
    unsigned bins;
};

static double mean_t(const struct sm_bin *b)
{
    return b->sum_t / b->n;
}

static double mean_x(const struct sm_bin *b)
{
    return b->sum_x / b->n;
}

/* Closed bins with a mean time in [from_s, to_s). */
static struct sums sum(const struct sm_bins *b, double from_s, double to_s)
{
    struct sums s = { 0, 0, 0, 0 };

    for (size_t i = 0; i < b->open; i++) {
        const struct sm_bin *bin = &b->bin[i];

        if (bin->n == 0 || mean_t(bin) < from_s || mean_t(bin) >= to_s)
            continue;
        s.n += bin->n;
        s.t += bin->sum_t;
        s.x += bin->sum_x;
        s.bins++;
    }
    return s;
}

/* Variance of one reading by the scatter of bins about a straight line from from_s on, with what
 * its neighbours have in common; never below what the noise makes. */
static double variance(const struct sm_bins *b, double from_s, double sd)
{
    const struct sums s = sum(b, from_s, INFINITY);
    const double floor = FLOOR_SD2 * sd * sd;
    const double tm = s.t / s.n, xm = s.x / s.n;
    double stt = 0, stx = 0, see = 0, pairs = 0, before = 0, rho = 0, slope;

    if (s.bins < 4)
        return fmax(sd * sd, floor);
    for (size_t i = 0; i < b->open; i++) {
        const struct sm_bin *bin = &b->bin[i];

        if (bin->n == 0 || mean_t(bin) < from_s)
            continue;
        stt += bin->n * (mean_t(bin) - tm) * (mean_t(bin) - tm);
        stx += bin->n * (mean_t(bin) - tm) * (mean_x(bin) - xm);
    }
    slope = stt > 0 ? stx / stt : 0;
    for (size_t i = 0; i < b->open; i++) {
        const struct sm_bin *bin = &b->bin[i];
        double e;

        if (bin->n == 0 || mean_t(bin) < from_s)
            continue;
        e = sqrt(bin->n) * (mean_x(bin) - xm - slope * (mean_t(bin) - tm));
        see += e * e;
        pairs += e * before;
        before = e;
    }
    if (s.bins >= RHO_LEAST && see > 0) {
        rho = pairs / see;
        rho +=
            (1 + 4 * rho) / s.bins; /* the lag-1 coefficient of few residuals comes out too low */
        rho = fmin(fmax(rho, 0), RHO_MOST);
    }
    return fmax(see / (s.bins - 2), floor) * (1 + rho) / (1 - rho);
}

bool sm_halves_of(const struct sm_bins *b, double sd, struct sm_halves *ret_halves)
{
    const double span_s = sm_bins_span_s(b);
    const struct sums late = sum(b, span_s / 2, INFINITY);
    struct sums early = sum(b, span_s / 4, span_s / 2);
    double var;

    if (early.bins == 0) /* a gap there: what there is before it */
        early = sum(b, 0, span_s / 2);
    if (early.bins == 0 || late.bins == 0)
        return false;
    var = variance(b, span_s / 2, sd);
    *ret_halves = (struct sm_halves){
        .mean = b->reference + late.x / late.n,
        .difference = late.x / late.n - early.x / early.n,
        .var_mean = var / late.n,
        .var_difference = var / late.n + var / early.n,
    };
    return true;
}

double sm_halves_to_come(const struct sm_halves *h)
{
    return FACTOR * fabs(h->difference);
}

double sm_halves_bound(const struct sm_halves *h, double k, double step_u)
{
    return sm_halves_to_come(h) +
           k * sqrt(h->var_mean + FACTOR * FACTOR * h->var_difference + step_u * step_u);
}
