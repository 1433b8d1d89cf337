/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Simulated beaker changes through the whole core, from bytes to captures: nothing may be captured
 * in air or in a rinse shorter than the dwell, and no beaker may be lost that stayed three times
 * its settling time. The truth is the simulator's; nothing in it comes from the program.
 *
 * How far captures lie from the truth is printed and not judged: the rule here is `spread`, which
 * slow tails are known to fool. "many" as argument: ten times as many beakers. */
#include "log_maker.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "sim/random_session.h"
#include "slow.h"

#define UTC_US INT64_C(1796112000000000) /* 2026-12-01T08:00:00Z */
#define BEAKERS 40                       /* in a session */

/* Where the generator makes it easy, it keeps air and rinses 10 mV away from the beakers and air at
 * least 2 s long. EVEN: air from 1 s on, air and rinses wherever they happen to be. */
enum hardness { EASY, EVEN };

struct series {
    const char *name;
    uint64_t first_seed;
    unsigned sessions;
    enum hardness hardness;
    double over_s, dwell_s;
    double rate_from, rate_to;
    struct sm_sim_open open; /* what the meter shows in air; WANDER: the simulator's own */
    bool square_root;        /* only such tails: their steps must be small, or they never settle */
};

#define WANDER                                                                                     \
    {                                                                                              \
        .kind = SM_SIM_OPEN_WANDER                                                                 \
    }

static const struct series all_series[] = {
    { "over 10 s", 1, 30, EASY, 10, 22, 0.5, 10, WANDER, false },
    { "over 10 s, air and rinse anywhere", 1001, 30, EVEN, 10, 22, 0.5, 10, WANDER, false },
    { "over 20 s", 2001, 15, EASY, 20, 22, 0.5, 10, WANDER, false },
    { "over 20 s, air and rinse anywhere", 3001, 15, EVEN, 20, 22, 0.5, 10, WANDER, false },
    { "square-root tails, steps to 40 mV", 9001, 10, EVEN, 10, 22, 0.5, 10, WANDER, true },
    { "a reading every 2 s", 4001, 20, EVEN, 10, 22, 0.5, 0.5, WANDER, false },
    { "air at the rail",
      5001,
      10,
      EVEN,
      10,
      22,
      0.5,
      10,
      { .kind = SM_SIM_OPEN_RAIL, .level = 1999.9 },
      false },
    { "air said by the word for over",
      6001,
      10,
      EVEN,
      10,
      22,
      0.5,
      10,
      { .kind = SM_SIM_OPEN_WORD, .word = "+++++" },
      false },
    { "air said by the word for open",
      7001,
      10,
      EVEN,
      10,
      22,
      0.5,
      10,
      { .kind = SM_SIM_OPEN_WORD, .word = "open" },
      false },
    { "the demonstration's pace", 8001, 15, EVEN, 2, 3, 10, 10, WANDER, false },
};

struct family {
    unsigned captures, off;
};

struct count {
    unsigned beakers, stayed, captures, doubles,
        early; /* early: left before three times, captured */
    unsigned from_air, from_rinse, lost;
    unsigned by_value; /* first captures whose immersion began without a transit seen */
    unsigned alike_rinse, alike_lost; /* cannot be told apart by their values: see below */
    unsigned short_lost;              /* … and the air before it was as short as stray readings */
    struct family family[SM_SIM_RESPONSE_COUNT];
};

struct seen {
    int64_t t_ns;
    double value;
};

struct watch {
    const struct sm_sim_truth *truth;
    double *value;  /* [truth->n] the latest of them */
    unsigned *got;  /* [truth->n] captures in each stay */
    unsigned *kind; /* [truth->n] response of each beaker */
    double *from;   /* [truth->n] where the signal stood when each beaker began */
    struct seen *seen;
    size_t n_seen, cap_seen;   /* readings */
    double tolerance, stray_s; /* odd readings that span less than stray_s are stray */
    uint64_t seed;
    enum sm_mark_by by; /* of the latest `moved` */
    struct count *count;
};

static unsigned times = 1;

/* The stay at t_ns; what happens within a beaker (a lift) counts, a silence does not. -1: none. */
static int stay_at(const struct sm_sim_truth *t, int64_t t_ns)
{
    int at = -1;

    for (size_t i = 0; i < t->n && t->stay[i].begin_t_ns <= t_ns; i++) {
        const struct sm_sim_stay *s = &t->stay[i];

        if (t_ns < s->end_t_ns && s->kind != SM_SIM_STEP_SILENCE &&
            (at < 0 || s->kind != SM_SIM_STEP_IN))
            at = (int)i;
    }
    return at;
}

/* The beaker before stay i; -1: none. */
static int beaker_before(const struct sm_sim_truth *t, int i)
{
    while (--i >= 0 && t->stay[i].kind != SM_SIM_STEP_IN)
        ;
    return i;
}

static bool near(const struct watch *w, double a, double b)
{
    return fabs(a - b) <= 3 * w->tolerance; /* no departure from a captured value */
}

/* A beaker that reads like the one before, or like what was captured there, or in which the signal
 * stands where it stood: there is nothing to tell by. */
static bool alike_beaker(const struct watch *w, int i)
{
    const struct sm_sim_stay *s = w->truth->stay;
    const int before = beaker_before(w->truth, i);

    if (before >= 0 && (near(w, s[i].end, s[before].end) ||
                        (w->got[before] > 0 && near(w, s[i].end, w->value[before]))))
        return true;
    return near(w, s[i].end, w->from[i]);
}

/* A rinse that reads like the beaker before it, or like what the air happened to read on the way
 * to it. */
static bool alike_rinse(const struct watch *w, int i)
{
    const struct sm_sim_stay *s = w->truth->stay;
    const int before = beaker_before(w->truth, i);

    if (before >= 0 && near(w, s[i].end, s[before].end))
        return true;
    for (size_t k = w->n_seen; k-- > 0 && (before < 0 || w->seen[k].t_ns >= s[before].end_t_ns);) {
        const int at = stay_at(w->truth, w->seen[k].t_ns);

        if (at >= 0 && s[at].kind == SM_SIM_STEP_AIR && near(w, w->seen[k].value, s[i].end))
            return true;
    }
    return false;
}

/* The way to beaker i was nothing but air whose readings may have spanned less than what counts as
 * more than stray. */
static bool short_way(const struct watch *w, int i)
{
    const struct sm_sim_stay *s = w->truth->stay;
    const int before = beaker_before(w->truth, i);

    for (int k = i - 1; k > before; k--) {
        if (before >= 0 && s[k].begin_t_ns < s[before].end_t_ns)
            continue; /* within the beaker before */
        if (s[k].kind != SM_SIM_STEP_AIR ||
            1e-9 * (double)(s[k].end_t_ns - s[k].begin_t_ns) > w->stray_s)
            return false;
    }
    return true;
}

static void captured(struct watch *w, const struct log_maker *m, double value)
{
    const int at = stay_at(w->truth, m->now_ns);
    const struct sm_sim_stay *s = at < 0 ? NULL : &w->truth->stay[at];

    w->count->captures++;
    if (s == NULL || (s->kind != SM_SIM_STEP_IN && s->kind != SM_SIM_STEP_RINSE)) {
        w->count->from_air++;
        print_message("    seed %llu: captured %.2f at %.1f s in %s\n", (unsigned long long)w->seed,
                      value, 1e-9 * (double)m->now_ns, s == NULL ? "?" : sm_sim_step_name(s->kind));
    } else if (s->kind == SM_SIM_STEP_RINSE) {
        if (alike_rinse(w, at)) {
            w->count->alike_rinse++;
            return;
        }
        w->count->from_rinse++;
        print_message("    seed %llu: captured %.2f at %.1f s, %.1f s into a rinse of %.1f s\n",
                      (unsigned long long)w->seed, value, 1e-9 * (double)m->now_ns,
                      1e-9 * (double)(m->now_ns - s->begin_t_ns),
                      1e-9 * (double)(s->end_t_ns - s->begin_t_ns));
    } else {
        struct family *f = &w->count->family[w->kind[at]];

        if (w->got[at]++ > 0)
            w->count->doubles++;
        else
            w->count->by_value += w->by == SM_MOVED_VALUE;
        w->value[at] = value;
        f->captures++;
        f->off += fabs(value - s->end) > w->tolerance;
    }
}

static void see(struct watch *w, int64_t t_ns, double value)
{
    if (w->n_seen == w->cap_seen) {
        w->cap_seen = 2 * w->cap_seen + 1000;
        w->seen = realloc(w->seen, w->cap_seen * sizeof *w->seen);
        assert_non_null(w->seen);
    }
    w->seen[w->n_seen++] = (struct seen){ t_ns, value };
}

static void on_event(void *arg, struct log_maker *m, const struct sm_event *e)
{
    struct watch *w = arg;

    if (e->kind == SM_EVENT_READING)
        see(w, m->now_ns, e->u.reading.channel[0].value);
    if (e->kind == SM_EVENT_MOVED)
        w->by = e->u.moved.by;
    if (e->kind != SM_EVENT_CAPTURE)
        return;
    assert_true(e->u.capture.moved > 0); /* every capture follows a `moved` */
    captured(w, m, e->u.capture.value);
}

static void draw(const struct series *s, uint64_t seed, struct sm_random_session *ret_r,
                 struct sm_scenario *sc)
{
    sm_random_session_init(ret_r, BEAKERS, seed);
    ret_r->dwell_s = s->dwell_s;
    ret_r->rate_from = s->rate_from;
    ret_r->rate_to = s->rate_to;
    if (s->hardness == EVEN) {
        ret_r->air_shortest_s = 1;
        ret_r->air_clear = ret_r->rinse_clear = 0;
    }
    if (s->dwell_s < 10) { /* an electrode as fast as the method */
        ret_r->fast_from_s = 0.05;
        ret_r->fast_to_s = 3;
        ret_r->longest_settle_s = 40;
    }
    if (s->square_root) {
        ret_r->responses = 1U << SM_SIM_RESPONSE_SQRT;
        ret_r->step_to = 40;
    }
    if (s->open.kind != SM_SIM_OPEN_WANDER)
        sc->open = s->open;
    assert_int_equal(sm_random_session_make(ret_r, sc), SM_OK);
}

/* The demonstration's setup with this series' rule. */
static void prepare(struct log_maker *m, const struct series *s, double tolerance,
                    struct sm_core_setup *setup, struct sm_method *method)
{
    log_maker_prepare(m, "conf/try.yaml", "try", UTC_US);
    m->unlogged = true;
    *setup = *m->core_setup;
    *method = setup->method[setup->own_method];
    setup->method = method;
    setup->n_methods = 1;
    setup->own_method = 0;
    method->rule.dwell_ns = (int64_t)(s->dwell_s * 1e9);
    method->rule.over_ns = (int64_t)(s->over_s * 1e9);
    for (int c = 0; c < SM_CLASS_COUNT; c++) {
        method->rule.tolerance[c] = tolerance;
        method->rule.longest_wait_ns[c] = 3600 * SM_NS_PER_S;
    }
    m->core_setup = setup;
}

/* Which response each beaker had, and where the signal stood when it began. */
static void look_at_beakers(struct watch *w, const struct sm_scenario *sc)
{
    const struct sm_sim_truth *t = w->truth;
    enum sm_sim_response_kind now = sc->response.kind;
    struct sm_sim_probe probe;
    unsigned item = 0;
    int64_t t_ns = 0;

    w->kind = calloc(t->n, sizeof *w->kind);
    w->from = calloc(t->n, sizeof *w->from);
    assert_true(w->kind != NULL && w->from != NULL);
    sm_sim_probe_start(&probe, sc);
    for (size_t i = 0; i < sc->n_steps; i++) {
        const struct sm_sim_step *step = &sc->step[i];

        if (step->kind == SM_SIM_STEP_RESPONSE)
            now = step->response.kind;
        item += step->kind == SM_SIM_STEP_IN;
        for (size_t k = 0; step->kind == SM_SIM_STEP_IN && k < t->n; k++) {
            if (t->stay[k].kind != SM_SIM_STEP_IN || t->stay[k].item != item)
                continue;
            w->kind[k] = (unsigned)now;
            w->from[k] = sm_sim_probe_signal(&probe, t_ns);
        }
        sm_sim_probe_step(&probe, sc, step, t_ns);
        t_ns += sm_sim_step_span_ns(step);
    }
}

static void look_for_lost(struct watch *w)
{
    const struct sm_sim_truth *t = w->truth;

    for (size_t i = 0; i < t->n; i++) {
        if (t->stay[i].kind != SM_SIM_STEP_IN)
            continue;
        w->count->beakers++;
        w->count->stayed += t->stay[i].stayed_three;
        w->count->early += !t->stay[i].stayed_three && w->got[i] > 0;
        if (!t->stay[i].stayed_three || w->got[i] > 0)
            continue;
        if (alike_beaker(w, (int)i)) {
            w->count->alike_lost++;
            continue;
        }
        if (short_way(w, (int)i)) {
            w->count->short_lost++;
            continue;
        }
        w->count->lost++;
        print_message("    seed %llu: lost %s, %.1f s to %.1f s, settled after %.1f s\n",
                      (unsigned long long)w->seed, t->stay[i].name,
                      1e-9 * (double)t->stay[i].begin_t_ns, 1e-9 * (double)t->stay[i].end_t_ns,
                      t->stay[i].settle_s);
    }
}

static void session(const struct series *s, uint64_t seed, struct count *count)
{
    static struct sm_method method;
    struct sm_core_setup setup;
    struct sm_random_session r;
    struct sm_scenario sc;
    struct sm_sim_truth truth;
    struct sm_sim *sim;
    struct log_maker m;
    struct watch w = { .truth = &truth, .seed = seed, .count = count };

    sm_scenario_init(&sc);
    draw(s, seed, &r, &sc);
    assert_int_equal(sm_sim_truth_create(&sc, &truth), SM_OK);
    assert_int_equal(sm_sim_create(&sc, &sim), SM_OK);
    w.tolerance = r.tolerance;
    w.stray_s = fmin(s->dwell_s, 22) / 22 + 2 / sc.rate_per_s; /* lib/signal/pace.h: odd_ns */
    w.got = calloc(truth.n, sizeof *w.got);
    w.value = calloc(truth.n, sizeof *w.value);
    look_at_beakers(&w, &sc);
    assert_true(w.got != NULL && w.value != NULL);
    prepare(&m, s, r.tolerance, &setup, &method);
    m.event = on_event;
    m.arg = &w;
    log_maker_open(&m);
    log_maker_play(&m, sim, SM_NEVER);
    look_for_lost(&w);
    log_maker_finish(&m);
    free(w.got);
    free(w.value);
    free(w.kind);
    free(w.from);
    free(w.seen);
    sm_sim_destroy(sim);
    sm_sim_truth_free(&truth);
    sm_scenario_free(&sc);
}

static void print_count(const struct series *s, unsigned sessions, const struct count *c)
{
    print_message("  %s: seeds %llu to %llu, %u beakers, %u stayed three times\n", s->name,
                  (unsigned long long)s->first_seed,
                  (unsigned long long)(s->first_seed + sessions - 1), c->beakers, c->stayed);
    print_message("    %u captures; by value, not transit %u; twice in one beaker %u; in beakers "
                  "left early %u; from air %u, "
                  "from rinse %u, lost %u; not to be told apart: rinses %u, lost %u, "
                  "behind the shortest air %u\n",
                  c->captures, c->by_value, c->doubles, c->early, c->from_air, c->from_rinse,
                  c->lost, c->alike_rinse, c->alike_lost, c->short_lost);
    print_message("    further from the end than the tolerance:");
    for (int k = 0; k < SM_SIM_RESPONSE_COUNT; k++) {
        const struct family *f = &c->family[k];

        print_message(" %s %u of %u (%.0f %%)%s",
                      sm_sim_response_name((enum sm_sim_response_kind)k), f->off, f->captures,
                      f->captures > 0 ? 100.0 * f->off / f->captures : 0,
                      k + 1 < SM_SIM_RESPONSE_COUNT ? "," : "\n");
    }
}

static void nothing_from_air_or_rinse_and_no_beaker_that_stayed_is_lost(void **state)
{
    unsigned beakers = 0, bad = 0;

    (void)state;
    for (size_t i = 0; i < COUNT(all_series); i++) {
        const struct series *series = &all_series[i];
        const unsigned sessions = times * series->sessions / (SLOW_BUILD ? 5 : 1);
        struct count c = { 0 };

        for (unsigned k = 0; k < sessions; k++)
            session(series, series->first_seed + k, &c);
        print_count(series, sessions, &c);
        beakers += c.beakers;
        bad += c.from_air + c.from_rinse + c.lost;
        if (c.stayed < c.beakers / 2 || c.captures < c.stayed)
            fail_msg("%s: %u of %u beakers stayed and %u captures: nothing was tested",
                     series->name, c.stayed, c.beakers, c.captures);
    }
    assert_true(beakers >= 1000);
    if (bad > 0)
        fail_msg("%u captures from air or rinse, or beakers lost, of %u beakers", bad, beakers);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(nothing_from_air_or_rinse_and_no_beaker_that_stayed_is_lost),
    };

    times = argc > 1 && strcmp(argv[1], "many") == 0 ? 10 : 1;
    return cmocka_run_group_tests(tests, NULL, NULL);
}
