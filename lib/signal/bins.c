/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bins.c: the readings of one stay in at most 64 bins. */
#include "signal/bins.h"

#include <assert.h>
#include <string.h>

void sm_bins_begin(struct sm_bins *b, int64_t anchor_t_ns, int64_t width_ns)
{
    assert(width_ns > 0);
    memset(b, 0, sizeof *b);
    b->anchor_t_ns = anchor_t_ns;
    b->width_ns = width_ns;
}

static void merge_pairs(struct sm_bins *b)
{
    for (size_t i = 0; i < SM_BINS / 2; i++) {
        const struct sm_bin *first = &b->bin[2 * i], *second = &b->bin[2 * i + 1];

        b->bin[i] = (struct sm_bin){ first->n + second->n, first->sum_t + second->sum_t,
                                     first->sum_x + second->sum_x };
    }
    memset(&b->bin[SM_BINS / 2], 0, SM_BINS / 2 * sizeof b->bin[0]);
    b->width_ns *= 2;
    b->open /= 2;
}

bool sm_bins_add(struct sm_bins *b, int64_t t_ns, double x)
{
    const int64_t since_ns = t_ns - b->anchor_t_ns;
    struct sm_bin *bin;
    bool closed;

    assert(since_ns >= 0);
    if (!b->any)
        b->reference = x;
    b->any = true;
    while (since_ns / b->width_ns >= SM_BINS)
        merge_pairs(b);
    closed = (size_t)(since_ns / b->width_ns) > b->open;
    b->open = (size_t)(since_ns / b->width_ns);
    bin = &b->bin[b->open];
    bin->n++;
    bin->sum_t += 1e-9 * (double)since_ns;
    bin->sum_x += x - b->reference;
    return closed;
}

double sm_bins_span_s(const struct sm_bins *b)
{
    return 1e-9 * (double)b->width_ns * (double)b->open;
}
