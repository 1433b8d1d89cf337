/* SPDX-License-Identifier: GPL-3.0-or-later */
/* trace.c: settle decisions over a plain recording. */
#include "signal/trace.h"

#include <math.h>
#include <stdlib.h>

#include "signal/signal.h"

#define NS_PER_US 1000

struct sm_trace {
    struct sm_signal *signal;
    double step;        /* smallest so far; 0 unknown */
    int64_t moved_t_ns; /* of the immersion told last */
};

enum sm_status sm_trace_create(const struct sm_rule *rule, struct sm_trace **ret_trace)
{
    const struct sm_channel_memory memory = { .noise = 0 };
    const struct sm_signal_start start = { .place = SM_PLACE_NEW };
    struct sm_trace *t = calloc(1, sizeof *t);
    enum sm_status status;

    if (t == NULL)
        return SM_ENOMEM;
    status = sm_signal_create(rule, 0, &memory, &start, &t->signal);
    if (status != SM_OK)
        free(t);
    else
        *ret_trace = t;
    return status;
}

void sm_trace_destroy(struct sm_trace *t)
{
    if (t == NULL)
        return;
    sm_signal_destroy(t->signal);
    free(t);
}

/* Seconds that print as short as the recording's own. */
static double seconds(int64_t t_ns)
{
    const int64_t t_us = t_ns / NS_PER_US;

    return t_us * NS_PER_US == t_ns ? (double)t_us / 1e6 : (double)t_ns / 1e9;
}

enum sm_status sm_trace_feed(struct sm_trace *t, double time_s, double value, double step,
                             bool *ret_captured, struct sm_trace_row *ret_row)
{
    struct sm_signal_input in = { .kind = SM_SIGNAL_READING };
    struct sm_signal_event e;
    enum sm_status status;

    if (!(fabs(time_s) <= SM_TRACE_TIME_MOST_S))
        return SM_EVALUE;
    in.t_ns = in.reading.t_ns = llround(time_s * 1e6) * NS_PER_US;
    in.reading.value = value;
    in.reading.step = step > 0 && (t->step <= 0 || step < t->step) ? step : t->step;
    status = sm_signal_feed(t->signal, &in);
    if (status != SM_OK)
        return status;
    t->step = in.reading.step;
    *ret_captured = false;
    while (sm_signal_next(t->signal, &e)) {
        if (e.kind == SM_SIGNAL_MOVED)
            t->moved_t_ns = e.from_t_ns;
        if (e.kind != SM_SIGNAL_SETTLED)
            continue;
        *ret_captured = true;
        *ret_row = (struct sm_trace_row){ seconds(t->moved_t_ns), time_s, e.settled.value,
                                          e.settled.u95, e.settled.readings };
    }
    return SM_OK;
}
