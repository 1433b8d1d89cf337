/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The seam: what a signal says of stays, ways between them, marks and ends. */
#include "signal/made.h"

static struct tape tape;

/* A bench of 1 reading/s without noise, dwell 22 s, over 20 s, tolerance 0.6. */
static struct bench plain(void)
{
    struct bench b = made_bench(1);
    const struct sm_rule rule = made_rule(0.6, 22, 20);

    memset(&tape, 0, sizeof tape);
    b.tau_s = 0;
    b.step = 0.1;
    b.signal = made_signal(&rule);
    b.tape = &tape;
    return b;
}

static void mark(struct bench *b, enum sm_class class, unsigned clock)
{
    const struct sm_signal_input in = {
        .kind = SM_SIGNAL_MARK, .t_ns = made_ns(b->t_s), .class = class, .clock = clock
    };

    made_feed(b->signal, b->tape, &in);
}

static void tick(struct bench *b)
{
    const struct sm_signal_input in = { .kind = SM_SIGNAL_TICK, .t_ns = made_ns(b->t_s) };

    made_feed(b->signal, b->tape, &in);
}

static void end(struct bench *b, const char *why)
{
    const struct sm_signal_input in = { .kind = SM_SIGNAL_END,
                                        .t_ns = made_ns(b->t_s),
                                        .why = why };

    made_feed(b->signal, b->tape, &in);
}

static void finish(struct bench *b, const char *what, const char *want)
{
    sm_signal_destroy(b->signal);
    check_story(what, b->tape, want);
}

static void check_ns(const char *what, int64_t got, double want_s)
{
    if (got != made_ns(want_s))
        fail_msg("%s: got %.3f s, want %.3f s", what, 1e-9 * (double)got, want_s);
}

static void
the_first_reading_begins_an_immersion_and_the_dwell_comes_before_the_capture(void **state)
{
    struct bench b = plain();
    const struct sm_signal_event *e;

    (void)state;
    made_stay(&b, 12.3, 22);
    assert_int_equal(tape_count(&tape, SM_SIGNAL_SETTLED), 0);
    assert_true(sm_signal_open(b.signal));
    made_stay(&b, 12.3, 20);
    assert_false(sm_signal_open(b.signal));
    e = tape_get(&tape, SM_SIGNAL_MOVED, 0);
    check_ns("moved from", e->from_t_ns, 1);
    e = tape_get(&tape, SM_SIGNAL_SETTLED, 0);
    check_ns("settled", e->t_ns, 23);
    check_ns("window from", e->settled.from_t_ns, 3);
    check_ns("window to", e->settled.to_t_ns, 23);
    check_ns("since moved", e->settled.since_moved_ns, 22);
    assert_int_equal(e->settled.readings, 21);
    assert_int_equal(e->settled.rule, SM_RULE_SPREAD);
    assert_true(e->settled.prescribed);
    assert_false(e->settled.doubt.has);
    assert_false(e->settled.end_value.has);
    check_close("value", e->settled.value, 12.3, 1e-12);
    check_close("tolerance", e->settled.tolerance, 0.6, 0);
    finish(&b, "one stay", "moved:start, settled");
}

static void a_still_display_has_the_uncertainty_of_its_step(void **state)
{
    struct bench b = plain();
    const struct sm_settled *s;

    (void)state;
    made_stay(&b, -7.0, 60);
    s = &tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled;
    assert_true(s->part[SM_PART_STEP].has && s->part[SM_PART_NOISE].has);
    /* half a step either way, rectangular (JCGM 100:2008, F.2.2.1): step / sqrt 12; two of them */
    check_close("step part", s->part[SM_PART_STEP].value, 2 * 0.1 / sqrt(12), 1e-15);
    check_close("noise part", s->part[SM_PART_NOISE].value, 0, 1e-12);
    check_close("still to come", s->part[SM_PART_TO_COME].value, 0, 1e-12);
    check_close("sd", s->sd, 0, 1e-12);
    check_close("step", s->step, 0.1, 0);
    check_close("u95", s->u95, 2 * 0.1 / sqrt(12), 1e-15);
    sm_signal_destroy(b.signal);
}

static void what_no_one_knows_is_left_out(void **state)
{
    struct bench b = plain();
    const struct sm_settled *s;

    (void)state;
    b.hide_step = true;
    made_stay(&b, -7.0, 60);
    s = &tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled;
    assert_false(s->part[SM_PART_STEP].has); /* it never changed: the step is unknown */
    assert_false(s->part[SM_PART_LONG_NOISE].has);
    assert_false(s->part[SM_PART_DRIFT].has);
    assert_false(s->other_mean[0].has);
    sm_signal_destroy(b.signal);
}

static void a_word_or_an_implausible_value_after_a_capture_is_a_transit_however_short(void **state)
{
    static const struct {
        const char *name;
        enum sm_flag flag;
        double value;
        unsigned readings;
        const char *want;
    } cases[] = {
        { "open", SM_FLAG_OPEN, 0, 2,
          "moved:start, settled, open, transit:open circuit, moved:transit, settled" },
        { "one open", SM_FLAG_OPEN, 0, 1,
          "moved:start, settled, open, transit:open circuit, moved:transit, settled" },
        { "over", SM_FLAG_OVER, 0, 2,
          "moved:start, settled, open, transit:word, moved:transit, settled" },
        { "under", SM_FLAG_UNDER, 0, 2,
          "moved:start, settled, open, transit:word, moved:transit, settled" },
        { "implausible", SM_FLAG_OK, 1600, 2,
          "moved:start, settled, open, transit:implausible, moved:transit, settled" },
        { "unusable", SM_FLAG_UNUSABLE, 0, 2, "moved:start, settled" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct bench b = plain();
        struct sm_rule rule = made_rule(0.6, 22, 20);
        int64_t to_ns;

        sm_signal_destroy(b.signal);
        rule.has_plausible = true;
        rule.plausible_from = -1500;
        rule.plausible_to = 1500;
        b.signal = made_signal(&rule);
        made_stay(&b, 50, 40);
        for (unsigned k = 0; k < cases[i].readings; k++)
            made_put(&b, b.t_s += 1, cases[i].value, cases[i].flag);
        to_ns = made_ns(b.t_s + 1);
        made_stay(&b, 50.1, 60);
        if (i < 5) {
            const struct sm_signal_event *e = tape_get(&tape, SM_SIGNAL_TRANSIT, 0);

            check_ns("transit from", e->from_t_ns, 41);
            assert_int_equal(e->to_t_ns, to_ns);
            assert_int_equal(tape_get(&tape, SM_SIGNAL_MOVED, 1)->from_t_ns, to_ns);
        }
        finish(&b, cases[i].name, cases[i].want);
    }
}

static void one_step_alone_is_moved_by_value_at_once(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    made_stay(&b, 58, 4); /* the fourth odd reading is none too few */
    check_story("at once", &tape, "moved:start, settled, moved:value");
    check_ns("from", tape_get(&tape, SM_SIGNAL_MOVED, 1)->from_t_ns, 41);
    made_stay(&b, 58, 40);
    finish(&b, "step", "moved:start, settled, moved:value, settled");
}

static void two_departures_less_than_the_dwell_apart_are_a_transit(void **state)
{
    struct bench b = plain();
    const struct sm_signal_event *e;

    (void)state;
    made_stay(&b, 50, 40);
    made_stay(&b, 20, 8);
    made_stay(&b, -30, 60);
    e = tape_get(&tape, SM_SIGNAL_TRANSIT, 0);
    check_ns("from", e->from_t_ns, 41);
    check_ns("to", e->to_t_ns, 49);
    assert_false(e->returned);
    check_ns("moved", tape_get(&tape, SM_SIGNAL_MOVED, 2)->from_t_ns, 49);
    finish(&b, "rinse",
           "moved:start, settled, moved:value, transit:two departures, moved:transit, settled");
}

static void two_departures_the_dwell_apart_are_no_transit(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    for (int i = 0; i < 31; i++) /* creeping: spread over the tolerance, no departure */
        made_stay(&b, 20 + 0.04 * i, 1);
    made_stay(&b, -30, 60);
    finish(
        &b, "two changes",
        "moved:start, settled, moved:value, not-settled:moved on before it settled, moved:value, "
        "settled");
}

static void after_a_capture_a_lift_is_a_transit_though_it_comes_back_alike(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    made_stay(&b, 90, 6);
    made_stay(&b, 50, 60);
    finish(&b, "lift",
           "moved:start, settled, moved:value, transit:two departures, moved:transit, settled");
}

static void before_a_capture_a_lift_that_comes_back_alike_is_put_back(void **state)
{
    static const struct {
        const char *name;
        bool open;
        const char *want;
    } cases[] = { { "word", true, "moved:start, open, lift:open circuit, settled" },
                  { "value", false, "moved:start, lift:two departures, settled" } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct bench b = plain();
        const struct sm_signal_event *e;

        made_stay(&b, 50, 12);
        if (cases[i].open)
            made_open(&b, 5);
        else
            made_stay(&b, 130, 5);
        made_stay(&b, 50.2, 60);
        e = tape_get(&tape, SM_SIGNAL_TRANSIT, 0);
        check_ns("from", e->from_t_ns, 13);
        check_ns("to", e->to_t_ns, 18);
        assert_true(e->returned);
        e = tape_get(&tape, SM_SIGNAL_SETTLED, 0);
        assert_int_equal(e->settled.lifts, 1);
        /* it was left before the dwell was over and may have been a rinse: the dwell counts again
         */
        check_ns("settled", e->t_ns, 18 + 22);
        check_ns("since moved", e->settled.since_moved_ns, 18 + 22 - 1);
        finish(&b, cases[i].name, cases[i].want);
    }
}

static void after_the_dwell_a_lift_costs_no_time_because_the_old_window_goes_on(void **state)
{
    struct bench b = plain();
    const struct sm_rule rule = made_rule(0.6, 22, 40);
    const struct sm_signal_event *e;

    (void)state;
    sm_signal_destroy(b.signal);
    b.signal = made_signal(&rule);
    made_stay(&b, 50, 30);
    made_open(&b, 5);
    made_stay(&b, 50.2, 60);
    e = tape_get(&tape, SM_SIGNAL_SETTLED, 0);
    check_ns("settled", e->t_ns, 41);
    check_ns("window from", e->settled.from_t_ns, 1);
    assert_int_equal(e->settled.lifts, 1);
    finish(&b, "lift", "moved:start, open, lift:open circuit, settled");
}

static void a_rinse_dipped_into_twice_is_not_a_stay(void **state)
{
    static const bool open[] = { true, false };

    (void)state;
    for (size_t i = 0; i < COUNT(open); i++) {
        struct bench b = plain();

        made_stay(&b, 50, 40);
        made_open(&b, 3);
        for (int dip = 0; dip < 4; dip++) {
            made_stay(&b, 5.1, 15);
            if (open[i])
                made_open(&b, 4);
            else
                made_stay(&b, -60, 4);
        }
        assert_int_equal(tape_count(&tape, SM_SIGNAL_SETTLED), 1);
        assert_int_equal(tape_count(&tape, SM_SIGNAL_NOT_SETTLED), 0);
        made_stay(&b, -80, 60);
        assert_int_equal(tape_count(&tape, SM_SIGNAL_SETTLED), 2);
        sm_signal_destroy(b.signal);
    }
}

static void before_a_capture_a_lift_that_comes_back_elsewhere_begins_a_new_immersion(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 12);
    made_open(&b, 5);
    made_stay(&b, 54, 60);
    check_ns("settled", tape_get(&tape, SM_SIGNAL_SETTLED, 0)->t_ns, 18 + 22);
    finish(&b, "elsewhere", "moved:start, open, transit:open circuit, moved:transit, settled");
}

static void a_signal_that_only_passes_by_the_old_level_is_not_back(void **state)
{
    static const double by[] = { 60, 51.2, 50, 48.8, 40, 25, 12, 5 };
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 12);
    made_stay(&b, 130, 5);
    for (size_t i = 0; i < COUNT(by); i++)
        made_stay(&b, by[i], 1);
    made_stay(&b, 0, 60);
    finish(&b, "passes by", "moved:start, transit:two departures, moved:transit, settled");
}

static void what_follows_within_a_moment_of_the_first_reading_belongs_to_it(void **state)
{
    struct bench b = plain();

    (void)state;
    b.rate = 5;
    made_stay(&b, 50, 1);
    made_stay(&b, 80, 60);
    finish(&b, "start", "moved:start, settled");
}

static void a_lift_too_long_to_be_put_back_begins_a_new_immersion(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 12);
    made_open(&b, 14);
    made_stay(&b, 50, 60);
    check_ns("settled", tape_get(&tape, SM_SIGNAL_SETTLED, 0)->t_ns, 27 + 22);
    finish(&b, "long", "moved:start, open, transit:open circuit, moved:transit, settled");
}

static void an_immersion_left_unsettled_is_told_only_if_it_outlasted_the_dwell(void **state)
{
    static const struct {
        double stay_s;
        const char *want;
    } cases[] = { { 15, "moved:start, open, transit:open circuit, moved:transit, settled" },
                  { 30, "moved:start, open, not-settled:moved on before it settled, "
                        "transit:open circuit, moved:transit, settled" } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct bench b = plain();

        b.tau_s = 30;
        b.value = 100;
        made_stay(&b, 0, cases[i].stay_s);
        b.tau_s = 0;
        made_open(&b, 3);
        made_stay(&b, -80, 60);
        finish(&b, i == 0 ? "short" : "long", cases[i].want);
    }
}

static void air_and_rinses_make_one_way_with_one_end(void **state)
{
    struct bench b = plain();
    const struct sm_signal_event *last;

    (void)state;
    made_stay(&b, 50, 40);
    made_open(&b, 3);
    made_stay(&b, 5, 1);
    made_open(&b, 2); /* back in the air before the new place was calm */
    made_stay(&b, -60, 60);
    last = tape_get(&tape, SM_SIGNAL_TRANSIT, 0);
    check_ns("from", last->from_t_ns, 41);
    check_ns("to", last->to_t_ns, 47);
    finish(&b, "way", "moved:start, settled, open, transit:open circuit, moved:transit, settled");
}

static void a_rinse_after_air_goes_on_as_the_same_way(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    made_open(&b, 3);
    made_stay(&b, 5, 12);
    made_stay(&b, -60, 60);
    check_ns("from", tape_get(&tape, SM_SIGNAL_TRANSIT, 1)->from_t_ns, 41);
    finish(&b, "rinse",
           "moved:start, settled, open, transit:open circuit, moved:transit, "
           "transit:open circuit, moved:transit, settled");
}

static void nothing_is_captured_within_a_dwell_of_a_swift_change(void **state)
{
    struct bench b = plain();

    (void)state;
    for (int i = 0; i < 30; i++) /* no departure, but the end of a rinse could hide in it */
        made_stay(&b, 50 + 5 * i, 1);
    made_stay(&b, 50 + 5 * 29, 60);
    check_ns("settled", tape_get(&tape, SM_SIGNAL_SETTLED, 0)->t_ns, 30 + 22);
    finish(&b, "ramp", "moved:start, settled");
}

static void the_longest_wait_is_told_once_and_then_nothing_is_captured(void **state)
{
    struct bench b = plain();
    struct sm_rule rule = made_rule(0.6, 22, 20);

    (void)state;
    sm_signal_destroy(b.signal);
    for (unsigned c = 0; c < SM_CLASS_COUNT; c++)
        rule.longest_wait_ns[c] = 100 * SM_NS_PER_S;
    b.signal = made_signal(&rule);
    assert_true(sm_signal_deadline(b.signal) == SM_NEVER);
    b.tau_s = 60;
    b.value = 300;
    made_stay(&b, 0, 90);
    check_ns("deadline", sm_signal_deadline(b.signal), 101);
    b.t_s = 101;
    tick(&b);
    check_story("told", &tape, "moved:start, not-settled:longest wait");
    assert_true(sm_signal_deadline(b.signal) == SM_NEVER);
    assert_true(sm_signal_open(b.signal));
    b.tau_s = 0;
    b.value = 0;
    tick(&b);
    b.t_s += 1;
    made_stay(&b, b.value, 200); /* a step, then flat */
    made_open(&b, 3);
    made_stay(&b, 10, 60);
    finish(&b, "wait",
           "moved:start, not-settled:longest wait, moved:value, settled, open, "
           "transit:open circuit, moved:transit, settled");
}

static void without_a_tick_the_longest_wait_comes_with_the_next_reading(void **state)
{
    struct bench b = plain();
    struct sm_rule rule = made_rule(0.6, 22, 20);

    (void)state;
    sm_signal_destroy(b.signal);
    rule.longest_wait_ns[SM_CLASS_STANDARD] = 23 * SM_NS_PER_S;
    b.signal = made_signal(&rule);
    b.tau_s = 30;
    b.value = 300;
    made_stay(&b, 0, 400);
    check_ns("told", tape_get(&tape, SM_SIGNAL_NOT_SETTLED, 0)->t_ns, 24);
    finish(&b, "no tick", "moved:start, not-settled:longest wait");
}

static void a_mark_always_begins_an_immersion_and_no_reading_before_it_counts(void **state)
{
    struct bench b = plain();
    struct sm_rule rule = made_rule(0.6, 22, 20);
    const struct sm_signal_event *e;

    (void)state;
    sm_signal_destroy(b.signal);
    rule.tolerance[SM_CLASS_SAMPLE] = 0.7;
    b.signal = made_signal(&rule);
    made_stay(&b, 50, 40);
    b.t_s += 0.5;
    mark(&b, SM_CLASS_SAMPLE, 7);
    b.t_s -= 0.5;
    made_stay(&b, 50, 60);
    e = tape_get(&tape, SM_SIGNAL_MOVED, 1);
    check_ns("moved", e->from_t_ns, 40.5);
    assert_int_equal(e->clock, 7);
    e = tape_get(&tape, SM_SIGNAL_SETTLED, 1);
    check_ns("the dwell counts from the mark", e->t_ns, 63);
    assert_int_equal(e->clock, 7);
    check_close("tolerance of the marked item", e->settled.tolerance, 0.7, 0);
    if (e->settled.from_t_ns < made_ns(40.5))
        fail_msg("a reading from before the mark is in the window");
    finish(&b, "mark", "moved:start, settled, moved:mark, settled");
}

static void nothing_moves_before_a_mark_that_came_in_between(void **state)
{
    (void)state;
    for (double at_s = 0.3; at_s < 4; at_s += 0.3) {
        struct bench b = plain();
        bool marked = false;

        b.rate = 10;
        made_stay(&b, 50, 40);
        for (int i = 0; i < 60; i++) { /* a slow start, seen by blocks that began before the mark */
            const double t_s = b.t_s - 40;

            if (!marked && t_s > at_s) {
                mark(&b, SM_CLASS_SAMPLE, 0);
                marked = true;
            }
            made_stay(&b, 50 + 0.5 * t_s * t_s, 0.1);
        }
        marked = false;
        for (size_t i = 0; i < tape.n; i++) {
            const struct sm_signal_event *e = &tape.event[i];
            static int64_t mark_t_ns;

            if (e->kind == SM_SIGNAL_MOVED && e->by == SM_MOVED_MARK) {
                marked = true;
                mark_t_ns = e->t_ns;
            } else if (e->kind == SM_SIGNAL_MOVED && marked && e->from_t_ns < mark_t_ns) {
                fail_msg("mark %.1f s after the start: moved before it", at_s);
            }
        }
        assert_true(marked);
        sm_signal_destroy(b.signal);
    }
}

static void odd_readings_from_before_a_mark_do_not_count_after_it(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    made_stay(&b, 90, 3);
    mark(&b, SM_CLASS_SAMPLE, 0);
    made_stay(&b, 90, 60);
    for (size_t i = 0; i < tape.n; i++) {
        if (tape.event[i].kind == SM_SIGNAL_SETTLED && i > 1 &&
            tape.event[i].settled.from_t_ns < made_ns(43))
            fail_msg("window from before the mark");
    }
    assert_int_equal(tape_count(&tape, SM_SIGNAL_SETTLED), 2);
    sm_signal_destroy(b.signal);
}

static void a_mark_while_the_old_signal_still_settles_waits_for_the_dwell_and_the_rule(void **state)
{
    struct bench b = plain();

    (void)state;
    b.tau_s = 10;
    b.value = 200;
    made_stay(&b, 0, 30);
    mark(&b, SM_CLASS_SAMPLE, 0);
    made_stay(&b, 0, 100);
    finish(&b, "mark",
           "moved:start, not-settled:a mark came before it settled, moved:mark, settled");
}

static void a_mark_in_the_air_is_followed_by_the_transit(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    made_open(&b, 3);
    mark(&b, SM_CLASS_SAMPLE, 0);
    made_open(&b, 2);
    made_stay(&b, 20, 60);
    finish(&b, "mark in the air",
           "moved:start, settled, open, moved:mark, transit:open circuit, moved:transit, settled");
}

static void an_end_says_why_unless_captured_and_the_next_reading_begins_anew(void **state)
{
    struct bench b = plain();

    (void)state;
    end(&b, "nothing yet");
    made_stay(&b, 50, 10);
    end(&b, "silent");
    made_stay(&b, 50, 40);
    end(&b, "link lost");
    made_stay(&b, 50, 40);
    finish(&b, "ends",
           "moved:start, not-settled:silent, moved:start, settled, moved:start, settled");
}

static void an_end_during_a_lift_ends_the_immersion_before_it(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 12);
    made_open(&b, 3);
    assert_true(sm_signal_open(b.signal)); /* it may come back */
    end(&b, "silent");
    made_stay(&b, 50, 2);
    finish(&b, "end", "moved:start, open, not-settled:silent, moved:start");
}

static void still_in_it_nothing_is_captured_until_the_probe_moves(void **state)
{
    static const char *const how[] = { "stays", "step", "open", "mark" };
    static const char *const want[] = { "", "moved:value, settled",
                                        "open, transit:open circuit, moved:transit, settled",
                                        "moved:mark, settled" };

    (void)state;
    for (size_t i = 0; i < COUNT(how); i++) {
        struct bench b = plain();
        const struct sm_rule rule = made_rule(0.6, 22, 20);
        const struct sm_channel_memory memory = { 0 };
        const struct sm_signal_start still = { .place = SM_PLACE_STILL, .value = 50, .u95 = 0.3 };
        struct sm_signal_start place;

        sm_signal_destroy(b.signal);
        assert_int_equal(sm_signal_create(&rule, 0, &memory, &still, &b.signal), SM_OK);
        made_stay(&b, 50.3, 60);
        assert_false(sm_signal_open(b.signal));
        sm_signal_place(b.signal, &place);
        assert_int_equal(place.place, SM_PLACE_STILL);
        check_close("value", place.value, 50, 0);
        check_close("u95", place.u95, 0.3, 0);
        if (i == 1)
            made_stay(&b, 60, 1);
        if (i == 2)
            made_open(&b, 2);
        if (i == 3)
            mark(&b, SM_CLASS_SAMPLE, 0);
        made_stay(&b, i == 1 ? 60 : 50.3, 60);
        finish(&b, how[i], want[i]);
    }
}

static void a_way_cut_in_two_files_ends_with_moved_by_transit(void **state)
{
    struct bench b = plain();
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    const struct sm_channel_memory memory = { 0 };
    struct sm_signal_start place;

    (void)state;
    sm_signal_place(b.signal, &place);
    assert_int_equal(place.place, SM_PLACE_NEW);
    made_stay(&b, 50, 10);
    sm_signal_place(b.signal, &place);
    assert_int_equal(place.place, SM_PLACE_NEW);
    made_stay(&b, 50, 30);
    made_open(&b, 2);
    assert_false(sm_signal_open(b.signal));
    sm_signal_place(b.signal, &place);
    assert_int_equal(place.place, SM_PLACE_LEFT);
    sm_signal_destroy(b.signal);
    assert_int_equal(sm_signal_create(&rule, 0, &memory, &place, &b.signal), SM_OK);
    memset(&tape, 0, sizeof tape);
    made_stay(&b, 20, 60);
    check_ns("from", tape_get(&tape, SM_SIGNAL_MOVED, 0)->from_t_ns, 43);
    finish(&b, "left", "moved:transit, settled");
}

static void
an_open_circuit_after_the_cut_is_a_transit_with_the_beginning_that_is_known(void **state)
{
    struct bench b = plain();
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    const struct sm_channel_memory memory = { 0 };
    const struct sm_signal_start left = { .place = SM_PLACE_LEFT };

    (void)state;
    sm_signal_destroy(b.signal);
    assert_int_equal(sm_signal_create(&rule, 0, &memory, &left, &b.signal), SM_OK);
    made_put(&b, b.t_s = 5, 0, SM_FLAG_OVER);
    made_stay(&b, 20, 60);
    check_ns("from", tape_get(&tape, SM_SIGNAL_TRANSIT, 0)->from_t_ns, 5);
    finish(&b, "left", "open, transit:word, moved:transit, settled");
}

static void at_rest_nothing_is_said_and_after_it_all_begins_anew(void **state)
{
    struct bench b = plain();
    struct sm_channel_memory memory;

    (void)state;
    b.noise = 0.2;
    b.step = 0.001;
    made_stay(&b, 50, 10);
    sm_signal_rest(b.signal, true);
    assert_false(sm_signal_open(b.signal));
    assert_true(sm_signal_deadline(b.signal) == SM_NEVER);
    made_stay(&b, 50, 60);
    made_open(&b, 5);
    mark(&b, SM_CLASS_SAMPLE, 0);
    made_stay(&b, -70, 60);
    sm_signal_memory(b.signal, &memory);
    if (!(memory.noise > 0.05 && memory.noise < 0.6))
        fail_msg("noise %.3f while resting, want about 0.2", memory.noise);
    check_story("resting", &tape, "moved:start");
    sm_signal_rest(b.signal, false);
    made_stay(&b, -70, 3);
    finish(&b, "rest", "moved:start, moved:start");
}

static void another_rule_ends_the_immersion_silently(void **state)
{
    struct bench b = plain();
    struct sm_rule rule = made_rule(0.6, 10, 5);

    (void)state;
    made_stay(&b, 50, 10);
    assert_int_equal(sm_signal_rule(b.signal, &rule), SM_OK);
    assert_false(sm_signal_open(b.signal));
    made_stay(&b, 50, 20);
    check_ns("settled by the new rule", tape_get(&tape, SM_SIGNAL_SETTLED, 0)->t_ns, 21);
    rule.kind = SM_RULE_ARRIVAL;
    assert_int_equal(sm_signal_rule(b.signal, &rule), SM_EINVAL);
    finish(&b, "rule", "moved:start, moved:start, settled");
}

static void the_class_decides_the_tolerance_at_once(void **state)
{
    struct bench b = plain();
    struct sm_rule rule = made_rule(0.6, 22, 20);

    (void)state;
    sm_signal_destroy(b.signal);
    rule.tolerance[SM_CLASS_STANDARD] = 0.2;
    b.signal = made_signal(&rule);
    for (int i = 0; i < 60; i++)
        made_stay(&b, 50 + 0.2 * sin(0.3 * i), 1); /* restless by 0.4 */
    check_story("as a standard", &tape, "moved:start");
    sm_signal_class(b.signal, SM_CLASS_SAMPLE);
    made_stay(&b, 50, 1);
    check_close("tolerance", tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled.tolerance, 0.6, 0);
    finish(&b, "as a sample", "moved:start, settled");
}

static void a_value_that_creeps_away_after_its_capture_has_moved(void **state)
{
    struct bench b = plain();

    (void)state;
    made_stay(&b, 50, 40);
    for (int i = 0; i < 400; i++)
        made_stay(&b, 50 + 0.01 * i, 1);
    assert_int_equal(tape_get(&tape, SM_SIGNAL_MOVED, 1)->by, SM_MOVED_VALUE);
    for (size_t i = 0; i < tape.n; i++) {
        if (tape.event[i].kind == SM_SIGNAL_TRANSIT)
            fail_msg("a transit out of a creep");
    }
    sm_signal_destroy(b.signal);
}

static void other_channels_are_averaged_over_the_window_unless_too_old(void **state)
{
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    const struct sm_channel_memory memory = { 0 };
    const struct sm_signal_start start = { .place = SM_PLACE_NEW };
    const struct sm_settled *s;
    struct sm_signal *signal;

    (void)state;
    memset(&tape, 0, sizeof tape);
    assert_int_equal(sm_signal_create(&rule, 2, &memory, &start, &signal), SM_OK);
    for (int i = 0; i <= 22; i++) {
        struct sm_signal_input in = { .kind = SM_SIGNAL_READING, .t_ns = i * SM_NS_PER_S };

        in.reading.value = 50;
        in.reading.other[0] = (struct sm_other){ true, 20 + i, 0 };
        in.reading.other[1] = (struct sm_other){ true, 1, SM_OTHER_OLDEST_NS + 1 };
        if (i == 10)
            in.reading.other[0].present = false;
        made_feed(signal, &tape, &in);
    }
    s = &tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled;
    /* 22 … 42 without 30 */
    check_close("mean", s->other_mean[0].value, (21 * 32.0 - 30) / 20, 1e-12);
    check_close("range", s->other_range[0].value, 20, 1e-12);
    assert_false(s->other_mean[1].has || s->other_range[1].has);
    sm_signal_destroy(signal);
}

static void every_reading_counts_however_fast_the_meter_sends(void **state)
{
    struct bench b = plain();
    const struct sm_rule rule = made_rule(0.6, 70, 60);
    const struct sm_settled *s;

    (void)state;
    sm_signal_destroy(b.signal);
    b.signal = made_signal(&rule);
    b.rate = 200; /* 12,000 readings in the window, six times its room */
    b.noise = 0.02;
    b.step = 0.001;
    made_stay(&b, 50, 80);
    s = &tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled;
    if (s->readings < 12000 || s->readings > 12020)
        fail_msg("%u readings in the window, want 12,000 and at most 16 more", s->readings);
    check_close("value", s->value, 50, 0.001);
    check_close("sd", s->sd, 0.02, 0.001);
    sm_signal_destroy(b.signal);
}

static void settling_is_told_at_most_four_times_a_second(void **state)
{
    struct bench b = plain();

    (void)state;
    b.rate = 20;
    b.tau_s = 60;
    made_stay(&b, 300, 100);
    if (tape.settling < 300 || tape.settling > 401)
        fail_msg("%zu settling events in 100 s", tape.settling);
    sm_signal_destroy(b.signal);
}

static void what_cannot_be_fed_changes_nothing(void **state)
{
    struct bench b = plain();
    struct sm_signal_input in = { .kind = SM_SIGNAL_READING };
    struct sm_signal_event e;

    (void)state;
    made_stay(&b, 50, 10);
    in.t_ns = made_ns(11);
    in.reading.value = NAN;
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_EVALUE);
    in.reading.value = INFINITY;
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_EVALUE);
    in.reading.value = 50;
    in.t_ns = made_ns(9);
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_EORDER);
    in.kind = SM_SIGNAL_MARK;
    in.t_ns = made_ns(10);
    in.clock = 32;
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_EINVAL);
    assert_false(sm_signal_next(b.signal, &e));
    in.clock = 31;
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_OK);
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_EBUSY);
    assert_true(sm_signal_next(b.signal, &e));
    assert_int_equal(e.kind, SM_SIGNAL_MOVED);
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_OK);
    made_drain(b.signal, &tape);
    in.kind = SM_SIGNAL_READING; /* meaningless value, but no reading either */
    in.reading.flag = SM_FLAG_OPEN;
    in.reading.value = NAN;
    assert_int_equal(sm_signal_feed(b.signal, &in), SM_OK);
    sm_signal_destroy(b.signal);
}

static void a_value_beyond_any_meter_is_an_open_circuit_and_leaves_no_trace(void **state)
{
    struct bench b = plain();
    struct sm_channel_memory memory;

    (void)state;
    b.step = 0;
    made_stay(&b, 50, 40);
    for (int i = 0; i < 40; i++)
        made_put(&b, b.t_s += 1, i % 2 ? 1.7e308 : -1.7e308, SM_FLAG_OK);
    sm_signal_memory(b.signal, &memory);
    check_close("noise", memory.noise, 0, 1e-12);
    check_close("step", memory.step, 0, 1e-12);
    finish(&b, "huge", "moved:start, settled, open");
}

static void a_rule_out_of_range_or_not_built_makes_no_signal(void **state)
{
    const struct sm_channel_memory memory = { 0 };
    const struct sm_signal_start start = { .place = SM_PLACE_NEW };
    const struct sm_rule good = made_rule(0.6, 22, 20);

    (void)state;
    for (int i = 0; i < 11; i++) {
        struct sm_rule r = good;
        struct sm_signal *s = NULL;
        struct sm_signal_start from = start;
        size_t others = 0;
        enum sm_status got;

        switch (i) {
        case 0:
            r.kind = SM_RULE_ARRIVAL;
            break;
        case 1:
            r.tolerance[SM_CLASS_CHECK] = 0;
            break;
        case 2:
            r.tolerance[SM_CLASS_CHECK] = NAN;
            break;
        case 3:
            r.doubt[SM_CLASS_SAMPLE] = 1.5;
            break;
        case 4:
            r.dwell_ns = -1;
            break;
        case 5:
            r.over_ns = 0;
            break;
        case 6:
            r.longest_wait_ns[SM_CLASS_STANDARD] = 0;
            break;
        case 7:
            r.has_plausible = true;
            break;
        case 8:
            others = SM_OTHERS_MAX + 1;
            break;
        case 9:
            from.place = SM_PLACE_STILL, from.value = NAN;
            break;
        case 10:
            r.dwell_ns = INT64_MAX;
            break;
        default:
            break;
        }
        got = sm_signal_create(&r, others, &memory, &from, &s);
        if (got != SM_EINVAL || s != NULL)
            fail_msg("case %d: status %d", i, got);
    }
}

static void only_what_is_built_says_so(void **state)
{
    enum sm_rule_kind k;

    (void)state;
    for (unsigned i = 0; i < SM_RULE_COUNT; i++) {
        assert_true(sm_rule_known(sm_rule_name((enum sm_rule_kind)i), &k));
        assert_int_equal(k, i);
        assert_int_equal(sm_rule_built(k), k == SM_RULE_SPREAD);
    }
    assert_false(sm_rule_known("range", &k));
}

static void the_channel_remembers_noise_step_and_usual_wait(void **state)
{
    struct bench b = plain();
    struct sm_channel_memory memory, again;
    struct sm_signal_start place;
    struct sm_signal *s;
    const struct sm_rule rule = made_rule(0.6, 22, 20);

    (void)state;
    b.noise = 0.1;
    b.step = 0.01;
    made_stay(&b, 50, 60);
    sm_signal_memory(b.signal, &memory);
    assert_int_equal(memory.captures, 1);
    check_close("usual wait", memory.usual_wait_s[SM_CLASS_STANDARD],
                1e-9 * (double)tape_get(&tape, SM_SIGNAL_SETTLED, 0)->settled.since_moved_ns, 1e-9);
    check_close("others unknown", memory.usual_wait_s[SM_CLASS_SAMPLE], 0, 0);
    check_close("step", memory.step, 0.01, 1e-12);
    sm_signal_place(b.signal, &place);
    assert_int_equal(sm_signal_create(&rule, 0, &memory, &place, &s), SM_OK);
    sm_signal_memory(s, &again);
    check_close("noise carried", again.noise, memory.noise, 0);
    check_close("step carried", again.step, memory.step, 0);
    assert_int_equal(again.captures, 1);
    sm_signal_destroy(s);
    sm_signal_destroy(b.signal);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(
            the_first_reading_begins_an_immersion_and_the_dwell_comes_before_the_capture),
        cmocka_unit_test(a_still_display_has_the_uncertainty_of_its_step),
        cmocka_unit_test(what_no_one_knows_is_left_out),
        cmocka_unit_test(a_word_or_an_implausible_value_after_a_capture_is_a_transit_however_short),
        cmocka_unit_test(one_step_alone_is_moved_by_value_at_once),
        cmocka_unit_test(two_departures_less_than_the_dwell_apart_are_a_transit),
        cmocka_unit_test(two_departures_the_dwell_apart_are_no_transit),
        cmocka_unit_test(after_a_capture_a_lift_is_a_transit_though_it_comes_back_alike),
        cmocka_unit_test(before_a_capture_a_lift_that_comes_back_alike_is_put_back),
        cmocka_unit_test(after_the_dwell_a_lift_costs_no_time_because_the_old_window_goes_on),
        cmocka_unit_test(a_rinse_dipped_into_twice_is_not_a_stay),
        cmocka_unit_test(before_a_capture_a_lift_that_comes_back_elsewhere_begins_a_new_immersion),
        cmocka_unit_test(a_signal_that_only_passes_by_the_old_level_is_not_back),
        cmocka_unit_test(what_follows_within_a_moment_of_the_first_reading_belongs_to_it),
        cmocka_unit_test(a_lift_too_long_to_be_put_back_begins_a_new_immersion),
        cmocka_unit_test(an_immersion_left_unsettled_is_told_only_if_it_outlasted_the_dwell),
        cmocka_unit_test(air_and_rinses_make_one_way_with_one_end),
        cmocka_unit_test(a_rinse_after_air_goes_on_as_the_same_way),
        cmocka_unit_test(nothing_is_captured_within_a_dwell_of_a_swift_change),
        cmocka_unit_test(the_longest_wait_is_told_once_and_then_nothing_is_captured),
        cmocka_unit_test(without_a_tick_the_longest_wait_comes_with_the_next_reading),
        cmocka_unit_test(a_mark_always_begins_an_immersion_and_no_reading_before_it_counts),
        cmocka_unit_test(nothing_moves_before_a_mark_that_came_in_between),
        cmocka_unit_test(odd_readings_from_before_a_mark_do_not_count_after_it),
        cmocka_unit_test(
            a_mark_while_the_old_signal_still_settles_waits_for_the_dwell_and_the_rule),
        cmocka_unit_test(a_mark_in_the_air_is_followed_by_the_transit),
        cmocka_unit_test(an_end_says_why_unless_captured_and_the_next_reading_begins_anew),
        cmocka_unit_test(an_end_during_a_lift_ends_the_immersion_before_it),
        cmocka_unit_test(still_in_it_nothing_is_captured_until_the_probe_moves),
        cmocka_unit_test(a_way_cut_in_two_files_ends_with_moved_by_transit),
        cmocka_unit_test(
            an_open_circuit_after_the_cut_is_a_transit_with_the_beginning_that_is_known),
        cmocka_unit_test(at_rest_nothing_is_said_and_after_it_all_begins_anew),
        cmocka_unit_test(another_rule_ends_the_immersion_silently),
        cmocka_unit_test(the_class_decides_the_tolerance_at_once),
        cmocka_unit_test(a_value_that_creeps_away_after_its_capture_has_moved),
        cmocka_unit_test(other_channels_are_averaged_over_the_window_unless_too_old),
        cmocka_unit_test(every_reading_counts_however_fast_the_meter_sends),
        cmocka_unit_test(settling_is_told_at_most_four_times_a_second),
        cmocka_unit_test(what_cannot_be_fed_changes_nothing),
        cmocka_unit_test(a_value_beyond_any_meter_is_an_open_circuit_and_leaves_no_trace),
        cmocka_unit_test(a_rule_out_of_range_or_not_built_makes_no_signal),
        cmocka_unit_test(only_what_is_built_says_so),
        cmocka_unit_test(the_channel_remembers_noise_step_and_usual_wait),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
