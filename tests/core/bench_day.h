/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bench_day.h: a small invented bench for tests of the core: a meter that sends "MV mV T C" lines
 * ten times a second, a probe that is put here and there, and the events that come out. The
 * response is a plain exponential of 0.4 s; nothing of lib/signal is used. */
#ifndef SM_TESTS_BENCH_DAY_H
#define SM_TESTS_BENCH_DAY_H
#include "check.h"

#include "base/time.h"
#include "core/core.h"

#define DAY_KEPT 4000

/* What is kept of an event; the rest is looked at as it comes, through `look`. */
struct day_kept {
    enum sm_event_kind kind;
    int64_t n, t_ns;
    bool has_where;
    size_t item;
    enum sm_result_state state;
    bool good; /* accepted, pass, done */
    double value;
    enum sm_mark_by by;
    char why[SM_LINK_TEXT_SIZE];
};

struct day {
    struct sm_profile profile;
    struct sm_method method;
    struct sm_standards standards;
    struct sm_core_setup setup;
    struct sm_sheet sheet;
    struct sm_carried begin;
    struct sm_core *core;
    int64_t n, t_ns, utc_us;
    double mv, t_c; /* the signal now */
    uint64_t seed;
    size_t kept;
    struct day_kept event[DAY_KEPT];
    struct sm_carried carried; /* as stated last */
    bool has_carried;
    bool key; /* the meter's own key is pressed: the next line says so */
    /* told of each event as it comes, the live ones too; NULL: not */
    void (*look)(void *arg, const struct sm_event *e);
    void *look_arg;
};

/* A method like the shipped demonstration's: spread, dwell 3 s, over 2 s, 0.6 mV. */
void day_setup(struct day *d);
/* Adds an item; standards are found by name. */
void day_item(struct day *d, enum sm_item_kind kind, const char *name);
/* Five standards, a check, samples "a" to "c", a closing check. */
void day_usual_sheet(struct day *d);
/* Starts a core (from d->begin, with the sheet when `with_sheet`), link up. */
void day_start(struct day *d, bool with_sheet);
void day_stop(struct day *d);
/* The file is changed: roll, a new core from what is carried, link up again. */
void day_roll(struct day *d);
/* The program is killed and begins again from what was stated last, s seconds later. */
void day_restart(struct day *d, double s);
void day_link(struct day *d, bool up);

void day_feed(struct day *d, struct sm_input *in);
void day_bytes(struct day *d, const char *text);
/* Ticks that are due up to t_ns. */
void day_ticks(struct day *d, int64_t t_ns);

/* The probe in a solution whose end value is mv, for s seconds (readings every 0.1 s). */
void day_in(struct day *d, double mv, double s);
/* mV of a pH for the invented electrode (98.6 %, +3.9 mV at pH 7) at 20 °C. */
double day_mv(double ph);
/* Air for 1 s, rinse for 1.4 s, then the solution for s seconds. */
void day_move(struct day *d, double mv, double s);
void day_air(struct day *d, double s);
/* The same where the meter has a word for it. */
void day_open(struct day *d, double s);
/* Time passes without a reading. */
void day_nothing(struct day *d, double s);
/* An act with the newest durable entry seen. */
void day_act(struct day *d, enum sm_act_kind act, const char *text);

/* How many of a kind were kept; the last of a kind (fails when none). */
size_t day_count(const struct day *d, enum sm_event_kind kind);
const struct day_kept *day_last(const struct day *d, enum sm_event_kind kind);
/* The i-th of a kind, from 0. */
const struct day_kept *day_nth(const struct day *d, enum sm_event_kind kind, size_t i);
#endif
