/* SPDX-License-Identifier: GPL-3.0-or-later */
/* blocks.c: departures seen in means over short blocks. */
#include "signal/blocks.h"

#include <math.h>
#include <string.h>

#define AHEAD 1.2      /* a settling signal only slows down; a fifth for what is not quite so */
#define CERTAIN 6.0    /* times the noise: no accident */
#define STEPS 1.5      /* display steps that a mean may jump by rounding alone */
#define TOLERANCES 6.0 /* more than this is a departure whatever the noise: air never rests */

void sm_blocks_init(struct sm_blocks *b, int64_t width_ns, int64_t most_ahead_ns)
{
    *b = (struct sm_blocks){ .width_ns = width_ns, .most_ahead_ns = most_ahead_ns };
    sm_noise_init(&b->noise, 0);
}

void sm_blocks_restart(struct sm_blocks *b)
{
    b->filled = b->n_last = 0;
}

/* Blocks that met at their edges have no spacing to divide by: never less than a quarter of a
 * block. */
static double apart_s(const struct sm_blocks *b, unsigned i)
{
    return fmax(b->last[i].t_s - b->last[i + 1].t_s, 0.25e-9 * (double)b->width_ns);
}

static double slope(const struct sm_blocks *b, unsigned i)
{
    return (b->last[i].mean - b->last[i + 1].mean) / apart_s(b, i);
}

bool sm_blocks_slope(const struct sm_blocks *b, double *ret_u_per_s)
{
    if (b->n_last < 2)
        return false;
    *ret_u_per_s = slope(b, 0);
    return true;
}

/* Closes the block now filled: last[0] is it. */
static void close_block(struct sm_blocks *b)
{
    const double n = b->filled;

    memmove(&b->last[1], &b->last[0], (SM_BLOCKS_KEPT - 1) * sizeof b->last[0]);
    b->last[0] = (struct sm_block){ b->sum_t / n, b->reference + b->sum_x / n, b->filled };
    if (b->n_last < SM_BLOCKS_KEPT)
        b->n_last++;
    b->filled = 0;
    if (b->n_last >= 3)
        sm_noise_add(&b->noise, b->last[0].mean, apart_s(b, 0), b->last[1].mean, apart_s(b, 1),
                     b->last[2].mean);
}

/* Has the signal sped up in last[0]? */
static bool sped_up(const struct sm_blocks *b, double tolerance, double step, double sd,
                    struct sm_block_step *ret_step)
{
    const double dt = fmin(apart_s(b, 0), 1e-9 * (double)b->most_ahead_ns);
    const double change = b->last[0].mean - b->last[1].mean;
    const double noise = fmax(b->noise.sd, sd / sqrt(b->last[0].n));
    const double floor = fmax(tolerance, STEPS * step);
    const double more = fmax(floor, fmin(CERTAIN * noise, TOLERANCES * tolerance));
    double down = 0, up = 0;

    for (unsigned i = 1; i + 1 < b->n_last; i++) {
        const double s = slope(b, i);

        down = fmin(down, s);
        up = fmax(up, s);
    }
    if (change <= up * dt * AHEAD + more && change >= down * dt * AHEAD - more)
        return false;
    *ret_step = (struct sm_block_step){
        .level = b->last[0].mean,
        .before = b->last[1].mean,
        .slope_u_per_s = slope(b, 1),
        .noise = noise,
    };
    return true;
}

bool sm_blocks_add(struct sm_blocks *b, int64_t t_ns, double x, double tolerance, double step,
                   double sd, struct sm_block_step *ret_step)
{
    bool departed = false;

    if (b->filled == 0 && b->n_last == 0) {
        b->origin_t_ns = t_ns;
        b->at = 0;
    }
    if (b->filled > 0 && (t_ns - b->origin_t_ns) / b->width_ns > b->at) {
        close_block(b);
        if (b->n_last >= 3 && sped_up(b, tolerance, step, sd, ret_step)) {
            ret_step->from_t_ns = b->origin_t_ns + b->at * b->width_ns;
            departed = true;
        }
    }
    if (b->filled == 0) {
        b->at = (t_ns - b->origin_t_ns) / b->width_ns;
        b->sum_t = b->sum_x = 0;
        b->reference = x;
    }
    b->filled++;
    b->sum_t += 1e-9 * (double)(t_ns - b->origin_t_ns);
    b->sum_x += x - b->reference;
    return departed;
}
