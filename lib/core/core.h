/* SPDX-License-Identifier: GPL-3.0-or-later */
/* core.h: one meter's core: fed inputs, drained of events. No I/O, no clock, no threads, no
 * globals; everything is allocated at start.
 *
 *     sm_core_feed(core, &input);
 *     while (sm_core_next(core, &event))
 *         …;
 */
#ifndef SM_CORE_CORE_H
#define SM_CORE_CORE_H
#include "bench/method.h"
#include "core/event.h"
#include "standard/standard.h"

#define SM_CORE_NUMBER 1 /* raised whenever any event could differ */
#define SM_PEOPLE_MAX 64
#define SM_N_MOST (INT64_MAX / 4) /* no entry has a higher number */

struct sm_person {
    char who[SM_NAME_SIZE];
    bool analyse, review;
};

/* The typed setup of one meter's core: lent, must outlive the core. */
struct sm_core_setup {
    char meter[SM_METER_SIZE];
    char sensor[SM_NAME_SIZE];
    int64_t silence_ns;
    const struct sm_profile *profile;
    const struct sm_method *method; /* [n_methods] */
    size_t n_methods;
    size_t own_method; /* used while no sheet names another */
    const struct sm_standards *standards;
    const struct sm_person *people; /* [n_people] */
    size_t n_people;
};

struct sm_core;

/* A core that begins from carried, with the sheet in force (NULL: none; copied).
 *   SM_EINVAL  setup and carried or sheet do not go together: ret_why
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_core_start(const struct sm_core_setup *setup,
                                           const struct sm_carried *carried,
                                           const struct sm_sheet *sheet, struct sm_core **ret_core,
                                           char ret_why[SM_REASON_SIZE]);
void sm_core_destroy(struct sm_core *c);

/* One input. The first of a file is normally a link. Events that are logged are numbered in->n + 1
 * and on. What is refused changes nothing:
 *   SM_EBUSY   not drained yet
 *   SM_EORDER  n not after the last, or t_ns before the last
 *   SM_EINVAL  bytes that no port gives (too many, offsets of bad ones out of order), a number
 *              above SM_N_MOST, a time more than 70 years after the file was opened */
SM_MUST_CHECK enum sm_status sm_core_feed(struct sm_core *c, const struct sm_input *in);

/* The next event, lent until the next call; false: drained. */
bool sm_core_next(struct sm_core *c, const struct sm_event **ret_event);

/* When a tick is to be fed; SM_NEVER: none wanted. Ask when drained. */
int64_t sm_core_deadline(const struct sm_core *c);

/* The last number used, by an input or an event. */
int64_t sm_core_last_n(const struct sm_core *c);

/* The file may be changed now: no immersion open and none about to end (every reading understood),
 * no question to the meter open, at the end of a line. */
bool sm_core_may_roll(const struct sm_core *c);
/* The same, an immersion that is open apart. */
bool sm_core_may_cut(const struct sm_core *c);

/* What outlives, as it stands now; fills ret_carried. */
void sm_core_carried(const struct sm_core *c, struct sm_carried *ret_carried);
/* The sheet in force; NULL: none. */
const struct sm_sheet *sm_core_sheet(const struct sm_core *c);

enum sm_bench_state {
    SM_STATE_NO_LINK,
    SM_STATE_SILENT,
    SM_STATE_WAITING, /* no reading yet */
    SM_STATE_OPEN,
    SM_STATE_SETTLING,
    SM_STATE_SETTLED,
    SM_STATE_NOT_SETTLED,
    SM_STATE_RESTING
};
const char *sm_bench_state_name(enum sm_bench_state s);

/* What a person wants to know at a glance; the sentences are made in lib/view/sentence.h. */
struct sm_core_status {
    enum sm_bench_state state;
    int64_t since_t_ns;
    struct sm_whereabouts now;  /* what the probe is in */
    struct sm_whereabouts next; /* what comes next */
    bool has_sheet, sheet_done;
    int64_t run;
    size_t items, measured;
    struct sm_maybe latest; /* reading of the signal channel */
    enum sm_unit signal_unit, result_unit;
    struct {
        bool has;
        int64_t n;
        char name[SM_NAME_SIZE];
        double value, u95;
    } last; /* capture */
    bool curve_accepted, curve_refused;
    size_t provisional, held, questions;
    unsigned since_check;
    char on_duty[SM_NAME_SIZE];
    const char *caution;     /* of the step; NULL none; lent */
    uint64_t unread;         /* lines that gave no reading, in this file */
    const char *method_note; /* "" none */
};
void sm_core_status(const struct sm_core *c, struct sm_core_status *ret_status);
#endif
