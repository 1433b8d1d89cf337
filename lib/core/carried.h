/* SPDX-License-Identifier: GPL-3.0-or-later */
/* carried.h: the plain data that outlives an immersion, restated in the log. Ages instead of times;
 * every section is left out of the log when empty. A file begins from the `carried` in its `open`.
 */
#ifndef SM_CORE_CARRIED_H
#define SM_CORE_CARRIED_H
#include "bench/result.h"
#include "bench/run.h"
#include "signal/signal.h"

#define SM_RESULTS_MAX 1000           /* not final at one time */
#define SM_QUESTIONS_MAX 32           /* open at one time */
#define SM_ACT_IDS_MAX 64             /* remembered, so that a repeat is ignored */
#define SM_CARRIED_MAX (512u * 1024u) /* bytes as JSON */

enum sm_place { SM_AT_UNKNOWN, SM_AT_STILL, SM_AT_LEFT };
const char *sm_place_name(enum sm_place p); /* "unknown", "still in it", "left" */

struct sm_carried_point {
    int64_t capture; /* n */
    size_t item;     /* from 1 */
    char name[SM_NAME_SIZE];
    double x, y, u95_y, t_c;
};

struct sm_carried_curve {
    bool has;
    int64_t n; /* of the `curve` event; 0: not fitted yet, points only */
    bool accepted;
    bool ended; /* no results any more: why_ended */
    char why_ended[SM_REASON_SIZE];
    char sensor[SM_NAME_SIZE];
    char method[SM_NAME_SIZE];
    int64_t age_ns;
    size_t n_points;
    struct sm_carried_point point[SM_POINTS_MAX];
};

struct sm_carried_result {
    int64_t n;
    int64_t run;
    size_t item;                /* from 1; 0: none */
    enum sm_result_state state; /* PROVISIONAL or HELD */
    char why[SM_REASON_SIZE];   /* held: why; provisional: what it waits for */
};

struct sm_carried_question {
    int64_t n;       /* of the `question` */
    int64_t capture; /* about this */
};

struct sm_carried {
    struct sm_carried_run run;
    struct sm_carried_curve curve;
    size_t n_results;
    struct sm_carried_result result[SM_RESULTS_MAX];
    struct {
        bool has;
        unsigned since;    /* samples since the last passing check */
        int64_t last_good; /* n of the last passing check; 0 none in this run */
        int64_t last;      /* n of the last check of any verdict */
    } checks;
    size_t n_questions;
    struct sm_carried_question question[SM_QUESTIONS_MAX];
    char on_duty[SM_NAME_SIZE]; /* section people; "" nobody */
    struct {
        bool has;
        int64_t capture; /* n */
        size_t item;     /* from 1; 0 none */
        char name[SM_NAME_SIZE];
        double value, u95;
        enum sm_place place;
    } last;
    struct {
        bool has;
        int64_t age_ns;
    } rest;
    struct {
        bool has;
        double value_c;
        char who[SM_NAME_SIZE];
        int64_t age_ns;
    } temperature;
    size_t n_acts;
    char act[SM_ACT_IDS_MAX][65]; /* oldest first */
    struct sm_channel_memory channel;
    char sensor[SM_NAME_SIZE];
    struct {
        char identity[512], settings[512];
        char adapter[512]; /* what it is plugged in through: no other is taken without leave */
    } meter;
    int64_t runs;     /* sheets handed over ever */
    int64_t captures; /* captures numbered ever */
};

/* Everything empty. */
void sm_carried_init(struct sm_carried *c);
/* After a restart, an unplug, a crash, a failed write: the probe may be anywhere. An item that was
 * open is given back to be opened again. */
void sm_carried_interrupt(struct sm_carried *c);
/* ns have passed since it was stated (>= 0). */
void sm_carried_age(struct sm_carried *c, int64_t ns);
#endif
