/* SPDX-License-Identifier: GPL-3.0-or-later */
/* signal.h: the seam behind which it is decided whether a signal has settled. Fed readings, marks,
 * ticks and ends; drained of moved, transit, settling, settled, not settled and open circuit. What
 * is behind it may change; what passes through it may only grow. Memory is fixed at creation; the
 * same inputs give the same bits; nothing is known here of meters, sheets or files. */
#ifndef SM_SIGNAL_SIGNAL_H
#define SM_SIGNAL_SIGNAL_H
#include "base/status.h"
#include "base/text.h"
#include "reading/reading.h"
#include "signal/rule.h"

#define SM_OTHERS_MAX (SM_CHANNELS_MAX - 1)
/* Another channel older than this is not averaged. */
#define SM_OTHER_OLDEST_NS INT64_C(5000000000)

struct sm_other {
    bool present;
    double value;   /* its latest */
    int64_t age_ns; /* before this reading */
};

struct sm_signal_reading {
    int64_t t_ns;
    double value; /* u; meaningless unless flag is OK */
    double step;  /* display step from the digits; 0 unknown */
    enum sm_flag flag;
    struct sm_other other[SM_OTHERS_MAX]; /* the other channels, in the profile's order */
};

enum sm_mark_by { SM_MOVED_START, SM_MOVED_TRANSIT, SM_MOVED_MARK, SM_MOVED_VALUE, SM_MOVED_LINE };
const char *sm_moved_by_name(enum sm_mark_by by); /* "start", "transit", "mark", "value", "line" */

enum sm_transit_how {
    SM_TRANSIT_OPEN,
    SM_TRANSIT_WORD,
    SM_TRANSIT_PLAUSIBLE,
    SM_TRANSIT_DEPARTURES
};
const char *sm_transit_how_name(enum sm_transit_how how); /* "open circuit", "word", "implausible",
                                                           * "two departures" */

/* How the channel stood when the signal was created (plain data, part of `carried`). */
struct sm_channel_memory {
    double noise;      /* u, standard deviation of a reading; 0 unknown */
    double long_noise; /* u, long-run noise at former captures, per sqrt(s); 0 unknown */
    double step;       /* u, display step; 0 unknown */
    double usual_wait_s[SM_CLASS_COUNT]; /* 0 unknown */
    unsigned captures;
};

struct sm_signal_start {
    enum { SM_PLACE_NEW, SM_PLACE_STILL, SM_PLACE_LEFT } place;
    /* NEW: nothing is known: the first reading begins an immersion (moved by start).
     * STILL: the probe is still in a solution already captured, whose value was `value` and U95
     * `u95`: nothing is captured until a transit, a mark or a departure from it. LEFT: a transit
     * was under way: the next solution opens by transit. */
    double value, u95;
};

/* The parts of an expanded uncertainty, each as a half-width at 95 %; a part nobody computed yet is
 * left out (has = false), never 0. */
enum sm_part {
    SM_PART_NOISE,
    SM_PART_TO_COME,
    SM_PART_STEP,
    SM_PART_LONG_NOISE,
    SM_PART_DRIFT,
    SM_PART_COUNT
};
const char *sm_part_name(enum sm_part p); /* "noise", "to_come", "step", "long_noise", "drift" */

struct sm_maybe {
    bool has;
    double value;
};

/* When it is told: an open circuit, and a first departure after a capture (moved by value), at
 * once. A transit, with the moved that ends it, when the new place has been calm for a quarter of
 * the dwell (2 s at most), so that air and rinses make few ways. Where a lift out of an uncaptured
 * immersion may yet come back (half the dwell, 10 s at most) nothing is told before that is
 * decided: then either a transit with `returned` alone, or not-settled (if it outlasted the dwell),
 * transit and moved. A lift out of an immersion younger than the dwell starts the dwell again: it
 * may be a rinse dipped twice. */
enum sm_signal_kind {
    SM_SIGNAL_MOVED,       /* a new immersion */
    SM_SIGNAL_TRANSIT,     /* the way between two, or a lift (`returned`) */
    SM_SIGNAL_SETTLING,    /* live: progress */
    SM_SIGNAL_SETTLED,     /* one value */
    SM_SIGNAL_NOT_SETTLED, /* an immersion ended without a value */
    SM_SIGNAL_OPEN_CIRCUIT /* began (live state; the transit follows when the probe is back) */
};

struct sm_settled {
    double value; /* u: mean of the window */
    double u95;   /* u */
    struct sm_maybe part[SM_PART_COUNT];
    int64_t from_t_ns, to_t_ns; /* the window, first and last reading in it */
    unsigned readings;          /* in it */
    unsigned lifts;             /* short lifts survived since the move */
    double sd;                  /* u, of the readings in the window */
    double step;                /* u; 0 unknown */
    int64_t since_moved_ns;
    enum sm_rule_kind rule;
    bool prescribed; /* by a rule that makes no probability */
    double tolerance;
    struct sm_maybe end_value; /* forecast */
    struct sm_maybe doubt;     /* probability of being off by more than the tolerance */
    struct sm_maybe other_mean[SM_OTHERS_MAX];
    struct sm_maybe other_range[SM_OTHERS_MAX]; /* largest less smallest over the window */
};

struct sm_signal_event {
    enum sm_signal_kind kind;
    int64_t t_ns;       /* of the input that brought it out */
    enum sm_mark_by by; /* MOVED */
    int64_t
        from_t_ns;   /* MOVED, NOT_SETTLED: when the immersion began; TRANSIT: when the way began */
    int64_t to_t_ns; /* TRANSIT, NOT_SETTLED: when it was over */
    enum sm_transit_how how; /* TRANSIT */
    bool returned;           /* TRANSIT: came back alike before a capture: the immersion goes on */
    unsigned clock;          /* of the mark, 0 … 31 */
    struct sm_maybe to_come; /* SETTLING: u */
    struct sm_maybe wait_s;  /* SETTLING: about how long yet */
    double latest;           /* SETTLING: the reading */
    struct sm_settled settled; /* SETTLED */
    char why[SM_REASON_SIZE];  /* NOT_SETTLED, MOVED: in words */
};

enum sm_signal_input_kind { SM_SIGNAL_READING, SM_SIGNAL_MARK, SM_SIGNAL_TICK, SM_SIGNAL_END };

struct sm_signal_input {
    enum sm_signal_input_kind kind;
    int64_t t_ns;
    struct sm_signal_reading reading; /* READING */
    enum sm_class class;              /* MARK: what the next item is */
    unsigned clock;                   /* MARK */
    const char *why;                  /* END: "silent", "link lost", …; lent during the call */
};

struct sm_signal; /* opaque */

/*   SM_EINVAL  a parameter outside its range, or a rule that is not built
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_signal_create(const struct sm_rule *rule, size_t n_others,
                                              const struct sm_channel_memory *memory,
                                              const struct sm_signal_start *start,
                                              struct sm_signal **ret_signal);
void sm_signal_destroy(struct sm_signal *s);

/* One input at a time: SM_EBUSY until sm_signal_next has given false; SM_EORDER: earlier than the
 * last; SM_EVALUE: an OK reading that is not finite. On failure nothing changes.
 * A mark always begins an immersion (moved by mark). An end ends the open one (not-settled unless
 * captured) and the next reading begins anew (moved by start). */
SM_MUST_CHECK enum sm_status sm_signal_feed(struct sm_signal *s, const struct sm_signal_input *in);
bool sm_signal_next(struct sm_signal *s, struct sm_signal_event *ret_event);
/* When a tick is wanted (longest wait …); SM_NEVER: not. */
int64_t sm_signal_deadline(const struct sm_signal *s);

/* The class of the immersion now open or next to open; takes effect at once. */
void sm_signal_class(struct sm_signal *s, enum sm_class c);
/* The rule's parameters replaced (a sheet brought another method); an open immersion ends silently
 * and the next reading begins anew (moved by start). */
SM_MUST_CHECK enum sm_status sm_signal_rule(struct sm_signal *s, const struct sm_rule *rule);
/* Paused: readings keep the noise estimate alive, nothing is captured; resuming begins anew. */
void sm_signal_rest(struct sm_signal *s, bool rest);

/* An immersion is open: begun, and not captured yet. */
bool sm_signal_open(const struct sm_signal *s);
/* Readings lie beside the course, and what they mean is not known yet: a stray one, a departure? */
bool sm_signal_undecided(const struct sm_signal *s);
/* Where the probe is now, as a start for the next file. */
void sm_signal_place(const struct sm_signal *s, struct sm_signal_start *ret_start);
void sm_signal_memory(const struct sm_signal *s, struct sm_channel_memory *ret_memory);
#endif
