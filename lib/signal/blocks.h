/* SPDX-License-Identifier: GPL-3.0-or-later */
/* blocks.h: means over short blocks of time, which show a slow start that single readings hide in
 * their noise. The grid begins with the first reading. Pure, O(1) a reading. */
#ifndef SM_SIGNAL_BLOCKS_H
#define SM_SIGNAL_BLOCKS_H
#include <stdbool.h>
#include <stdint.h>

#include "signal/noise.h"

#define SM_BLOCKS_KEPT 4

struct sm_block {
    double t_s, mean; /* mean time since the grid's origin, s; u */
    unsigned n;
};

struct sm_blocks {
    int64_t width_ns, most_ahead_ns; /* a slope tells no further ahead than that */
    int64_t origin_t_ns;
    int64_t at;          /* index on the grid of the block now filled */
    unsigned filled;     /* readings in it */
    double sum_t, sum_x; /* s since the origin; u above the reference */
    double reference;
    struct sm_block last[SM_BLOCKS_KEPT]; /* closed ones, the newest first */
    unsigned n_last;
    struct sm_noise noise; /* of block means, from their second differences */
};

/* What the newest closed block says when the signal has sped up in it. */
struct sm_block_step {
    int64_t from_t_ns;    /* the block's start */
    double level, before; /* means of it and of the one before */
    double slope_u_per_s; /* before it; 0 when unknown */
    double noise;         /* sd of a block mean */
};

void sm_blocks_init(struct sm_blocks *b, int64_t width_ns, int64_t most_ahead_ns);
/* The signal was lost or is another one: no block before now is compared. Noise is kept. */
void sm_blocks_restart(struct sm_blocks *b);

/* Takes a reading. True when a block was closed by it and lies outside what a settling signal,
 * which only slows down, may do. sd: of a reading.
 */
bool sm_blocks_add(struct sm_blocks *b, int64_t t_ns, double x, double tolerance, double step,
                   double sd, struct sm_block_step *ret_step);

/* Slope between the last two closed blocks. False: there are no two. */
bool sm_blocks_slope(const struct sm_blocks *b, double *ret_u_per_s);
#endif
