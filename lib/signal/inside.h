/* SPDX-License-Identifier: GPL-3.0-or-later */
/* inside.h: what a signal is made of; for this room only.
 *
 *   reading ──► front.c ──► way.c ──────────► stay.c ──► judge.c ──► settled
 *              stray?       lift, transit,    bins,      spread.c …
 *              departure?   moved             window
 *
 * A way is what lies between two stays: it begins with a departure or an open circuit and is over
 * when the new place has been calm for a moment. Only then it is told (transit, moved), so that air
 * and several rinses make one way. Two things are told at once: that the circuit is open, and a
 * first departure after a capture (moved by value). Where a lift might yet be put back (the stay
 * before had no capture) nothing is told until that is decided. No delay is longer than half the
 * dwell, so every capture follows its moved. */
#ifndef SM_SIGNAL_INSIDE_H
#define SM_SIGNAL_INSIDE_H
#include "signal/front.h"
#include "signal/judge.h"
#include "signal/pace.h"
#include "signal/signal.h"
#include "signal/stay.h"

#define SM_SIGNAL_EVENTS 12 /* of one input, at most; one brings out nine at worst */

enum sm_where {
    SM_NOWHERE, /* no usable reading yet, or none since the end: the next one begins anew */
    SM_STAYING, /* in the stay `now`, which has been told */
    SM_LEAVING  /* on a way: `now` is what may become the next stay */
};

struct sm_way {
    int64_t from_t_ns;    /* when it began */
    bool from_known;      /* false: in the file before */
    struct sm_going last; /* latest departure or arrival */
    unsigned goings;      /* departures, each going counted once */
    bool transit;         /* an open circuit was in it */
    enum sm_transit_how how;
    bool kept;                    /* the stay before (not `now`) may be put back */
    int64_t kept_t_ns;            /* when it was left */
    double before, slope_u_per_s; /* its level and slope then */
};

struct sm_signal {
    struct sm_rule rule;
    enum sm_class class;
    struct sm_pace pace;
    struct sm_channel_memory memory;
    struct sm_front front;
    enum sm_where where;
    bool open_circuit; /* now */
    bool open_told;    /* in this way */
    struct sm_way way;
    struct sm_stay stay[2];
    unsigned now; /* which of them; the other is the one kept */
    unsigned clock;
    bool rest;
    int64_t t_ns; /* latest input */
    bool fed;
    struct {
        unsigned n;
        int64_t since_t_ns;
    } away;                /* readings beside the captured value, in a row */
    int64_t settling_t_ns; /* the latest `settling` */
    bool settling_told;
    struct sm_signal_event event[SM_SIGNAL_EVENTS];
    size_t n_events, next_event;
};

static inline struct sm_stay *sm_stay_now(struct sm_signal *s)
{
    return &s->stay[s->now];
}

static inline double sm_tolerance(const struct sm_signal *s)
{
    return s->rule.tolerance[s->class];
}

/* signal.c: a new event of this input. */
struct sm_signal_event *sm_signal_push(struct sm_signal *s, enum sm_signal_kind kind);

/* way.c: what the front end saw, as stays and ways. */
void sm_way_start(struct sm_signal *s, const struct sm_signal_start *start);
void sm_way_departed(struct sm_signal *s, const struct sm_departure *d);
/* A departure from a captured value that no acceleration showed. */
void sm_way_away(struct sm_signal *s, int64_t t_ns, double level);
void sm_way_open(struct sm_signal *s, int64_t t_ns, enum sm_transit_how how);
/* A usable reading is there: the circuit is closed, a first stay begins. */
void sm_way_arrived(struct sm_signal *s, int64_t t_ns);
/* The third reading after an open circuit: back where it was? */
void sm_way_look_back(struct sm_signal *s);
/* A reading of the stay: after a lift, still where it was? */
void sm_way_look_on(struct sm_signal *s, const struct sm_signal_reading *r);
/* Tells the way that is over by t_ns. */
void sm_way_tell(struct sm_signal *s, int64_t t_ns);
void sm_way_mark(struct sm_signal *s, int64_t t_ns);
void sm_way_end(struct sm_signal *s, const char *why);
/* The same, and nothing is said. */
void sm_way_drop(struct sm_signal *s);
#endif
