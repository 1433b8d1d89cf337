/* SPDX-License-Identifier: GPL-3.0-or-later */
/* made.h: a small made-up bench for the tests of this room: a probe whose signal follows the
 * solution it is in, with noise, a display step, stray readings, lifts, rinses and air, fed to a
 * signal; and a tape of what came out. The same seed makes the same readings. */
#ifndef SM_TESTS_MADE_H
#define SM_TESTS_MADE_H
#include "check.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "signal/signal.h"

#define TAPE_MAX 20000

struct tape {
    size_t n;
    size_t settling; /* counted, not kept */
    struct sm_signal_event event[TAPE_MAX];
};

struct bench {
    uint64_t random;
    double rate;       /* readings/s */
    double jitter;     /* share of the spacing, either way */
    double noise;      /* sd, u */
    double phi;        /* 0: white; else AR(1) */
    double step;       /* of the display; 0: none */
    bool hide_step;    /* the readings do not say it */
    double tau_s;      /* response of the probe */
    double stray;      /* probability that a run of one to three stray readings begins */
    double add, times; /* what is fed is times · (value + add) */
    int64_t shift_ns;
    /* state */
    double t_s, value, ar;
    unsigned stray_left;
    double stray_by;
    struct sm_signal *signal;
    struct tape *tape;
};

static inline double made_uniform(struct bench *b) /* 0 … 1 */
{
    b->random ^= b->random << 13; /* xorshift64 (Marsaglia 2003) */
    b->random ^= b->random >> 7;
    b->random ^= b->random << 17;
    return (double)(b->random >> 11) / 9007199254740992.0;
}

static inline double made_normal(struct bench *b)
{
    const double u = made_uniform(b), v = made_uniform(b);

    return sqrt(-2 * log(u + 1e-300)) * cos(2 * 3.14159265358979323846 * v);
}

static inline double made_between(struct bench *b, double from, double to)
{
    return from + (to - from) * made_uniform(b);
}

static inline struct bench made_bench(unsigned seed)
{
    struct bench b = { .rate = 1, .tau_s = 3, .times = 1 };

    b.random = UINT64_C(0x9E3779B97F4A7C15) * (seed + 1);
    for (int i = 0; i < 8; i++)
        (void)made_uniform(&b);
    return b;
}

static inline struct sm_rule made_rule(double tolerance, double dwell_s, double over_s)
{
    struct sm_rule r = { .kind = SM_RULE_SPREAD,
                         .dwell_ns = (int64_t)(dwell_s * 1e9),
                         .over_ns = (int64_t)(over_s * 1e9) };

    for (unsigned c = 0; c < SM_CLASS_COUNT; c++) {
        r.tolerance[c] = tolerance;
        r.doubt[c] = 0.03;
        r.longest_wait_ns[c] = 1800 * SM_NS_PER_S;
    }
    return r;
}

static inline struct sm_signal *made_signal(const struct sm_rule *rule)
{
    const struct sm_channel_memory memory = { 0 };
    const struct sm_signal_start start = { .place = SM_PLACE_NEW };
    struct sm_signal *s = NULL;

    assert_int_equal(sm_signal_create(rule, 0, &memory, &start, &s), SM_OK);
    return s;
}

static inline void made_drain(struct sm_signal *s, struct tape *tape)
{
    struct sm_signal_event e;

    while (sm_signal_next(s, &e)) {
        if (e.kind == SM_SIGNAL_SETTLING) {
            tape->settling++;
            continue;
        }
        if (tape->n == TAPE_MAX)
            fail_msg("more than %d events", TAPE_MAX);
        tape->event[tape->n++] = e;
    }
}

static inline void made_feed(struct sm_signal *s, struct tape *tape,
                             const struct sm_signal_input *in)
{
    const enum sm_status status = sm_signal_feed(s, in);

    if (status != SM_OK)
        fail_msg("fed at %lld ns: %s", (long long)in->t_ns, sm_status_text(status));
    made_drain(s, tape);
}

static inline int64_t made_ns(double t_s)
{
    return llround(t_s * 1e6) * 1000;
}

static inline void made_put(struct bench *b, double t_s, double value, enum sm_flag flag)
{
    struct sm_signal_input in = { .kind = SM_SIGNAL_READING };

    in.t_ns = in.reading.t_ns = b->shift_ns + made_ns(t_s);
    in.reading.flag = flag;
    if (b->step > 0)
        value = b->step * round(value / b->step);
    in.reading.value = b->times * (value + b->add);
    in.reading.step = b->hide_step ? 0 : b->times * b->step;
    made_feed(b->signal, b->tape, &in);
}

/* The time of the next reading, not later than until_s; false: none. */
static inline bool made_next(struct bench *b, double until_s)
{
    const double next_s = b->t_s + (1 + b->jitter * (2 * made_uniform(b) - 1)) / b->rate;

    if (next_s > until_s)
        return false;
    b->t_s = next_s;
    return true;
}

/* The probe stays in a solution of this level for so long. */
static inline void made_stay(struct bench *b, double level, double for_s)
{
    const double until_s = b->t_s + for_s;
    double before_s = b->t_s;

    while (made_next(b, until_s)) {
        double x;

        b->value = b->tau_s > 0 ? level + (b->value - level) * exp(-(b->t_s - before_s) / b->tau_s)
                                : level;
        before_s = b->t_s;
        b->ar = b->phi * b->ar + sqrt(1 - b->phi * b->phi) * b->noise * made_normal(b);
        x = b->value + b->ar;
        if (b->stray > 0 && b->stray_left == 0 && made_uniform(b) < b->stray) {
            b->stray_left = 1 + (unsigned)(3 * made_uniform(b));
            b->stray_by = (made_uniform(b) < 0.5 ? -1 : 1) * made_between(b, 3, 100);
        }
        if (b->stray_left > 0) {
            b->stray_left--;
            x += b->stray_by;
        }
        made_put(b, b->t_s, x, SM_FLAG_OK);
    }
    b->t_s = until_s;
}

/* In air, where the meter shows a number that wanders. */
static inline void made_air(struct bench *b, double for_s)
{
    const double until_s = b->t_s + for_s;

    b->value += made_between(b, 20, 60) * (made_uniform(b) < 0.5 ? -1 : 1);
    while (made_next(b, until_s)) {
        b->value += 8 * made_normal(b) / sqrt(b->rate);
        made_put(b, b->t_s, b->value, SM_FLAG_OK);
    }
    b->t_s = until_s;
}

/* In air, where the meter says so. */
static inline void made_open(struct bench *b, double for_s)
{
    const double until_s = b->t_s + for_s;

    while (made_next(b, until_s))
        made_put(b, b->t_s, 0, SM_FLAG_OPEN);
    b->t_s = until_s;
}

static inline size_t tape_count(const struct tape *t, enum sm_signal_kind kind)
{
    size_t n = 0;

    for (size_t i = 0; i < t->n; i++)
        n += t->event[i].kind == kind;
    return n;
}

/* The i-th of a kind, or a failure. */
static inline const struct sm_signal_event *tape_get(const struct tape *t, enum sm_signal_kind kind,
                                                     size_t at)
{
    for (size_t i = 0; i < t->n; i++) {
        if (t->event[i].kind == kind && at-- == 0)
            return &t->event[i];
    }
    fail_msg("no such event: kind %d", (int)kind);
    return NULL;
}

static inline const char *tape_word(const struct sm_signal_event *e, char word[80])
{
    switch (e->kind) {
    case SM_SIGNAL_MOVED:
        snprintf(word, 80, "moved:%s", sm_moved_by_name(e->by));
        break;
    case SM_SIGNAL_TRANSIT:
        snprintf(word, 80, "%s:%s", e->returned ? "lift" : "transit", sm_transit_how_name(e->how));
        break;
    case SM_SIGNAL_SETTLED:
        snprintf(word, 80, "settled");
        break;
    case SM_SIGNAL_NOT_SETTLED:
        snprintf(word, 80, "not-settled:%s", e->why);
        break;
    case SM_SIGNAL_OPEN_CIRCUIT:
        snprintf(word, 80, "open");
        break;
    case SM_SIGNAL_SETTLING:
        snprintf(word, 80, "settling");
        break;
    }
    return word;
}

/* "moved:start settled open transit:open circuit …" */
static inline void tape_story(const struct tape *t, char *out, size_t cap)
{
    struct sm_text text;
    char word[80];

    sm_text_init(&text, out, cap);
    for (size_t i = 0; i < t->n; i++)
        sm_text_addf(&text, "%s%s", i > 0 ? ", " : "", tape_word(&t->event[i], word));
}

static inline void check_story(const char *what, const struct tape *t, const char *want)
{
    char got[4096];

    tape_story(t, got, sizeof got);
    if (strcmp(got, want) != 0)
        fail_msg("%s:\n  got  %s\n  want %s", what, got, want);
}
#endif
