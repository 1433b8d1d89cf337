/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A simulated day of one reading a second, as a bench log: it verifies, it runs again with every
 * event and every `carried` equal, and a change of file changes nothing in what was measured. */
#include "log_maker.h"
#include "outcome.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "record/recover.h"
#include "record/verify.h"
#include "sim/probe.h"
#include "slow.h"
#include "view/rerun.h"

#define UTC_US INT64_C(1796112000000000) /* 2026-12-01T08:00:00Z */
#define SHARE 0.1                        /* of the tolerance, that values may differ by */

/* Of both methods. */
static const double ph_tolerance[SM_CLASS_COUNT] = {
    [SM_CLASS_STANDARD] = 0.01, [SM_CLASS_CHECK] = 0.01, [SM_CLASS_SAMPLE] = 0.02
};

static double cpu_s(void)
{
    struct timespec t;

    assert_int_equal(clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t), 0);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void read_scenario(struct sm_scenario *sc, const char *name, const char *text, size_t n)
{
    struct sm_blame list[1];
    struct sm_blames b;
    char line[1024] = "";

    sm_blames_init(&b, list, 1);
    sm_scenario_init(sc);
    if (sm_scenario_read(sc, name, text, n, &b) != SM_OK) {
        if (b.n > 0)
            sm_blame_write(&b.list[0], line, sizeof line);
        fail_msg("%s: %s", name, line);
    }
}

/* A session: where its setup lies, what is put into the probe's way, the sheet. */
struct session {
    const char *setup, *meter;
    struct sm_scenario sc;
    char *sheet;
    size_t sheet_n;
};

static void session_of_files(struct session *s, const char *setup, const char *meter,
                             const char *scenario, const char *sheet)
{
    size_t n;
    char *text = check_read_file(scenario, &n);

    s->setup = setup;
    s->meter = meter;
    read_scenario(&s->sc, scenario, text, n);
    /* A meter that is asked would be asked at other times after a change of file, and the session
     * would be another one. So it sends by itself. */
    assert_true(sm_sim_shape_known("plain-mv", &s->sc.shape));
    free(text);
    s->sheet = check_read_file(sheet, &s->sheet_n);
}

static void session_finish(struct session *s)
{
    sm_scenario_free(&s->sc);
    free(s->sheet);
}

/* Begins it: the file, the link, the analyst, the sheet. */
static void session_begin(struct session *s, struct log_maker *m)
{
    log_maker_open(m);
    log_maker_act(m, SM_ACT_ANALYST, m->setup->people[0].who);
    log_maker_sheet(m, "sheets/test.yaml", s->sheet, s->sheet_n);
}

/* --- the day --- */

#define SHIFTS 3
#define ROUNDS 10
#define SAMPLES 10
#define DAY_S 86400

static const char *const day_head =
    "seed 31\nrate 1 /s\njitter 15 ms\nnoise 0.1 mV ar 0.3\nstep 0.1 mV\n"
    "response double 3 s 12 s 8 %\ndrift 0.3 mV/h\ntemperature 20 °C\nprobe-response 8 s\n"
    "electrode pH slope 98.6 % offset 3.9 mV\nrinse-water 6.2 pH\ntolerance 0.59 mV\ndwell 30 s\n"
    "open word \"----\"\nshape r-mv\nanswer 120 ms\nair 20 s\n";

struct texts {
    struct sm_text scenario, sheet;
};

static void way(struct texts *t)
{
    sm_text_add(&t->scenario, "air 4 s\nrinse 8 s\nair 3 s\n");
}

static void standard(struct texts *t, const char *name, double ph, const char *as)
{
    sm_text_addf(&t->scenario, "in %s %.2f pH for 150 s as %s\n", name, ph, as);
    sm_text_addf(&t->sheet, "  - { %s: %s }\n", as, name);
    way(t);
}

static void sample(struct texts *t, int shift, int round, int i)
{
    /* 5.97 to 8.97: none reads like the one before it, nor like the check */
    const double ph = 5.97 + 0.30 * ((7 * i + 3 * round + shift) % 11);

    sm_text_addf(&t->scenario, "in s%d-%d-%d %.2f pH for 240 s at %.1f °C\n", shift, round, i, ph,
                 9.0 + 0.4 * i);
    sm_text_addf(&t->sheet, "  - { sample: s%d-%d-%d }\n", shift, round, i);
    way(t);
}

/* In air the meter says so: a transit that is not seen would shift the whole sheet, and that is not
 * what is tested here (see test_beakers.c). Three shifts, each with five standards and a check, ten
 * rounds of ten samples, a check after each; then the probe stands in the last beaker until the day
 * is over. */
static void day_of_beakers(struct session *s)
{
    static char scenario[65536], sheet[65536];
    struct texts t;

    sm_text_init(&t.scenario, scenario, sizeof scenario);
    sm_text_init(&t.sheet, sheet, sizeof sheet);
    sm_text_add(&t.scenario, day_head);
    sm_text_add(&t.sheet, "method: ph-surface\nsensor: el-14\nitems:\n");
    for (int shift = 1; shift <= SHIFTS; shift++) {
        standard(&t, "B1", 1.68, "standard");
        standard(&t, "B4", 4.00, "standard");
        standard(&t, "B7", 6.88, "standard");
        standard(&t, "B9", 9.22, "standard");
        standard(&t, "B10", 10.07, "standard");
        standard(&t, "C7", 7.02, "check");
        for (int round = 1; round <= ROUNDS; round++) {
            for (int i = 1; i <= SAMPLES; i++)
                sample(&t, shift, round, i);
            standard(&t, "C7", 7.02, "check");
        }
    }
    sm_text_addf(&t.scenario, "in rest 7.00 pH for %d s\n",
                 DAY_S - 20 - SHIFTS * ((6 + ROUNDS) * 165 + ROUNDS * SAMPLES * 255));
    assert_false(t.scenario.cut || t.sheet.cut);
    s->setup = "conf/stillmark.yaml";
    s->meter = "bench-2";
    read_scenario(&s->sc, "day", scenario, t.scenario.len);
    s->sheet = strdup(sheet);
    assert_non_null(s->sheet);
    s->sheet_n = t.sheet.len;
}

struct day_count {
    size_t readings, carried;
    struct outcomes *outcomes;
};

static void count_event(void *arg, struct log_maker *m, const struct sm_event *e)
{
    struct day_count *d = arg;

    (void)m;
    d->readings += e->kind == SM_EVENT_READING;
    d->carried += e->kind == SM_EVENT_CARRIED;
    outcomes_take(d->outcomes, e);
}

/* After midnight the file is changed at the first moment that may be, as the daemon does. */
static void play_over_midnight(struct log_maker *m, struct sm_sim *sim)
{
    const int64_t first_day = sm_utc_day(m->begin_utc_us);
    bool rolled = false;

    while (log_maker_step(m, sim, SM_NEVER)) {
        if (!rolled && sm_utc_day(m->begin_utc_us + m->now_ns / 1000) > first_day &&
            sm_core_may_roll(m->core)) {
            log_maker_roll(m);
            rolled = true;
        }
    }
    assert_true(rolled);
}

static void tell(void *arg, const char *line)
{
    print_message("    %s: %s\n", (const char *)arg, line);
}

/* Every file verifies, follows the one before, and runs again without a difference. */
static void check_files(const struct log_maker *m, const char *what, double *ret_rerun_s,
                        size_t *ret_events)
{
    struct sm_verify before, v;
    struct sm_carried *last = NULL;
    int64_t last_ordinal = 0;
    char why[SM_REASON_SIZE];
    double begin_s;

    *ret_rerun_s = 0;
    *ret_events = 0;
    for (size_t i = 0; i < m->n_files; i++) {
        const struct log_maker_file *f = &m->file[i];
        struct sm_rerun_ask ask = { .text = f->text,
                                    .n = f->n,
                                    .before = last,
                                    .before_ordinal = last_ordinal,
                                    .tell = tell,
                                    .most_told = 10 };
        struct sm_rerun_told told;
        char name[80];

        snprintf(name, sizeof name, "%.40s, file %zu", what, i + 1);
        ask.arg = name;
        sm_verify(f->text, f->n, m->key, &v);
        if (!v.good || v.after_bytes > 0 || !v.closed)
            fail_msg("%s: does not verify: %s", name, v.why);
        if (i > 0 && sm_verify_chain(&before, &v, why) != SM_OK)
            fail_msg("%s: %s", name, why);
        begin_s = cpu_s();
        if (sm_rerun(&ask, &told) != SM_OK)
            fail_msg("%s: %s", name, told.why);
        *ret_rerun_s += cpu_s() - begin_s;
        if (told.differences > 0 || told.how != SM_COMPARE_BYTES || told.passed_over > 0 ||
            told.chained != (i > 0))
            fail_msg("%s: %zu differences, %zu passed over, chained %d", name, told.differences,
                     told.passed_over, told.chained);
        *ret_events += told.events;
        free(last);
        last = told.last;
        last_ordinal = told.ordinal;
        before = v;
    }
    free(last);
}

static void a_day_of_readings_runs_again_with_every_event_and_carried_equal(void **state)
{
    static struct outcomes outcomes;
    struct day_count d = { .outcomes = &outcomes };
    struct session s = { 0 };
    struct sm_sim *sim;
    struct log_maker m;
    double begin_s, play_s = 0, core_s = 0, rerun_s;
    size_t events;

    (void)state;
    memset(&outcomes, 0, sizeof outcomes);
    day_of_beakers(&s);
    for (int logged = 0; logged < 2; logged++) { /* first the core alone, for its time */
        assert_int_equal(sm_sim_create(&s.sc, &sim), SM_OK);
        log_maker_prepare(&m, s.setup, s.meter, UTC_US);
        m.unlogged = !logged;
        if (logged) {
            m.event = count_event;
            m.arg = &d;
        }
        session_begin(&s, &m);
        begin_s = cpu_s();
        if (logged)
            play_over_midnight(&m, sim);
        else
            log_maker_play(&m, sim, SM_NEVER);
        play_s = cpu_s() - begin_s;
        if (!logged) {
            core_s = play_s;
            log_maker_finish(&m);
        }
        sm_sim_destroy(sim);
    }
    log_maker_end(&m);
    assert_int_equal(m.n_files, 2);
    check_files(&m, "day", &rerun_s, &events);
    print_message("  %zu readings, %zu events, %zu carried, %zu captures, %.1f MB of log\n",
                  d.readings, events, d.carried, outcomes_count(&outcomes, SM_EVENT_CAPTURE),
                  1e-6 * (double)(m.file[0].n + m.file[1].n));
    print_message("  simulator and core %.1f µs a reading, with log and stamps %.1f µs; run again "
                  "%.1f µs, the day in %.2f s\n",
                  1e6 * core_s / (double)d.readings, 1e6 * play_s / (double)d.readings,
                  1e6 * rerun_s / (double)d.readings, rerun_s);
    assert_in_range(d.readings, DAY_S - 600, DAY_S + 1);
    /* every item of the sheet was captured, each curve accepted, each check passed, and the last of
     * them released what was left */
    assert_int_equal(outcomes_count(&outcomes, SM_EVENT_CURVE), SHIFTS);
    for (size_t i = 0; i < outcomes.n; i++) {
        const struct outcome *x = &outcomes.list[i];

        if ((x->kind == SM_EVENT_CURVE || x->kind == SM_EVENT_CHECK) && !x->good)
            fail_msg("%s of item %zu (%s) is not good", sm_event_kind_name(x->kind), x->item,
                     x->why);
        if (x->kind == SM_EVENT_RESULT && x->state != SM_RESULT_RELEASED)
            fail_msg("result %s is %s: %s", x->name, sm_result_state_name(x->state), x->why);
    }
    assert_int_equal(outcomes_count(&outcomes, SM_EVENT_RESULT), SHIFTS * ROUNDS * SAMPLES);
    assert_int_equal(outcomes_count(&outcomes, SM_EVENT_CHECK), SHIFTS * (1 + ROUNDS));
    log_maker_finish(&m);
    session_finish(&s);
}

/* --- cut in two --- */

static void take(void *arg, struct log_maker *m, const struct sm_event *e)
{
    (void)m;
    outcomes_take(arg, e);
}

/* Plays the session; the file is changed after each of the things that cut[] names by number (of
 * all that came from the simulator and the clock). When may[] is given it is told where that is
 * possible. Returns how many things came. */
static size_t play_cut(struct session *s, struct outcomes *o, const size_t *cut, size_t n_cuts,
                       bool *may, size_t cap)
{
    struct log_maker m;
    struct sm_sim *sim;
    size_t n = 0, next = 0;

    memset(o, 0, sizeof *o);
    assert_int_equal(sm_sim_create(&s->sc, &sim), SM_OK);
    log_maker_prepare(&m, s->setup, s->meter, UTC_US);
    m.unlogged = true;
    m.event = take;
    m.arg = o;
    session_begin(s, &m);
    while (log_maker_step(&m, sim, SM_NEVER)) {
        if (may != NULL) {
            assert_true(n < cap);
            may[n] = sm_core_may_roll(m.core);
        }
        if (next < n_cuts && n == cut[next]) {
            log_maker_roll(&m);
            next++;
        }
        n++;
    }
    assert_int_equal(next, n_cuts);
    log_maker_finish(&m);
    sm_sim_destroy(sim);
    return n;
}

#define STEPS_MAX 60000

/* Cut once, at every place where the file may be changed (every `every`-th of them). */
static void cut_everywhere(struct session *s, const char *name, size_t every)
{
    static bool may[STEPS_MAX];
    static struct outcomes whole, cut;
    size_t n = play_cut(s, &whole, NULL, 0, may, STEPS_MAX), places = 0, cuts = 0;
    double most = 0;

    for (size_t i = 0; i < n; i++) {
        char what[120];

        if (!may[i] || places++ % (SLOW_BUILD ? 10 * every : every) != 0)
            continue;
        (void)play_cut(s, &cut, &i, 1, NULL, 0);
        snprintf(what, sizeof what, "%.40s cut after %zu of %zu", name, i, n);
        most = fmax(most, outcomes_compare(what, &whole, &cut, SHARE, ph_tolerance));
        cuts++;
    }
    print_message("  %s: %zu captures; may be cut at %zu of %zu places; %zu of them tried, values "
                  "differ by at most %.3f tolerances\n",
                  name, outcomes_count(&whole, SM_EVENT_CAPTURE), places, n, cuts, most);
    assert_true(cuts >= (SLOW_BUILD ? 5 : 50) && outcomes_count(&whole, SM_EVENT_CAPTURE) >= 15);
}

static void the_demonstration_cut_in_two_anywhere_gives_the_same(void **state)
{
    struct session s;

    (void)state;
    session_of_files(&s, "conf/try.yaml", "try", "tests/sim/scenarios/try.scn",
                     "conf/sheets/try.yaml");
    cut_everywhere(&s, "the demonstration", 1);
    session_finish(&s);
}

/* The good morning's sheet, as the simulator's scenario has it. */
static const char good_sheet[] =
    "method: ph-surface\nitems:\n"
    "  - { standard: B1 }\n  - { standard: B4 }\n  - { standard: B7 }\n  - { standard: B9 }\n"
    "  - { standard: B10 }\n  - { check: C7 }\n"
    "  - { sample: raw }\n  - { sample: settled }\n  - { sample: filtered }\n  - { sample: final "
    "}\n"
    "  - { sample: tank a }\n  - { sample: tank b }\n  - { sample: network north }\n"
    "  - { sample: network south }\n  - { sample: well 3 }\n  - { sample: well 5 }\n"
    "  - { check: C7 }\n"
    "  - { sample: raw 2 }\n  - { sample: settled 2 }\n  - { sample: filtered 2 }\n"
    "  - { sample: final 2 }\n  - { sample: tank a 2 }\n  - { sample: tank b 2 }\n"
    "  - { sample: network north 2 }\n  - { sample: network south 2 }\n  - { sample: well 3 2 }\n"
    "  - { sample: well 5 2 }\n  - { check: C7 }\n";

static void a_good_morning_cut_in_two_gives_the_same(void **state)
{
    struct session s;

    (void)state;
    session_of_files(&s, "conf/try.yaml", "try", "tests/sim/scenarios/good-day.scn",
                     "conf/sheets/morning.yaml");
    free(s.sheet);
    s.sheet = strdup(good_sheet);
    assert_non_null(s.sheet);
    s.sheet_n = sizeof good_sheet - 1;
    cut_everywhere(&s, "a good morning", 97);
    session_finish(&s);
}

/* --- restart --- */

static void after_a_restart_the_next_file_begins_with_what_the_one_before_ended_with(void **state)
{
    static struct outcomes outcomes;
    struct session s;
    struct sm_sim *sim;
    struct log_maker m;
    struct sm_recovered *r = calloc(1, sizeof *r);
    double rerun_s;
    size_t events;

    (void)state;
    assert_non_null(r);
    session_of_files(&s, "conf/try.yaml", "try", "tests/sim/scenarios/try.scn",
                     "conf/sheets/try.yaml");
    assert_int_equal(sm_sim_create(&s.sc, &sim), SM_OK);
    memset(&outcomes, 0, sizeof outcomes);
    log_maker_prepare(&m, s.setup, s.meter, UTC_US);
    m.event = take;
    m.arg = &outcomes;
    session_begin(&s, &m);
    log_maker_play(&m, sim, 70 * SM_NS_PER_S);
    log_maker_restart(&m, 3 * SM_NS_PER_S);
    log_maker_play(&m, sim, SM_NEVER);
    log_maker_end(&m);
    assert_int_equal(m.n_files, 2);
    check_files(&m, "restart", &rerun_s, &events);
    /* what the daemon would have recovered is what the file began with, before ageing */
    assert_int_equal(sm_recover(m.file[0].text, m.file[0].n, r), SM_OK);
    assert_true(r->closed && r->sheet_text_n == s.sheet_n);
    assert_memory_equal(r->sheet_text, s.sheet, s.sheet_n);
    sm_recovered_finish(r);
    free(r);
    log_maker_finish(&m);
    sm_sim_destroy(sim);
    session_finish(&s);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_day_of_readings_runs_again_with_every_event_and_carried_equal),
        cmocka_unit_test(the_demonstration_cut_in_two_anywhere_gives_the_same),
        cmocka_unit_test(a_good_morning_cut_in_two_gives_the_same),
        cmocka_unit_test(after_a_restart_the_next_file_begins_with_what_the_one_before_ended_with),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
