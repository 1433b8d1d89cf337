/* SPDX-License-Identifier: GPL-3.0-or-later */
/* outcome.h: what a session came to, as far as the bench cares: captures, curves, checks, results
 * and what became of them. No numbers of entries and no times, so that a session that was cut in
 * two can be compared with the whole one. */
#ifndef SM_TESTS_OUTCOME_H
#define SM_TESTS_OUTCOME_H
#include "check.h"

#include "core/core.h"

#define OUTCOMES_MAX 2000

struct outcome {
    enum sm_event_kind kind; /* CAPTURE, CURVE, CHECK, RESULT, QUESTION, HOLD, RELEASE */
    size_t item;             /* from 1; 0 none. HOLD, RELEASE: the first of them */
    char name[SM_NAME_SIZE];
    bool good;             /* curve accepted, check passed, result has a value */
    double value;          /* signal; check and result: unit of results. HOLD, RELEASE: how many */
    double u95, tolerance; /* CAPTURE */
    double coefficient[2]; /* CURVE */
    int64_t n;             /* of the entry: not compared */
    enum sm_result_state state; /* RESULT: in the end */
    char why[SM_REASON_SIZE];   /* why not released, why held; CURVE: the first quantity refused */
};

struct outcomes {
    size_t n;
    struct outcome list[OUTCOMES_MAX];
};

/* Takes what counts of an event; everything else is passed over. */
void outcomes_take(struct outcomes *o, const struct sm_event *e);

/* The same story, values within share times the tolerance of their capture (checks and results:
 * that of their class, in the unit of results). Fails the test, naming `what`, where it is another.
 * Gives the largest difference of two captures, in tolerances. */
double outcomes_compare(const char *what, const struct outcomes *whole, const struct outcomes *cut,
                        double share, const double tolerance[SM_CLASS_COUNT]);

/* The last of a kind for an item's name; NULL none. */
const struct outcome *outcomes_find(const struct outcomes *o, enum sm_event_kind kind,
                                    const char *name);
size_t outcomes_count(const struct outcomes *o, enum sm_event_kind kind);
#endif
