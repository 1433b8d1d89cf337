/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_sim.c: the simulated meter: its electrode, its truth, its bytes and their times. */
#include "check.h"
#include "sim/prng.h"
#include "sim/random_session.h"
#include "sim/sim.h"

#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define S INT64_C(1000000000)

/* A scenario out of text that must be sound. */
static struct sm_scenario scenario(const char *text)
{
    struct sm_scenario sc;
    struct sm_blame list[4];
    struct sm_blames b;

    sm_blames_init(&b, list, COUNT(list));
    sm_scenario_init(&sc);
    if (sm_scenario_read(&sc, "test", text, strlen(text), &b) != SM_OK)
        fail_msg("%u:%u: %s", list[0].line, list[0].column, list[0].text);
    return sc;
}

static struct sm_sim *simulator(const struct sm_scenario *sc)
{
    struct sm_sim *sim = NULL;

    assert_int_equal(sm_sim_create(sc, &sim), SM_OK);
    return sim;
}

/* FNV-1a over all bytes and their times, to the end. */
static uint64_t fingerprint(const struct sm_scenario *sc)
{
    struct sm_sim *sim = simulator(sc);
    uint64_t h = UINT64_C(14695981039346656037);
    char buf[4096], line[32];
    enum sm_sim_what what;
    int64_t t_ns;
    size_t n;

    while ((what = sm_sim_next(sim, &t_ns, buf, sizeof buf, &n)) != SM_SIM_END) {
        const int m = snprintf(line, sizeof line, "%" PRId64 "/%d:", t_ns, (int)what);
        for (int i = 0; i < m; i++)
            h = (h ^ (unsigned char)line[i]) * UINT64_C(1099511628211);
        for (size_t i = 0; i < n; i++)
            h = (h ^ (unsigned char)buf[i]) * UINT64_C(1099511628211);
    }
    sm_sim_destroy(sim);
    return h;
}

static void random_numbers_are_those_of_the_published_recipe(void **state)
{
    /* xoshiro256** from the state 1, 2, 3, 4. First: rotl(2 * 5, 7) * 9 = 1280 * 9 = 11520. The
     * step makes the state 7, 0, 262146, 6 << 45: second rotl(0, 7) * 9 = 0, and so on, worked by
     * hand. */
    static const uint64_t want[] = { 11520, 0, 1509978240 };
    struct sm_sim_prng p = { { 1, 2, 3, 4 }, false, 0 };

    (void)state;
    for (size_t i = 0; i < COUNT(want); i++)
        assert_int_equal(sm_sim_prng_next(&p), want[i]);
}

static void normal_deviates_have_mean_0_and_sd_1(void **state)
{
    const int n = 200000;
    double sum = 0, squares = 0;
    struct sm_sim_prng p;

    (void)state;
    sm_sim_prng_init(&p, 3, 0);
    for (int i = 0; i < n; i++) {
        const double x = sm_sim_prng_normal(&p);
        sum += x;
        squares += x * x;
    }
    check_close("mean, 5 standard errors", sum / n, 0, 5 / sqrt(n));
    check_close("variance, 5 standard errors", squares / n, 1, 5 * sqrt(2.0 / n));
}

static void nernst_slope_is_the_published_one(void **state)
{
    /* ln(10) R T / F with R = 8.31446261815324 J/(mol K) and F = 96485.33212331 C/mol, both exact
     * in the SI of 2019 (CODATA 2018); rounded to 0.01 mV also in the pharmacopoeia's table (USP
     * chapter 791, table 1) at 20 and 25 °C. */
    (void)state;
    check_close("0 °C", sm_sim_electrode_nernst_mv(0), 54.1988139071, 1e-9);
    check_close("20 °C", sm_sim_electrode_nernst_mv(20), 58.1672425292, 1e-9);
    check_close("25 °C", sm_sim_electrode_nernst_mv(25), 59.1593496848, 1e-9);
    check_close("100 °C", sm_sim_electrode_nernst_mv(100), 74.0409570179, 1e-9);
}

static void electrodes_turn_values_into_signals_as_worked_by_hand(void **state)
{
    const struct sm_sim_electrode ph = { SM_SIM_ELECTRODE_PH, 0.986, 3.9 };
    const struct sm_sim_electrode fluoride = { SM_SIM_ELECTRODE_LOG, -0.979, 92.2 };
    const struct sm_sim_electrode photometer = { SM_SIM_ELECTRODE_LINE, 0.2105, 0.001 };

    (void)state;
    check_close("pH 7", sm_sim_electrode_signal(&ph, 7, 20), 3.9, 1e-12);
    /* 3.9 + 0.986 * 58.1672425292 * 5.32 */
    check_close("pH 1.68", sm_sim_electrode_signal(&ph, 1.68, 20), 309.017434, 1e-6);
    check_close("1 mg/L", sm_sim_electrode_signal(&fluoride, 1, 21.5), 92.2, 1e-12);
    /* a decade at 25 °C: 92.2 - 0.979 * 59.1593496848 */
    check_close("10 mg/L", sm_sim_electrode_signal(&fluoride, 10, 25), 34.2829967, 1e-6);
    check_close("2 mg/L", sm_sim_electrode_signal(&photometer, 2, 20), 0.422, 1e-12);
}

static void responses_pass_through_points_worked_by_hand(void **state)
{
    static const struct {
        const char *what;
        struct sm_sim_response r;
        double step, t_s, want, tolerance, settle_s;
    } cases[] = {
        /* 100/e; 100 exp(-t/10) = 1 at 10 ln 100 */
        { "exponential",
          { SM_SIM_RESPONSE_EXPONENTIAL, 10, 0, 0 },
          100,
          10,
          36.78794412,
          1,
          46.05170186 },
        { "exponential, falling",
          { SM_SIM_RESPONSE_EXPONENTIAL, 10, 0, 0 },
          -100,
          10,
          -36.78794412,
          1,
          46.05170186 },
        /* half at t = a; 1/(1 + t/2) = 1/100 at 198 */
        { "hyperbolic", { SM_SIM_RESPONSE_HYPERBOLIC, 2, 0, 0 }, 100, 2, 50, 1, 198 },
        /* a quarter at 9 a; 1 + sqrt(t/0.01) = 100 at 98.01 */
        { "square root", { SM_SIM_RESPONSE_SQRT, 0.01, 0, 0 }, 100, 0.09, 25, 1, 98.01 },
        /* 80 exp(-1) + 20 exp(-0.05); at long times only 20 exp(-t/20) = 1: 20 ln 20 */
        { "double", { SM_SIM_RESPONSE_DOUBLE, 1, 20, 0.2 }, 100, 1, 48.45494404, 1, 59.91464547 },
        /* overshoots: 120 exp(-1) - 20 exp(-0.05) */
        { "double, overshooting",
          { SM_SIM_RESPONSE_DOUBLE, 1, 20, -0.2 },
          100,
          1,
          25.12094444,
          1,
          59.91464547 },
        /* RT/F at 20 °C is 25.26171 mV; a step of that times ln 3 has ln(1 + 2/2) left at t = ln 2;
         * settled where 2 exp(-t) = exp(1/25.26171) - 1 */
        { "layer", { SM_SIM_RESPONSE_LAYER, 1, 0, 0 }, 27.75282, 0.69314718, 17.510082, 1, 3.9027 },
        { "a step within the tolerance", { SM_SIM_RESPONSE_SQRT, 1, 0, 0 }, 0.5, 0, 0.5, 1, 0 },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char what[80];
        snprintf(what, sizeof what, "%s, left", cases[i].what);
        check_close(what, sm_sim_response_left(&cases[i].r, cases[i].step, cases[i].t_s),
                    cases[i].want, 1e-5 * fabs(cases[i].want));
        snprintf(what, sizeof what, "%s, settling", cases[i].what);
        check_close(what, sm_sim_response_settle_s(&cases[i].r, cases[i].step, cases[i].tolerance),
                    cases[i].settle_s, 1e-4 * cases[i].settle_s + 1e-9);
    }
}

/* The definition itself, by brute force: outside just before, never outside after. */
static void settling_time_is_the_last_moment_outside_the_tolerance(void **state)
{
    struct sm_sim_prng p;

    (void)state;
    sm_sim_prng_init(&p, 9, 0);
    for (int i = 0; i < 300; i++) {
        const struct sm_sim_response r = {
            (enum sm_sim_response_kind)sm_sim_prng_below(&p, SM_SIM_RESPONSE_COUNT),
            sm_sim_prng_log_between(&p, 0.1, 40), sm_sim_prng_log_between(&p, 1, 400),
            sm_sim_prng_between(&p, -0.3, 0.3)
        };
        const double step = sm_sim_prng_between(&p, -200, 200), tolerance = 0.6;
        const double t_s = sm_sim_response_settle_s(&r, step, tolerance);
        if (t_s > 0 && !(fabs(sm_sim_response_left(&r, step, t_s * (1 - 1e-3))) > tolerance))
            fail_msg("case %d, %s: inside already before %g s", i, sm_sim_response_name(r.kind),
                     t_s);
        for (int k = 0; k < 2000; k++) {
            const double later_s = t_s * (1 + 1e-9) + t_s * k * 0.01 + k * 1e-3;
            if (!(fabs(sm_sim_response_left(&r, step, later_s)) <= tolerance * (1 + 1e-6)))
                fail_msg("case %d, %s: outside at %g s, settled at %g s", i,
                         sm_sim_response_name(r.kind), later_s, t_s);
        }
    }
}

static void readings_follow_the_exponential_from_the_moment_of_immersion(void **state)
{
    /* 100 mV to 0 mV from 2 s on, 10 s long: 100 exp(-(t - 2)/10), read once a second, no noise. */
    struct sm_scenario sc = scenario("response 10 s\nstart 100 mV\nshape \"%.6v\\n\"\n"
                                     "rinse 2 s in 100 mV\nin b 0 mV for 60 s\n");
    struct sm_sim *sim = simulator(&sc);
    char text[SM_SIM_SHAPE_LINE];
    bool word;
    int64_t t_ns;
    int n = 0;

    (void)state;
    while (sm_sim_reading(sim, &t_ns, text, &word)) {
        const double t_s = 1e-9 * (double)t_ns;
        check_close("reading", strtod(text, NULL), t_s < 2 ? 100 : 100 * exp(-(t_s - 2) / 10),
                    1e-6);
        n++;
    }
    assert_int_equal(n, 62);
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
}

static void truth_tells_stays_lifts_and_the_drift_line(void **state)
{
    struct sm_scenario sc = scenario("response 10 s\nstart 100 mV\ntolerance 1 mV\ndrift 3.6 mV/h\n"
                                     "in \"tank a\" 0 mV for 20 s at 15 °C as check\n"
                                     "lift 2 s\nback 70 s\nstray 2\nback 80 s\nsilence 3 s\n"
                                     "air 1 s\nrinse 5 s in 20 mV\nin c 50 mV for 10 s\n");
    struct sm_sim_truth t;

    (void)state;
    assert_int_equal(sm_sim_truth_create(&sc, &t), SM_OK);
    assert_int_equal(t.n, 6);
    assert_int_equal(t.end_t_ns, 191 * S);
    const struct sm_sim_stay *a = &t.stay[0], *c = &t.stay[5];
    assert_int_equal(a->item, 1);
    assert_string_equal(a->name, "tank a");
    assert_int_equal(a->role, SM_SIM_ROLE_CHECK);
    assert_int_equal(a->end_t_ns, 175 * S);
    check_close("end, on the drift line", a->end, 0.175, 1e-9);
    check_close("10 ln 100", a->settle_s, 46.05170186, 1e-6);
    check_close("calm between lift and silence", a->calm_s, 150, 1e-9);
    assert_true(a->stayed_three);
    assert_int_equal(t.stay[1].kind, SM_SIM_STEP_LIFT);
    assert_int_equal(t.stay[2].kind, SM_SIM_STEP_SILENCE);
    assert_int_equal(t.stay[4].kind, SM_SIM_STEP_RINSE);
    assert_int_equal(c->item, 2);
    assert_int_equal(c->begin_t_ns, 181 * S);
    /* from 20 + (0 - 20) exp(-0.5) = 7.8694: a step of 42.1306, 10 ln 42.1306; what was left of
     * tank a, 100 exp(-18.1), is nothing */
    check_close("from where the rinse had come", c->settle_s, 37.40774, 1e-3);
    assert_false(c->stayed_three);
    sm_sim_truth_free(&t);
    sm_scenario_free(&sc);
}

static const char eventful[] =
    "seed 42\nrate 7 /s\njitter 20 ms\ndropout 2 %\nnoise 0.3 mV ar 0.6\nstep 0.1 mV\n"
    "response layer 0.7 s\nshape star-sum\nsplit 5\ndrift 5 mV/h\n"
    "in a 40 mV for 5 s\nstray 2\nback 3 s\nlift 1 s\nback 4 s\nrubbish 700\n"
    "bubble 8 mV for 2 s\nhalfline\nsilence 2 s\nback 2 s\nunplug 2 s\n"
    "air 2 s\nrinse 1.5 s\nair 1 s word OVR\nsay \"hello\\r\" times 3\n"
    "noise 0.1 mV telegraph 0.1\nin b -120 mV for 9 s\n";

static void the_same_seed_gives_the_same_bytes_with_any_compiler(void **state)
{
    struct sm_scenario sc = scenario(eventful), session;
    struct sm_random_session r;
    const uint64_t first = fingerprint(&sc);

    (void)state;
    assert_int_equal(fingerprint(&sc), first);
    /* Fixed when written; gcc and clang must both give it. */
    if (first != UINT64_C(0xbee8aa55dc34b4dd))
        fail_msg("scenario: got fingerprint 0x%" PRIx64, first);
    sc.seed = 43;
    assert_int_not_equal(fingerprint(&sc), first);
    sm_scenario_free(&sc);

    sm_random_session_init(&r, 30, 5);
    sm_scenario_init(&session);
    assert_int_equal(sm_random_session_make(&r, &session), SM_OK);
    if (fingerprint(&session) != UINT64_C(0xd1c544fea1b780f2))
        fail_msg("random session: got fingerprint 0x%" PRIx64, fingerprint(&session));
    sm_scenario_free(&session);
}

static void time_never_goes_back_and_due_tells_what_comes(void **state)
{
    struct sm_scenario sc = scenario(eventful);

    (void)state;
    for (size_t cap = 1; cap <= 1000; cap += 333) {
        struct sm_sim *sim = simulator(&sc);
        char buf[1000];
        int64_t t_ns = 0, last_t_ns = 0;
        size_t n;
        for (;;) {
            const int64_t due_t_ns = sm_sim_due(sim);
            const enum sm_sim_what what = sm_sim_next(sim, &t_ns, buf, cap, &n);
            if (t_ns < last_t_ns || t_ns != due_t_ns || n > cap)
                fail_msg("cap %zu: at %" PRId64 ", due %" PRId64 ", last %" PRId64 ", %zu bytes",
                         cap, t_ns, due_t_ns, last_t_ns, n);
            assert_int_equal(n > 0, what == SM_SIM_BYTES);
            last_t_ns = t_ns;
            if (what == SM_SIM_END)
                break;
        }
        check_close("the end", 1e-9 * (double)t_ns, 34.5, 1e-9);
        sm_sim_destroy(sim);
    }
    sm_scenario_free(&sc);
}

static size_t all_bytes(const struct sm_scenario *sc, char *out, size_t cap)
{
    struct sm_sim *sim = simulator(sc);
    int64_t t_ns;
    size_t n, have = 0;
    enum sm_sim_what what;

    while ((what = sm_sim_next(sim, &t_ns, out + have, cap - have, &n)) != SM_SIM_END) {
        have += n;
        assert_true(have < cap);
    }
    sm_sim_destroy(sim);
    return have;
}

static void a_line_in_pieces_is_the_same_line(void **state)
{
    static char whole[20000], pieces[20000];
    struct sm_scenario sc = scenario("rate 2 /s\nnoise 1 mV\nstep 0.1 mV\nin a 5 mV for 60.2 s\n");
    const size_t n = all_bytes(&sc, whole, sizeof whole);

    (void)state;
    sc.split = 3; /* 20 bytes take 21 ms: it is over before the next reading */
    assert_int_equal(all_bytes(&sc, pieces, sizeof pieces), n);
    assert_memory_equal(whole, pieces, n);
    assert_int_equal(n, 121 * strlen("+0005.0 mV  20.0 C\r\n"));
    sm_scenario_free(&sc);
}

static double noise_of(const char *how, double *ret_lag1)
{
    char text[120], shown[SM_SIM_SHAPE_LINE];
    double sum = 0, squares = 0, products = 0, last = 0;
    int64_t t_ns;
    bool word;
    int n = 0;

    snprintf(text, sizeof text,
             "rate 10 /s\nshape \"%%.6v\\n\"\nnoise 0.5 mV %s\nin a 0 mV for 5000 s\n", how);
    struct sm_scenario sc = scenario(text);
    struct sm_sim *sim = simulator(&sc);
    for (; sm_sim_reading(sim, &t_ns, shown, &word); n++) {
        const double v = strtod(shown, NULL);
        sum += v;
        squares += v * v;
        products += v * last;
        last = v;
    }
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
    check_close("mean of the noise", sum / n, 0, 0.1);
    *ret_lag1 = products / squares;
    return sqrt(squares / n);
}

static void noise_has_the_size_and_memory_asked_for(void **state)
{
    static const struct {
        const char *how;
        double lag1;
    } cases[] = {
        { "white", 0 }, { "ar 0.7", 0.7 }, { "telegraph 0.05", 0.9 }, { "hum 1.3 /s", 0.684547 }
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        double lag1 = 0;
        /* 50,000 readings; for ar 0.7 the variance is known to 1 %. Lag 1: 1 - 2 flips, cos(2 pi f
         * dt) */
        check_close(cases[i].how, noise_of(cases[i].how, &lag1), 0.5, 0.012);
        check_close(cases[i].how, lag1, cases[i].lag1, 0.03);
    }
}

static void stray_readings_bubbles_air_and_words_are_as_many_as_told(void **state)
{
    struct sm_scenario sc =
        scenario("rate 1 /s\nrinse-water 0 mV\nin a 0 mV for 10 s\nstray 3 by 40 mV\n"
                 "back 10 s\nbubble 8 mV for 5 s\nback 2 s\nair 20 s\n"
                 "air 4 s word OVR\nair 3 s rail 1999.9 mV\nback 1 s\n");
    struct sm_sim *sim = simulator(&sc);
    char text[SM_SIM_SHAPE_LINE];
    int strays = 0, bubbles = 0, words = 0, rails = 0, far = 0, still = 0;
    int64_t t_ns;
    bool word;

    (void)state;
    while (sm_sim_reading(sim, &t_ns, text, &word)) {
        const double v = strtod(text, NULL), t_s = 1e-9 * (double)t_ns;
        if (word) {
            assert_string_equal(text, "OVR");
            words++;
        } else if (t_s >= 27 && t_s < 47) {
            far += fabs(v) > 20;
        } else {
            strays += fabs(v - 40) < 1e-9;
            bubbles += fabs(v - 8) < 1e-9;
            rails += fabs(v - 1999.9) < 1e-9;
            still += fabs(v) < 1e-9;
        }
    }
    assert_int_equal(strays, 3);
    assert_int_equal(bubbles, 5);
    assert_int_equal(words, 4);
    assert_int_equal(rails, 3);
    assert_int_equal(still, 20);
    assert_true(far >= 16); /* of 20; hundreds of mV wide */
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
}

static void a_meter_that_answers_says_nothing_until_asked(void **state)
{
    struct sm_scenario sc =
        scenario("shape r-mv\nanswer 120 ms\nin a 5 mV for 10 s\nsilence 5 s\nback 5 s\n"
                 "late 3 s\nback 10 s\n");
    struct sm_sim *sim = simulator(&sc);
    static const struct {
        double ask_s;
        const char *question;
        double answer_s; /* 0: none */
    } cases[] = {
        { 1, "R\r", 1.12 }, { 2, "xyzR\r", 2.12 }, { 3, "Q\r", 0 },   { 4, "I\r", 4.12 },
        { 12, "R\r", 0 },   { 16, "R\r", 16.12 },  { 21, "R\r", 24 }, { 25, "R\r", 25.12 }
    };
    size_t asked = 0, answered = 0;
    char buf[200];
    int64_t t_ns, last_answer_ns = 0;
    size_t n;

    (void)state;
    for (;;) {
        const int64_t ask_t_ns =
            asked < COUNT(cases) ? llround(cases[asked].ask_s * 1e9) : INT64_MAX;
        if (ask_t_ns <= sm_sim_due(sim)) {
            sm_sim_ask(sim, ask_t_ns, cases[asked].question, strlen(cases[asked].question));
            asked++;
            continue;
        }
        const enum sm_sim_what what = sm_sim_next(sim, &t_ns, buf, sizeof buf, &n);
        if (what == SM_SIM_END)
            break;
        if (what != SM_SIM_BYTES)
            continue;
        while (answered < COUNT(cases) && cases[answered].answer_s <= 0)
            answered++;
        assert_true(answered < COUNT(cases));
        check_close("the answer's time", 1e-9 * (double)t_ns, cases[answered].answer_s, 1e-6);
        if (cases[answered].question[0] == 'I')
            assert_memory_equal(buf, "invented meter", 14);
        else
            assert_memory_equal(buf + n - 2, "\r\n", 2);
        answered++;
        last_answer_ns = t_ns;
    }
    assert_int_equal(answered, COUNT(cases));
    assert_true(last_answer_ns > 25 * S);
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
}

int main(void)
{
    static const struct CMUnitTest tests[] = {
        cmocka_unit_test(random_numbers_are_those_of_the_published_recipe),
        cmocka_unit_test(normal_deviates_have_mean_0_and_sd_1),
        cmocka_unit_test(nernst_slope_is_the_published_one),
        cmocka_unit_test(electrodes_turn_values_into_signals_as_worked_by_hand),
        cmocka_unit_test(responses_pass_through_points_worked_by_hand),
        cmocka_unit_test(settling_time_is_the_last_moment_outside_the_tolerance),
        cmocka_unit_test(readings_follow_the_exponential_from_the_moment_of_immersion),
        cmocka_unit_test(truth_tells_stays_lifts_and_the_drift_line),
        cmocka_unit_test(the_same_seed_gives_the_same_bytes_with_any_compiler),
        cmocka_unit_test(time_never_goes_back_and_due_tells_what_comes),
        cmocka_unit_test(a_line_in_pieces_is_the_same_line),
        cmocka_unit_test(noise_has_the_size_and_memory_asked_for),
        cmocka_unit_test(stray_readings_bubbles_air_and_words_are_as_many_as_told),
        cmocka_unit_test(a_meter_that_answers_says_nothing_until_asked),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
