/* SPDX-License-Identifier: GPL-3.0-or-later */
/* window.c: the latest readings over a span of time. */
#include "signal/window.h"

#include <assert.h>
#include <math.h>
#include <string.h>

static size_t slot(uint64_t at)
{
    return (size_t)(at % SM_WINDOW_GROUPS);
}

void sm_window_begin(struct sm_window *w)
{
    w->first = w->end = 0;
    w->per_group = 1;
    w->least.head = w->least.tail = 0;
    w->largest.head = w->largest.tail = 0;
}

/* Group `at` is new, or has grown: what can no longer be the least behind it leaves. */
static void queue_least(struct sm_window *w, uint64_t at)
{
    struct sm_queue *q = &w->least;

    while (q->tail > q->head &&
           (q->at[slot(q->tail - 1)] == at ||
            w->group[slot(q->at[slot(q->tail - 1)])].lo >= w->group[slot(at)].lo))
        q->tail--;
    q->at[slot(q->tail++)] = at;
}

static void queue_largest(struct sm_window *w, uint64_t at)
{
    struct sm_queue *q = &w->largest;

    while (q->tail > q->head &&
           (q->at[slot(q->tail - 1)] == at ||
            w->group[slot(q->at[slot(q->tail - 1)])].hi <= w->group[slot(at)].hi))
        q->tail--;
    q->at[slot(q->tail++)] = at;
}

static void drop_first(struct sm_window *w)
{
    w->first++;
    while (w->least.head < w->least.tail && w->least.at[slot(w->least.head)] < w->first)
        w->least.head++;
    while (w->largest.head < w->largest.tail && w->largest.at[slot(w->largest.head)] < w->first)
        w->largest.head++;
}

/* a takes in b, which came after it. Means by the pairwise update (Chan, Golub, LeVeque). */
static void join(struct sm_group *a, const struct sm_group *b)
{
    const double n = (double)a->n + b->n, apart = b->mean - a->mean;

    a->m2 += b->m2 + apart * apart * a->n * b->n / n;
    a->mean += apart * b->n / n;
    a->n += b->n;
    a->lo = fmin(a->lo, b->lo);
    a->hi = fmax(a->hi, b->hi);
    a->last_t_ns = b->last_t_ns;
}

static void join_other(struct sm_other_group *a, const struct sm_other_group *b)
{
    if (a->n == 0) {
        *a = *b;
    } else if (b->n > 0) {
        a->mean += (b->mean - a->mean) * b->n / ((double)a->n + b->n);
        a->n += b->n;
        a->lo = fmin(a->lo, b->lo);
        a->hi = fmax(a->hi, b->hi);
    }
}

static struct sm_other_group *others(const struct sm_window *w, uint64_t at)
{
    return &w->other[slot(at) * w->n_others];
}

/* Twice as many readings in each group: half the room. */
static void put_together(struct sm_window *w)
{
    const uint64_t first = w->first, end = w->end;
    uint64_t to = first;

    for (uint64_t from = first; from < end; from += 2, to++) {
        w->group[slot(to)] = w->group[slot(from)];
        for (size_t i = 0; i < w->n_others; i++)
            others(w, to)[i] = others(w, from)[i];
        if (from + 1 == end)
            continue;
        join(&w->group[slot(to)], &w->group[slot(from + 1)]);
        for (size_t i = 0; i < w->n_others; i++)
            join_other(&others(w, to)[i], &others(w, from + 1)[i]);
    }
    w->end = to;
    w->per_group *= 2;
    w->least.head = w->least.tail = 0;
    w->largest.head = w->largest.tail = 0;
    for (uint64_t at = w->first; at < w->end; at++) {
        queue_least(w, at);
        queue_largest(w, at);
    }
}

void sm_window_add(struct sm_window *w, const struct sm_signal_reading *r, int64_t over_ns)
{
    const struct sm_group one = { .first_t_ns = r->t_ns,
                                  .last_t_ns = r->t_ns,
                                  .n = 1,
                                  .mean = r->value,
                                  .lo = r->value,
                                  .hi = r->value };
    uint64_t at;
    bool fresh;

    while (w->first < w->end && r->t_ns - w->group[slot(w->first)].last_t_ns > over_ns)
        drop_first(w);
    fresh = w->first == w->end || w->group[slot(w->end - 1)].n >= w->per_group;
    if (fresh && w->end - w->first == SM_WINDOW_GROUPS)
        put_together(w);
    at = fresh ? w->end++ : w->end - 1;
    if (fresh)
        w->group[slot(at)] = one;
    else
        join(&w->group[slot(at)], &one);
    for (size_t i = 0; i < w->n_others; i++) {
        const struct sm_other *o = &r->other[i];
        const bool good = o->present && o->age_ns <= SM_OTHER_OLDEST_NS && isfinite(o->value);
        const struct sm_other_group g = { good, o->value, o->value, o->value };

        if (fresh)
            others(w, at)[i] = g;
        else
            join_other(&others(w, at)[i], &g);
    }
    queue_least(w, at);
    queue_largest(w, at);
}

double sm_window_least(const struct sm_window *w)
{
    assert(w->least.head < w->least.tail);
    return w->group[slot(w->least.at[slot(w->least.head)])].lo;
}

double sm_window_largest(const struct sm_window *w)
{
    assert(w->largest.head < w->largest.tail);
    return w->group[slot(w->largest.at[slot(w->largest.head)])].hi;
}

void sm_window_sum(const struct sm_window *w, struct sm_window_sum *ret_sum)
{
    struct sm_group all;
    double sum = 0, m2 = 0;

    assert(w->first < w->end);
    all = w->group[slot(w->first)];
    memset(ret_sum, 0, sizeof *ret_sum);
    ret_sum->from_t_ns = all.first_t_ns;
    ret_sum->to_t_ns = w->group[slot(w->end - 1)].last_t_ns;
    for (uint64_t at = w->first; at < w->end; at++) {
        const struct sm_group *g = &w->group[slot(at)];

        ret_sum->n += g->n;
        sum += g->n * (g->mean - all.mean);
    }
    ret_sum->mean = all.mean + sum / ret_sum->n;
    for (uint64_t at = w->first; at < w->end; at++) {
        const struct sm_group *g = &w->group[slot(at)];

        m2 += g->m2 + g->n * (g->mean - ret_sum->mean) * (g->mean - ret_sum->mean);
    }
    ret_sum->sd = ret_sum->n > 1 ? sqrt(m2 / (ret_sum->n - 1)) : 0;
    for (size_t i = 0; i < w->n_others; i++) {
        struct sm_other_group o = { 0, 0, 0, 0 };

        for (uint64_t at = w->first; at < w->end; at++)
            join_other(&o, &others(w, at)[i]);
        if (o.n > 0) {
            ret_sum->other_mean[i] = (struct sm_maybe){ true, o.mean };
            ret_sum->other_range[i] = (struct sm_maybe){ true, o.hi - o.lo };
        }
    }
}
