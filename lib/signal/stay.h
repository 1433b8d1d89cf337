/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stay.h: one stay in one place: what belongs to it alone, and goes or comes back with it. */
#ifndef SM_SIGNAL_STAY_H
#define SM_SIGNAL_STAY_H
#include <stdbool.h>
#include <stdint.h>

#include "signal/bins.h"
#include "signal/signal.h"
#include "signal/window.h"

/* A departure as the latest of a way: is the next one a part of it? */
struct sm_going {
    int64_t t_ns;
    double direction; /* -1, 1; 0 = any (an arrival out of the air, or out of nothing) */
    double before;    /* level before it, u */
};

struct sm_stay {
    enum sm_mark_by by;
    int64_t moved_t_ns;    /* when it began, as told */
    int64_t anchor_t_ns;   /* its readings begin here; later than moved_t_ns when a slow start went
                            * on */
    int64_t dwell_t_ns;    /* the dwell counts from here: the anchor, or the end of a lift */
    int64_t swift_t_ns;    /* the latest reading in which a departure may hide (front.h): nothing is
                            * captured within a dwell of it */
    int64_t way_from_t_ns; /* by value or transit: when the way that led here began */
    bool way_open;         /* … and an open circuit was in it, seen so: */
    enum sm_transit_how way_how;
    struct sm_going going; /* the latest that led here */
    unsigned lifts;
    int64_t lift_t_ns; /* return from the latest of them, */
    double lift_level; /* and the level at which it was left */
    bool captured;
    bool given_up;                     /* the longest wait is over */
    double value, u95;                 /* captured */
    unsigned n;                        /* readings */
    int64_t first_t_ns;                /* the first of them */
    struct sm_signal_reading first[3]; /* and the first three */
    struct sm_bins bins;
    struct sm_window window;
};

/* An empty stay whose dwell begins at t_ns. */
void sm_stay_begin(struct sm_stay *s, int64_t t_ns, int64_t bin_ns);
/* The same stay counts from t_ns on: what came before is dropped. */
void sm_stay_again(struct sm_stay *s, int64_t t_ns, int64_t bin_ns);
void sm_stay_add(struct sm_stay *s, const struct sm_signal_reading *r, int64_t over_ns);
#endif
