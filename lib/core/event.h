/* SPDX-License-Identifier: GPL-3.0-or-later */
/* event.h: what the core says. Durable events are announced only when they are on disk; logged ones
 * are numbered and shown at once; live ones have no number and are never in the log. An event
 * repeats the t_ns and utc_us of its input. */
#ifndef SM_CORE_EVENT_H
#define SM_CORE_EVENT_H
#include "bench/judge.h"
#include "core/carried.h"
#include "core/input.h"

enum sm_event_class { SM_DURABLE, SM_LOGGED, SM_LIVE };

enum sm_event_kind {
    /* durable */
    SM_EVENT_CAPTURE,
    SM_EVENT_CURVE,
    SM_EVENT_CHECK,
    SM_EVENT_RESULT,
    SM_EVENT_HOLD,
    SM_EVENT_RELEASE,
    SM_EVENT_QUESTION,
    SM_EVENT_ANSWER,
    /* logged */
    SM_EVENT_MOVED,
    SM_EVENT_TRANSIT,
    SM_EVENT_NOT_SETTLED,
    SM_EVENT_OPEN_CIRCUIT,
    SM_EVENT_SILENT,
    SM_EVENT_UNREAD,
    SM_EVENT_ASK,
    SM_EVENT_CARRIED,
    /* live */
    SM_EVENT_READING,
    SM_EVENT_SETTLING,
    SM_EVENT_COUNT
};
const char *sm_event_kind_name(enum sm_event_kind k); /* the "k" of its entry */
enum sm_event_class sm_event_class(enum sm_event_kind k);

/* Where in the bench sheet. */
struct sm_whereabouts {
    bool has; /* false: no sheet, or given to no item */
    int64_t run;
    size_t item; /* from 1 */
    enum sm_item_kind kind;
    char name[SM_NAME_SIZE]; /* title: "B4", "duplicate of final" */
};

struct sm_other_mean {
    char name[SM_CHANNEL_SIZE];
    double value;
    struct sm_maybe range;
};

struct sm_event_capture {
    int64_t moved; /* n of its `moved` */
    struct sm_whereabouts where;
    int64_t number;          /* count of captures of this meter */
    char name[SM_NAME_SIZE]; /* item's, or "capture 17" */
    double value;
    enum sm_unit unit;
    struct sm_settled s;
    double tolerance; /* signal unit */
    size_t n_others;
    struct sm_other_mean other[SM_OTHERS_MAX];
    char who[SM_NAME_SIZE]; /* on duty */
    size_t n_remarks;
    char remark[4][SM_REASON_SIZE];
};

struct sm_event_curve {
    int64_t run;
    bool accepted;
    char sensor[SM_NAME_SIZE], method[SM_NAME_SIZE];
    enum sm_unit unit_x, unit_y;
    bool fitted; /* false: there was nothing to fit: see judged */
    struct sm_curve curve;
    size_t n_points;
    struct {
        int64_t capture;
        size_t item;
        char name[SM_NAME_SIZE];
        double x, y, t_c, residual, back_calculated;
        bool has_t;
    } point[SM_POINTS_MAX];
    size_t n_judged;
    struct sm_judged judged[SM_JUDGED_MAX];
};

struct sm_event_check {
    int64_t capture, curve;
    struct sm_whereabouts where;
    double want, found, difference, within;
    bool computed; /* false: found unknown (no curve): never a pass */
    enum sm_unit unit;
    bool closing;
    bool pass;
    char why[SM_REASON_SIZE];
};

struct sm_event_result {
    int64_t capture, curve; /* n; curve 0: none */
    struct sm_whereabouts where;
    char name[SM_NAME_SIZE];
    bool has_value;
    double value, u95;
    bool has_u95;
    enum sm_unit unit;
    bool has_temperature;
    double temperature_c;
    char temperature_how[16]; /* "measured", "typed", "assumed" */
    char shown[24];           /* "< 1.68", "> 10.07" or "" */
    enum sm_result_state state;
    char why[SM_REASON_SIZE]; /* held: why and what would release it; provisional: what it waits for
                               */
    size_t n_remarks;
    char remark[4][SM_REASON_SIZE];
};

/* HOLD and RELEASE: these results change. */
struct sm_event_change {
    int64_t check; /* n of the check that did it; 0: another reason */
    char why[SM_REASON_SIZE];
    size_t n;
    int64_t result[SM_RESULTS_MAX];
};

struct sm_event_question {
    int64_t capture;
    char text[SM_REASON_SIZE];
    char asks[32]; /* what about: "beaker" … */
};

struct sm_event_answer {
    int64_t act; /* n of the act */
    char id[SM_ID_SIZE];
    bool done;
    char why[SM_LINK_TEXT_SIZE]; /* not done: why, and what is new */
};

struct sm_event_moved {
    enum sm_mark_by by;
    int64_t of; /* mark: n of the act; 0 otherwise */
    int64_t began_t_ns;
    struct sm_whereabouts where;
    char why[SM_REASON_SIZE];
};

struct sm_event_transit {
    int64_t from_t_ns, to_t_ns;
    enum sm_transit_how how;
    bool returned;
};

struct sm_event_unread {
    bool counted; /* true: a count of those passed over, no line */
    uint64_t count;
    enum sm_line_kind kind;
    char line[SM_LINE_MAX];
    size_t n, length;
    char why[SM_REASON_SIZE];
};

struct sm_event_ask {
    char text[SM_QUESTION_SIZE];
    size_t n;
    bool identity;
};

struct sm_event {
    enum sm_event_kind kind;
    int64_t n; /* 0 for live events */
    int64_t t_ns, utc_us;
    union {
        struct sm_event_capture capture;
        struct sm_event_curve curve;
        struct sm_event_check check;
        struct sm_event_result result;
        struct sm_event_change change; /* HOLD, RELEASE */
        struct sm_event_question question;
        struct sm_event_answer answer;
        struct sm_event_moved moved;
        struct sm_event_transit transit;
        struct {
            struct sm_whereabouts where;
            int64_t moved;
            char why[SM_REASON_SIZE];
        } not_settled;
        struct {
            int64_t last_line_t_ns; /* SM_NEVER: none came since the link was up */
        } silent;
        struct sm_event_unread unread;
        struct sm_event_ask ask;
        const struct sm_carried *carried; /* lent */
        struct sm_reading reading;        /* live */
        struct {
            double latest;
            enum sm_unit unit;
            int64_t since_moved_ns;
            struct sm_maybe to_come, wait_s;
        } settling; /* live */
    } u;
};
#endif
