/* SPDX-License-Identifier: GPL-3.0-or-later */
/* inside.h: what the files of the core share. Private to lib/core. */
#ifndef SM_CORE_INSIDE_H
#define SM_CORE_INSIDE_H
#include "base/time.h"
#include "bench/judge.h"
#include "bench/result.h"
#include "core/core.h"
#include "reading/ask.h"
#include "reading/flood.h"
#include "reading/parse.h"

#define SM_QUEUE 16 /* events that one step can bring, at most */

/* How far the input lent by sm_core_feed is worked through. */
enum sm_stage {
    SM_STAGE_IDLE,
    SM_STAGE_BEGIN,
    SM_STAGE_LINES,
    SM_STAGE_ASK,
    SM_STAGE_READING,
    SM_STAGE_END
};

#define SM_T_MOST_NS (INT64_MAX / 4) /* of any time or age here: sums and differences fit */

/* The stay in one solution, as the bench sees it. */
struct sm_immersion {
    bool begun; /* a `moved` came */
    bool given; /* to item run.next (until captured) */
    bool captured, not_settled;
    bool marked; /* began by a mark */
    bool early;  /* the probe was here when the sheet was handed over */
    int64_t moved_n, began_t_ns, settled_t_ns;
    struct sm_whereabouts where;
    char why_not_given[SM_REASON_SIZE];
};

struct sm_core {
    const struct sm_core_setup *setup;
    const struct sm_method *method; /* in force */
    bool has_sheet;
    struct sm_sheet *sheet;
    struct sm_carried *now, *shown; /* the state; the copy that a `carried` event lends */
    int64_t curve_born_t_ns, rest_born_t_ns, temperature_born_t_ns; /* negative: before this file */

    /* bytes to readings */
    struct sm_framer framer;
    struct sm_asker asker;
    struct sm_flood flood;
    struct sm_parser *parser;
    bool link_up, silent;
    int64_t link_t_ns, last_reading_t_ns; /* SM_NEVER: none since the link was up */
    uint64_t unread;
    int signal_at, temperature_at; /* channels; -1 none */
    struct {
        bool has;
        double value;
        int64_t t_ns;
    } latest[SM_CHANNELS_MAX];
    struct sm_reading held_reading; /* waits while the mark of its line is worked through */

    /* readings to captures */
    struct sm_signal *signal;
    struct sm_immersion immersion;
    int64_t mark_of;   /* n of the act behind a mark under way; 0: the meter's own key */
    bool marked;       /* item run.next was marked in this turn of its */
    bool open_circuit; /* told, and nothing since */
    bool in_air;       /* the latest reading said so */

    /* captures to results */
    bool curve_good;
    struct sm_curve curve;
    double mean_u2; /* mean squared standard uncertainty of the standards' captures, signal unit */

    /* feed and drain */
    struct sm_input in;
    enum sm_stage stage;
    bool dirty; /* `carried` is due */
    bool answer_due;
    struct sm_event_answer answer;
    int64_t last_n, change_n; /* newest number; newest capture, question or change of item */
    struct sm_event *queue;   /* [SM_QUEUE] */
    size_t q_head, q_n;
};

/* A new event at the end of the queue, numbered unless live; its part of the union is zero. */
struct sm_event *sm_core_push(struct sm_core *c, enum sm_event_kind kind);

/* lines.c */
void sm_core_line(struct sm_core *c, const struct sm_line *line);
void sm_core_reading(struct sm_core *c, const struct sm_reading *r);
void sm_core_link(struct sm_core *c, const struct sm_link *link);
void sm_core_ask(struct sm_core *c, enum sm_question_kind kind);
void sm_core_check_silence(struct sm_core *c);

/* immersion.c */
void sm_core_signal_event(struct sm_core *c, const struct sm_signal_event *e);
void sm_core_signal_end(struct sm_core *c, const char *why);
/* Nobody knows any more where the probe is. */
void sm_core_lost_track(struct sm_core *c);
/* The probe may be in item run.next, in the one after it or elsewhere: only a mark goes on. */
void sm_core_unsure(struct sm_core *c);
/* STILL, LEFT or NEW: where the signal has the probe. */
struct sm_signal_start sm_core_place(const struct sm_core *c);
void sm_core_where(const struct sm_core *c, size_t item, struct sm_whereabouts *ret_where);

/* measured.c */
void sm_core_captured(struct sm_core *c, const struct sm_settled *s);
void sm_core_hold_provisional(struct sm_core *c, int64_t check_n, const char *why);
/* The temperature that belongs to a capture; false: not known. */
bool sm_core_temperature(const struct sm_core *c, const struct sm_settled *s, double *ret_c,
                         const char **ret_how);

/* calibrate.c */
void sm_core_on_standard(struct sm_core *c, struct sm_event_capture *cap, int64_t n);
void sm_core_refit(struct sm_core *c);
/* Item i (from 0) of the sheet was skipped: the row of standards may be complete with that. */
void sm_core_skipped(struct sm_core *c, size_t i);
/* The standard of an item; NULL: none. Its lot has expired by now? */
const struct sm_standard *sm_core_standard(const struct sm_core *c, const struct sm_item *i);
bool sm_core_expired(const struct sm_core *c, const struct sm_standard *s);
/* What an item's standard is worth now, at t_c (NaN: unknown). False: nothing, ret_why. */
bool sm_core_value(const struct sm_core *c, const struct sm_item *item, double t_c,
                   double *ret_value, char ret_why[SM_REASON_SIZE]);
/* The curve that may give results now; NULL: none, ret_why says why. */
const struct sm_curve *sm_core_curve(const struct sm_core *c, char ret_why[SM_REASON_SIZE]);

/* acts.c */
void sm_core_act(struct sm_core *c, const struct sm_act *act);
/* The method at index i is in force from now. */
enum sm_status sm_core_use_method(struct sm_core *c, size_t i);
#endif
