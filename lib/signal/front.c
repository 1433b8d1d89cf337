/* SPDX-License-Identifier: GPL-3.0-or-later */
/* front.c: stray readings and departures. */
#include "signal/front.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#define AHEAD 1.2           /* as in blocks.c */
#define CERTAIN 6.0         /* times the noise: no accident */
#define ALIKE_BLOCKS 4.0    /* the same for block means, which are quieter */
#define STEPS 3.0           /* display steps that rounding and a neighbour's noise may make */
#define TOLERANCES 10.0     /* more than this is odd whatever the noise: air never rests */
#define STRAY_MOST 3        /* more odd readings in a row are not stray */
#define ODD_OF 16           /* of so many latest readings … */
#define ODD_MOST 6          /* … so many odd ones are no accident, though each came back */
#define QUIET_TIMES 3.0     /* more than this above the quietest is not believed at once */
#define USUAL_WEIGHT 0.0625 /* of a new spacing in the usual one */
#define SPACING_LEAST_S 1e-3

void sm_front_init(struct sm_front *f, struct sm_pace pace, double noise, double step)
{
    memset(f, 0, sizeof *f);
    f->swift_t_ns = INT64_MIN;
    f->quiet = noise;
    sm_noise_init(&f->noise, noise);
    sm_step_init(&f->step, step);
    sm_front_pace(f, pace);
}

void sm_front_pace(struct sm_front *f, struct sm_pace pace)
{
    f->pace = pace;
    sm_blocks_init(&f->blocks, pace.block_ns, pace.grow_ns);
    sm_front_forget(f);
}

void sm_front_drop(struct sm_front *f)
{
    f->n_odd = 0;
    f->odd_bits = 0;
}

void sm_front_forget(struct sm_front *f)
{
    f->n_last = 0;
    f->n_taken = 0;
    sm_front_drop(f);
    sm_blocks_restart(&f->blocks);
}

static double median3(double a, double b, double c)
{
    return fmax(fmin(a, b), fmin(fmax(a, b), c));
}

bool sm_front_level(const struct sm_front *f, double *ret_level)
{
    if (f->n_last == 0)
        return false;
    *ret_level = f->n_last < 3 ? f->last[0].x : median3(f->last[0].x, f->last[1].x, f->last[2].x);
    return true;
}

/* Seconds from one reading to the next, but never less than half the usual: readings that came in
 * one burst have no spacing to divide by. */
static double spacing_s(const struct sm_front *f, int64_t from_t_ns, int64_t to_t_ns)
{
    return fmax(1e-9 * (double)(to_t_ns - from_t_ns), fmax(f->usual_dt_s / 2, SPACING_LEAST_S));
}

static double slope(const struct sm_front *f, unsigned i)
{
    return (f->last[i].x - f->last[i + 1].x) / spacing_s(f, f->last[i + 1].t_ns, f->last[i].t_ns);
}

double sm_front_slope(const struct sm_front *f)
{
    double s;

    if (sm_blocks_slope(&f->blocks, &s))
        return s;
    if (f->n_last < SM_FRONT_LAST)
        return 0;
    return (f->last[0].x - f->last[SM_FRONT_LAST - 1].x) /
           spacing_s(f, f->last[SM_FRONT_LAST - 1].t_ns, f->last[0].t_ns);
}

/* dt_s after the reading before: the noise when the signal was quietest of late, forgotten slowly,
 * so that a noise that came to stay is believed after two or three dwells. A noise too small to
 * matter is taken as the largest that does not. */
static void keep_quiet(struct sm_front *f, double dt_s, double tolerance)
{
    const double dwell_s = fmax(1e-9 * (double)f->pace.dwell_ns, SPACING_LEAST_S);
    const double least = tolerance / (CERTAIN * QUIET_TIMES);

    if (!f->noise.known)
        return;
    if (f->quiet > 0)
        f->quiet = fmin(f->quiet * (1 + fmin(dt_s / dwell_s, 1)), f->noise.sd);
    else
        f->quiet = f->noise.sd;
    f->quiet = fmax(f->quiet, least);
}

/* Restless air is no noise of the meter: the noise as far as it is believed. */
static double quiet_sd(const struct sm_front *f)
{
    return fmin(f->noise.sd, QUIET_TIMES * f->quiet);
}

/* What noise may make of the difference of two readings; as much as can be while it is unknown. */
static double noise_between(const struct sm_front *f, double sd, double tolerance)
{
    const double most = TOLERANCES * tolerance;

    return f->noise.known ? fmin(CERTAIN * sd, most) : most;
}

/* A change from one reading to the next that is none of a signal at rest. The step may have been
 * learned from this very course, so it does not count for more than the tolerance. */
static bool is_swift(const struct sm_front *f, double change, double tolerance)
{
    const double steps = STEPS * fmin(sm_step_now(&f->step), tolerance);

    return fabs(change) > fmax(fmax(tolerance, steps), noise_between(f, quiet_sd(f), tolerance));
}

/* Further from the last accepted reading than a signal that slows down can be? */
static bool is_odd(const struct sm_front *f, const struct sm_signal_reading *r, double tolerance)
{
    const double more = fmax(fmax(tolerance, STEPS * sm_step_now(&f->step)),
                             noise_between(f, f->noise.sd, tolerance));
    double down = 0, up = 0, ahead_s, change;

    if (f->n_last < 2)
        return false; /* nothing to compare a change with */
    for (unsigned i = 0; i + 1 < f->n_last; i++) {
        down = fmin(down, slope(f, i));
        up = fmax(up, slope(f, i));
    }
    ahead_s = AHEAD * fmin(spacing_s(f, f->last[0].t_ns, r->t_ns), 1e-9 * (double)f->pace.grow_ns);
    change = r->value - f->last[0].x;
    return change > up * ahead_s + more || change < down * ahead_s - more;
}

/* Three in a row tell of the noise. */
static void learn(struct sm_front *f, int64_t t_ns, double x, int64_t t1_ns, double x1,
                  int64_t t2_ns, double x2)
{
    sm_noise_add(&f->noise, x, spacing_s(f, t1_ns, t_ns), x1, spacing_s(f, t2_ns, t1_ns), x2);
}

static bool take(struct sm_front *f, const struct sm_signal_reading *r, double tolerance,
                 struct sm_block_step *ret_step)
{
    if (f->n_last > 0 && is_swift(f, r->value - f->last[0].x, tolerance))
        f->swift_t_ns = r->t_ns;
    memmove(&f->last[1], &f->last[0], (SM_FRONT_LAST - 1) * sizeof f->last[0]);
    f->last[0].t_ns = r->t_ns;
    f->last[0].x = r->value;
    if (f->n_last < SM_FRONT_LAST)
        f->n_last++;
    assert(f->n_taken < SM_FRONT_ODD);
    f->taken[f->n_taken++] = *r;
    return sm_blocks_add(&f->blocks, r->t_ns, r->value, tolerance, sm_step_now(&f->step),
                         f->noise.sd, ret_step);
}

/* What was kept back is no accident. It is read once more, now compared only with itself: a rinse
 * and the beaker after it may both be in it. */
static void depart(struct sm_front *f, double tolerance, struct sm_departure *ret_departure)
{
    const size_t n = f->n_odd;
    struct sm_block_step unused;

    *ret_departure = (struct sm_departure){ .t_ns = f->odd[0].t_ns,
                                            .level = f->odd[n - 1].value,
                                            .before = f->last[0].x,
                                            .slope_u_per_s = sm_front_slope(f) };
    (void)sm_front_level(f, &ret_departure->before);
    if (n >= 3)
        ret_departure->level =
            median3(f->odd[n - 1].value, f->odd[n - 2].value, f->odd[n - 3].value);
    for (size_t i = n < 3 ? 0 : n - 3; i < n; i++)
        ret_departure->reach =
            fmax(ret_departure->reach, fabs(f->odd[i].value - ret_departure->level));
    for (size_t i = 2; i < n; i++)
        learn(f, f->odd[i].t_ns, f->odd[i].value, f->odd[i - 1].t_ns, f->odd[i - 1].value,
              f->odd[i - 2].t_ns, f->odd[i - 2].value);
    ret_departure->alike = CERTAIN * fmin(quiet_sd(f), tolerance);
    sm_front_forget(f);
    for (size_t i = 0; i < n; i++) {
        if (is_odd(f, &f->odd[i], tolerance)) {
            f->odd[f->n_odd++] = f->odd[i]; /* n_odd <= i: what is overwritten has been read */
        } else {
            f->n_odd = 0;
            (void)take(f, &f->odd[i], tolerance, &unused);
        }
    }
}

/* The reading is kept back. True: there have been too many for an accident. */
static bool keep_back(struct sm_front *f, const struct sm_signal_reading *r)
{
    unsigned odd = 0;

    assert(f->n_odd < SM_FRONT_ODD);
    f->odd[f->n_odd++] = *r;
    f->odd_bits |= 1;
    for (unsigned i = 0; i < ODD_OF; i++)
        odd += f->odd_bits >> i & 1;
    return (f->n_odd > STRAY_MOST && r->t_ns - f->odd[0].t_ns >= f->pace.odd_ns) ||
           f->n_odd == SM_FRONT_ODD || odd >= ODD_MOST;
}

bool sm_front_reading(struct sm_front *f, const struct sm_signal_reading *r, double tolerance,
                      struct sm_departure *ret_departure)
{
    struct sm_block_step step;

    if (f->seen) {
        const double dt_s = 1e-9 * (double)(r->t_ns - f->seen_t_ns);
        const double usual_s = f->usual_dt_s > 0 ? f->usual_dt_s : dt_s;

        f->usual_dt_s = usual_s + USUAL_WEIGHT * (fmin(dt_s, 4 * usual_s) - usual_s);
        keep_quiet(f, dt_s, tolerance);
    }
    f->seen = true;
    f->seen_t_ns = r->t_ns;
    sm_step_see(&f->step, r->value, r->step);
    f->n_taken = 0;
    f->odd_bits <<= 1;
    if (is_odd(f, r, tolerance)) {
        if (!keep_back(f, r))
            return false;
        depart(f, tolerance, ret_departure);
        return true;
    }
    f->n_odd = 0;
    if (f->n_last >= 2)
        learn(f, r->t_ns, r->value, f->last[0].t_ns, f->last[0].x, f->last[1].t_ns, f->last[1].x);
    if (!take(f, r, tolerance, &step))
        return false;
    *ret_departure = (struct sm_departure){ .t_ns = step.from_t_ns,
                                            .level = step.level,
                                            .before = step.before,
                                            .slope_u_per_s = step.slope_u_per_s,
                                            .alike = ALIKE_BLOCKS * fmin(step.noise, tolerance) };
    return true;
}
