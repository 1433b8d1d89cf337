/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bins.h: all readings of one stay in at most 64 bins of equal width. When a 65th is needed, pairs
 * are merged and the width doubles, so the cost is O(1) a reading and the memory fixed however long
 * the stay. Only closed bins are to be used. */
#ifndef SM_SIGNAL_BINS_H
#define SM_SIGNAL_BINS_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define SM_BINS 64

struct sm_bin {
    uint32_t n;
    double sum_t; /* s since the anchor */
    double sum_x; /* u above the reference */
};

struct sm_bins {
    int64_t anchor_t_ns, width_ns;
    size_t open;      /* the bin now filled; those below it are closed */
    double reference; /* the first value: sums stay small */
    bool any;
    struct sm_bin bin[SM_BINS];
};

void sm_bins_begin(struct sm_bins *b, int64_t anchor_t_ns, int64_t width_ns); /* width_ns > 0 */

/* t_ns >= the anchor and not earlier than the last. True when this closed a bin. */
bool sm_bins_add(struct sm_bins *b, int64_t t_ns, double x);

/* Time from the anchor to the end of the last closed bin, s. */
double sm_bins_span_s(const struct sm_bins *b);
#endif
