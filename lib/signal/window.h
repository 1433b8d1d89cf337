/* SPDX-License-Identifier: GPL-3.0-or-later */
/* window.h: the latest readings of a stay over a span of time, with their least and largest at
 * hand. Storage is fixed at creation. Each reading is kept by itself as long as there is room; when
 * a meter sends more than that, neighbours are put together by twos, so that every reading still
 * counts and only the window's edge gets coarser (by a 1024th of it). O(1) a reading, amortised. */
#ifndef SM_SIGNAL_WINDOW_H
#define SM_SIGNAL_WINDOW_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "signal/signal.h"

#define SM_WINDOW_GROUPS 2048

struct sm_group {
    int64_t first_t_ns, last_t_ns;
    uint32_t n;
    double mean, m2, lo, hi; /* m2: sum of squared distances from the mean */
};

struct sm_other_group {
    uint32_t n; /* 0: absent or too old */
    double mean, lo, hi;
};

struct sm_queue { /* groups that may yet be the least (or the largest) */
    uint64_t at[SM_WINDOW_GROUPS];
    uint64_t head, tail; /* of the queue, counted for ever */
};

struct sm_window {
    size_t n_others;
    uint64_t first, end; /* groups first … end - 1, counted for ever */
    uint32_t per_group;  /* readings put together */
    struct sm_queue least, largest;
    struct sm_group group[SM_WINDOW_GROUPS];
    struct sm_other_group *other; /* [SM_WINDOW_GROUPS * n_others], the caller's */
};

struct sm_window_sum {
    unsigned n;
    int64_t from_t_ns, to_t_ns;
    double mean, sd; /* sd: n - 1 below; 0 for one reading */
    struct sm_maybe other_mean[SM_OTHERS_MAX], other_range[SM_OTHERS_MAX];
};

void sm_window_begin(struct sm_window *w);

/* Takes a reading; those earlier than over_ns before it leave. */
void sm_window_add(struct sm_window *w, const struct sm_signal_reading *r, int64_t over_ns);

double sm_window_least(const struct sm_window *w);   /* not empty */
double sm_window_largest(const struct sm_window *w); /* not empty */

/* Over all in it, oldest to newest; not empty. O(n). */
void sm_window_sum(const struct sm_window *w, struct sm_window_sum *ret_sum);
#endif
