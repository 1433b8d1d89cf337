/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What must hold whatever the signal does: many made-up sessions at two paces, a bench of dwell 22
 * s and a demonstration of dwell 3 s. Seeds are small numbers from 0; a failure prints its own. */
#include "signal/made.h"

enum kind { BEAKER, RINSE, AIR };

struct truth {
    enum kind kind;
    double from_s, to_s, level;
};

struct pace {
    const char *name;
    double dwell_s, over_s;
    double rate_from, rate_to, tau_from, tau_to;
    double air_from, air_to, rinse_from, rinse_to, lift_from, lift_to;
};

static const struct pace paces[] = {
    { "bench", 22, 20, 2, 10, 1, 8, 2, 6, 6, 15, 2, 6 },
    { "demonstration", 3, 2, 10, 10, 0.1, 0.4, 0.8, 1.5, 1, 1.5, 0.8, 1.2 },
};

/* tolerance: no multiple of a display step, so that no decision hangs on the last bit */
#define TOLERANCE 0.617
#define BEAKERS 8
#define TRUTHS 200

static struct tape tape, other_tape;
static struct truth truths[TRUTHS];
static size_t n_truths;

static void part(struct bench *b, enum kind kind, double level, double for_s, bool word)
{
    struct truth *t = &truths[n_truths++];

    assert_true(n_truths < TRUTHS);
    *t = (struct truth){ kind, b->t_s, b->t_s + for_s, level };
    if (kind != AIR)
        made_stay(b, level, for_s);
    else if (word)
        made_open(b, for_s);
    else
        made_air(b, for_s);
}

static struct bench new_bench(const struct pace *p, unsigned seed, struct tape *to)
{
    struct bench b = made_bench(seed);

    b.rate = exp(made_between(&b, log(p->rate_from), log(p->rate_to)));
    b.jitter = 0.2;
    b.tau_s = made_between(&b, p->tau_from, p->tau_to);
    b.noise = made_between(&b, 0.02, 0.12);
    b.phi = made_uniform(&b) < 0.5 ? 0 : made_between(&b, 0.3, 0.9);
    b.step = made_uniform(&b) < 0.5 ? 0.1 : 0.01;
    b.stray = made_uniform(&b) < 0.5 ? 0 : 0.002;
    b.tape = to;
    to->n = to->settling = 0;
    return b;
}

/* A beaker stays three times its settling time and twice the window; some are lifted once. */
static void beaker(struct bench *b, const struct pace *p, bool word)
{
    const double level = made_between(b, -180, 180);
    const double settle_s =
        fmax(b->tau_s * log(fabs(level - b->value) / TOLERANCE + 2), p->dwell_s);
    const double for_s = 3 * settle_s + 2 * p->over_s;

    if (made_uniform(b) < 0.3) {
        const double first_s = settle_s * made_between(b, 0.2, 0.9);
        const size_t at = n_truths;

        part(b, BEAKER, level, first_s, word);
        part(b, AIR, 0, made_between(b, p->lift_from, p->lift_to), word);
        part(b, BEAKER, level, for_s - first_s, word);
        truths[at].to_s = truths[at + 2].to_s;
        n_truths = at + 1;
    } else {
        part(b, BEAKER, level, for_s, word);
    }
}

static void session(struct bench *b, const struct pace *p)
{
    const bool word = made_uniform(b) < 0.5;

    n_truths = 0;
    for (int i = 0; i < BEAKERS; i++) {
        const int rinses = (int)(3 * made_uniform(b));
        const double water = made_between(b, -30, 30);

        beaker(b, p, word);
        part(b, AIR, 0, made_between(b, p->air_from, p->air_to), word);
        for (int r = 0; r < rinses; r++) {
            part(b, RINSE, water + made_normal(b), made_between(b, p->rinse_from, p->rinse_to),
                 word);
            part(b, AIR, 0, made_between(b, p->air_from, p->air_to), word);
        }
    }
}

static const struct truth *where(int64_t t_ns)
{
    for (size_t i = 0; i < n_truths; i++) {
        if (t_ns <= made_ns(truths[i].to_s))
            return &truths[i];
    }
    fail_msg("after the end of the session");
    return NULL;
}

struct score {
    int beakers, captures, by_value, not_settled, covered;
};

static void judge_session(const struct pace *p, unsigned seed, struct score *score)
{
    int captures[TRUTHS] = { 0 };
    enum sm_mark_by by = SM_MOVED_LINE;

    for (size_t i = 0; i < tape.n; i++) {
        const struct sm_signal_event *e = &tape.event[i];
        const struct truth *t;

        score->not_settled += e->kind == SM_SIGNAL_NOT_SETTLED;
        if (e->kind == SM_SIGNAL_MOVED)
            by = e->by;
        if (e->kind != SM_SIGNAL_SETTLED)
            continue;
        t = where(e->t_ns);
        if (by == SM_MOVED_LINE)
            fail_msg("%s, seed %u: a capture that follows no moved", p->name, seed);
        if (t->kind != BEAKER)
            fail_msg("%s, seed %u: a capture at %.2f s out of %s", p->name, seed,
                     1e-9 * (double)e->t_ns, t->kind == AIR ? "the air" : "a rinse");
        if (!(fabs(e->settled.value - t->level) < 3 * TOLERANCE))
            fail_msg("%s, seed %u: captured %.3f at %.2f s in a beaker of %.3f", p->name, seed,
                     e->settled.value, 1e-9 * (double)e->t_ns, t->level);
        captures[t - truths]++;
        score->captures++;
        score->by_value += t > truths && by != SM_MOVED_TRANSIT;
        score->covered += fabs(e->settled.value - t->level) <= e->settled.u95;
        by = SM_MOVED_LINE;
    }
    for (size_t i = 0; i < n_truths; i++) {
        if (truths[i].kind != BEAKER)
            continue;
        score->beakers++;
        if (captures[i] == 0)
            fail_msg("%s, seed %u: the beaker from %.2f s to %.2f s was lost", p->name, seed,
                     truths[i].from_s, truths[i].to_s);
    }
}

/* 1,200 beaker changes at each pace. */
static void no_capture_from_rinse_or_air_and_no_beaker_lost(void **state)
{
    (void)state;
    for (size_t i = 0; i < COUNT(paces); i++) {
        struct score score = { 0 };

        for (unsigned seed = 0; seed < 150; seed++) {
            struct bench b = new_bench(&paces[i], seed, &tape);
            const struct sm_rule rule = made_rule(TOLERANCE, paces[i].dwell_s, paces[i].over_s);

            b.signal = made_signal(&rule);
            session(&b, &paces[i]);
            sm_signal_destroy(b.signal);
            judge_session(&paces[i], seed, &score);
        }
        print_message("%s: %d beakers, %d captures, %d opened by value, %d not settled, U covers "
                      "%.1f %%\n",
                      paces[i].name, score.beakers, score.captures, score.by_value,
                      score.not_settled, 100.0 * score.covered / score.captures);
        /* A transit through air that wanders and says no word can be missed: at most one of 100. */
        if (score.by_value * 100 > score.beakers)
            fail_msg("%d of %d beakers opened by value", score.by_value, score.beakers);
        if (score.captures > score.beakers * 1.01)
            fail_msg("%d captures of %d beakers", score.captures, score.beakers);
        if (score.covered < 0.95 * score.captures)
            fail_msg("U covers the truth in %d of %d captures", score.covered, score.captures);
    }
}

static void air_is_never_captured_however_long(void **state)
{
    int captures = 0;

    (void)state;
    for (size_t i = 0; i < COUNT(paces); i++) {
        for (unsigned seed = 0; seed < 30; seed++) {
            struct bench b = new_bench(&paces[i], seed, &tape);
            const struct sm_rule rule = made_rule(TOLERANCE, paces[i].dwell_s, paces[i].over_s);

            b.signal = made_signal(&rule);
            made_stay(&b, 20, 5 * paces[i].dwell_s);
            captures = (int)tape_count(&tape, SM_SIGNAL_SETTLED);
            made_air(&b, 300);
            if ((int)tape_count(&tape, SM_SIGNAL_SETTLED) != captures)
                fail_msg("%s, seed %u: air was captured", paces[i].name, seed);
            sm_signal_destroy(b.signal);
        }
    }
}

/* ---- the same decisions ---- */

static void run_changed(const struct pace *p, unsigned seed, double add, double times,
                        int64_t shift_ns, struct tape *to)
{
    struct bench b = new_bench(p, seed, to);
    const struct sm_rule rule = made_rule(TOLERANCE * times, p->dwell_s, p->over_s);

    b.add = add;
    b.times = times;
    b.shift_ns = shift_ns;
    b.signal = made_signal(&rule);
    session(&b, p);
    sm_signal_destroy(b.signal);
}

static void compare_tapes(const char *what, unsigned seed, double add, double times,
                          int64_t shift_ns)
{
    if (tape.n != other_tape.n)
        fail_msg("%s, seed %u: %zu events, then %zu", what, seed, tape.n, other_tape.n);
    for (size_t i = 0; i < tape.n; i++) {
        const struct sm_signal_event *a = &tape.event[i], *b = &other_tape.event[i];

        if (a->kind != b->kind || a->by != b->by || a->how != b->how ||
            a->returned != b->returned || a->t_ns + shift_ns != b->t_ns)
            fail_msg("%s, seed %u: event %zu differs", what, seed, i);
        if (a->kind == SM_SIGNAL_MOVED && a->from_t_ns + shift_ns != b->from_t_ns)
            fail_msg("%s, seed %u: event %zu: another beginning", what, seed, i);
        if (a->kind != SM_SIGNAL_SETTLED)
            continue;
        assert_int_equal(a->settled.readings, b->settled.readings);
        check_close(what, b->settled.value, times * (a->settled.value + add),
                    1e-9 * times * (1 + fabs(add)));
        check_close(what, b->settled.u95, times * a->settled.u95, 1e-6 * times);
    }
}

static void another_zero_scale_or_start_of_time_gives_the_same_decisions(void **state)
{
    static const struct {
        const char *what;
        double add, times;
        int64_t shift_ns;
    } cases[] = { { "a constant added", 1234.5, 1, 0 },
                  { "scaled", 0, 1000, 0 },
                  { "scaled down", 0, 0.001, 0 },
                  { "turned round", 0, 1, INT64_C(86400000000000) + 123456789 },
                  { "all", -77.7, 0.3, INT64_C(-5000000001) } };

    (void)state;
    for (size_t p = 0; p < COUNT(paces); p++) {
        for (unsigned seed = 0; seed < 10; seed++) {
            run_changed(&paces[p], seed, 0, 1, 0, &tape);
            for (size_t c = 0; c < COUNT(cases); c++) {
                run_changed(&paces[p], seed, cases[c].add, cases[c].times, cases[c].shift_ns,
                            &other_tape);
                compare_tapes(cases[c].what, seed, cases[c].add, cases[c].times, cases[c].shift_ns);
            }
        }
    }
}

static void the_same_readings_give_the_same_bits(void **state)
{
    (void)state;
    for (unsigned seed = 0; seed < 5; seed++) {
        run_changed(&paces[1], seed, 0, 1, 0, &tape);
        run_changed(&paces[1], seed, 0, 1, 0, &other_tape);
        compare_tapes("again", seed, 0, 1, 0);
        for (size_t i = 0; i < tape.n; i++) {
            const struct sm_settled *a = &tape.event[i].settled, *b = &other_tape.event[i].settled;

            if (memcmp(&a->value, &b->value, sizeof a->value) != 0 ||
                memcmp(&a->u95, &b->u95, sizeof a->u95) != 0 ||
                memcmp(&a->sd, &b->sd, sizeof a->sd) != 0)
                fail_msg("seed %u: event %zu differs in its bits", seed, i);
        }
    }
}

/* ---- stray readings ---- */

/* A beaker, air, a beaker; between the readings come extra ones where `strays`. */
static void stray_session(const struct pace *p, unsigned seed, bool strays, struct tape *to)
{
    struct bench b = new_bench(p, seed, to), extra = made_bench(seed + 1000);
    const struct sm_rule rule = made_rule(TOLERANCE, p->dwell_s, p->over_s);

    b.stray = 0;
    b.signal = made_signal(&rule);
    for (int i = 0; i < 3; i++) {
        const double level = made_between(&b, -150, 150);
        const double calm_s = 8 * b.tau_s + 1;
        const double until_s = b.t_s + calm_s + 3 * p->dwell_s + 2 * p->over_s;

        made_stay(&b, level, calm_s);
        while (b.t_s < until_s) {
            unsigned run = 1 + (unsigned)(3 * made_uniform(&extra));

            made_stay(&b, level, made_between(&extra, 17, 40) / b.rate);
            for (; run > 0; run--) {
                const double odd = level + made_between(&extra, 20, 100);

                if (strays)
                    made_put(&b, b.t_s, odd, SM_FLAG_OK);
            }
            made_stay(&b, level, 4 / b.rate);
        }
        made_open(&b, 3 / b.rate + 1);
    }
    sm_signal_destroy(b.signal);
}

static void one_to_three_stray_readings_change_nothing(void **state)
{
    (void)state;
    for (size_t p = 0; p < COUNT(paces); p++) {
        for (unsigned seed = 0; seed < 40; seed++) {
            stray_session(&paces[p], seed, false, &tape);
            stray_session(&paces[p], seed, true, &other_tape);
            if (tape.n != other_tape.n)
                fail_msg("%s, seed %u: %zu events, with stray readings %zu", paces[p].name, seed,
                         tape.n, other_tape.n);
            for (size_t i = 0; i < tape.n; i++) {
                const struct sm_signal_event *a = &tape.event[i], *b = &other_tape.event[i];

                if (a->kind != b->kind || a->t_ns != b->t_ns || a->from_t_ns != b->from_t_ns)
                    fail_msg("%s, seed %u: event %zu differs", paces[p].name, seed, i);
                check_close("value", b->settled.value, a->settled.value, 0);
                assert_int_equal(a->settled.readings, b->settled.readings);
            }
        }
    }
}

/* ---- cut in two, and bursts ---- */

/* The session with a cut after each capture: memory and place go on, windows and bins do not. */
static void cut_session(const struct pace *p, unsigned seed, bool cut, struct tape *to)
{
    struct bench b = new_bench(p, seed, to);
    const struct sm_rule rule = made_rule(TOLERANCE, p->dwell_s, p->over_s);

    b.signal = made_signal(&rule);
    for (int i = 0; i < BEAKERS; i++) {
        made_stay(&b, made_between(&b, -180, 180), 3 * p->dwell_s + 2 * p->over_s + 8 * b.tau_s);
        if (cut && !sm_signal_open(b.signal)) {
            struct sm_channel_memory memory;
            struct sm_signal_start place;

            sm_signal_memory(b.signal, &memory);
            sm_signal_place(b.signal, &place);
            sm_signal_destroy(b.signal);
            assert_int_equal(place.place, SM_PLACE_STILL);
            assert_int_equal(sm_signal_create(&rule, 0, &memory, &place, &b.signal), SM_OK);
        }
        made_stay(&b, b.value, 5);
        made_open(&b, 2);
    }
    sm_signal_destroy(b.signal);
}

static void a_session_cut_between_immersions_gives_the_same_captures(void **state)
{
    (void)state;
    for (size_t p = 0; p < COUNT(paces); p++) {
        for (unsigned seed = 0; seed < 20; seed++) {
            cut_session(&paces[p], seed, false, &tape);
            cut_session(&paces[p], seed, true, &other_tape);
            assert_int_equal(tape_count(&tape, SM_SIGNAL_SETTLED),
                             tape_count(&other_tape, SM_SIGNAL_SETTLED));
            assert_int_equal(tape_count(&tape, SM_SIGNAL_MOVED),
                             tape_count(&other_tape, SM_SIGNAL_MOVED));
            for (size_t i = 0; i < tape_count(&tape, SM_SIGNAL_SETTLED); i++)
                check_close("value", tape_get(&other_tape, SM_SIGNAL_SETTLED, i)->settled.value,
                            tape_get(&tape, SM_SIGNAL_SETTLED, i)->settled.value, TOLERANCE / 10);
        }
    }
}

/* An adapter that hands over readings by fours: equal times, then a pause. */
static void readings_in_bursts_of_one_time_are_no_trouble(void **state)
{
    (void)state;
    for (unsigned seed = 0; seed < 40; seed++) {
        struct bench b = new_bench(&paces[0], seed, &tape), late;
        const struct sm_rule rule = made_rule(TOLERANCE, 22, 20);
        size_t moved;

        b.signal = made_signal(&rule);
        b.rate = 8;
        b.jitter = 0;
        late = b;
        for (int i = 0; i < 8 * 400; i++) {
            const double level = i < 1600 ? 60 : -40;

            b.value = level + (b.value - level) * exp(-0.125 / b.tau_s);
            if (i >= 1600 && i < 1624)
                made_put(&late, (i / 4) * 0.5, 0, SM_FLAG_OPEN);
            else
                made_put(&late, (i / 4) * 0.5, b.value + b.noise * made_normal(&b), SM_FLAG_OK);
        }
        moved = tape_count(&tape, SM_SIGNAL_MOVED);
        if (tape_count(&tape, SM_SIGNAL_SETTLED) != 2 || moved != 2)
            fail_msg("seed %u: %zu captures of 2 beakers, moved %zu times", seed,
                     tape_count(&tape, SM_SIGNAL_SETTLED), moved);
        sm_signal_destroy(b.signal);
    }
}

/* ---- nonsense ---- */

static double wild(struct bench *b)
{
    static const double sizes[] = { 0, 1e-310, 1e-12, 0.1, 1, 50, 1e6, 1e149, 1e160, 1.7e308 };
    const double size = sizes[(int)(made_uniform(b) * COUNT(sizes))];

    return made_uniform(b) < 0.5 ? -size : size;
}

static struct sm_signal_input any_input(struct bench *b, int64_t t_ns, bool calm)
{
    struct sm_signal_input in = { .kind = SM_SIGNAL_READING, .t_ns = t_ns };
    const double which = made_uniform(b);

    in.why = "any";
    in.class = (enum sm_class)(made_uniform(b) * SM_CLASS_COUNT);
    in.clock = (unsigned)(made_uniform(b) * 32);
    if (which < 0.002)
        in.kind = SM_SIGNAL_MARK;
    else if (which < 0.02)
        in.kind = SM_SIGNAL_TICK;
    else if (which < 0.022)
        in.kind = SM_SIGNAL_END;
    in.reading.value = calm ? 12 : wild(b);
    in.reading.step = calm ? 0 : fabs(wild(b));
    if (made_uniform(b) < (calm ? 0.002 : 0.1))
        in.reading.flag = (enum sm_flag)(made_uniform(b) * (SM_FLAG_UNUSABLE + 1));
    in.reading.other[0] = (struct sm_other){ made_uniform(b) < 0.9, wild(b), 0 };
    return in;
}

static void check_event(const struct sm_signal_event *e, int64_t t_ns, bool *told, unsigned seed)
{
    if (e->t_ns != t_ns)
        fail_msg("seed %u: an event of another time", seed);
    if (e->kind == SM_SIGNAL_MOVED) {
        *told = true;
        if (e->from_t_ns > t_ns)
            fail_msg("seed %u: moved in the future", seed);
    }
    if (e->kind == SM_SIGNAL_TRANSIT && (e->from_t_ns > e->to_t_ns || e->to_t_ns > t_ns))
        fail_msg("seed %u: a transit from %lld to %lld at %lld, %s, returned %d", seed,
                 (long long)e->from_t_ns, (long long)e->to_t_ns, (long long)t_ns,
                 sm_transit_how_name(e->how), e->returned);
    if (e->kind != SM_SIGNAL_SETTLED)
        return;
    if (!*told)
        fail_msg("seed %u: a capture that follows no moved", seed);
    *told = false;
    if (!isfinite(e->settled.value) || !(e->settled.u95 >= 0) || e->settled.readings < 3 ||
        e->settled.from_t_ns > e->settled.to_t_ns || e->settled.to_t_ns != t_ns)
        fail_msg("seed %u: captured %g with U %g out of %u readings from %lld to %lld at %lld",
                 seed, e->settled.value, e->settled.u95, e->settled.readings,
                 (long long)e->settled.from_t_ns, (long long)e->settled.to_t_ns, (long long)t_ns);
}

static void nonsense_gives_no_wrong_number(void **state)
{
    int captures = 0;

    (void)state;
    for (unsigned seed = 0; seed < 60; seed++) {
        const struct pace *p = &paces[seed % COUNT(paces)];
        struct bench b = made_bench(seed);
        const struct sm_rule rule = made_rule(TOLERANCE, p->dwell_s * (seed % 5 != 0), p->over_s);
        const struct sm_channel_memory memory = { 0 };
        struct sm_channel_memory after;
        const struct sm_signal_start start = { .place = SM_PLACE_LEFT };
        struct sm_signal *signal = NULL;
        int64_t t_ns = -made_ns(100);
        bool told = false, calm = false;

        assert_int_equal(sm_signal_create(&rule, 1, &memory, &start, &signal), SM_OK);
        for (int i = 0; i < 4000; i++) {
            struct sm_signal_event e;
            struct sm_signal_input in;

            if (made_uniform(&b) < 0.01)
                calm = !calm;
            if (made_uniform(&b) < 0.9)
                t_ns += made_ns(made_between(&b, 0, made_uniform(&b) < 0.02 ? 500 : 0.5));
            in = any_input(&b, t_ns, calm);
            assert_int_equal(sm_signal_feed(signal, &in), SM_OK);
            while (sm_signal_next(signal, &e)) {
                check_event(&e, t_ns, &told, seed);
                captures += e.kind == SM_SIGNAL_SETTLED;
            }
            if (sm_signal_deadline(signal) <= t_ns)
                fail_msg("seed %u: a deadline that is past", seed);
        }
        sm_signal_memory(signal, &after);
        if (!isfinite(after.noise) || !isfinite(after.step))
            fail_msg("seed %u: remembers noise %g, step %g", seed, after.noise, after.step);
        sm_signal_destroy(signal);
    }
    if (captures < 100) /* else nothing was tried */
        fail_msg("only %d captures", captures);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(no_capture_from_rinse_or_air_and_no_beaker_lost),
        cmocka_unit_test(air_is_never_captured_however_long),
        cmocka_unit_test(another_zero_scale_or_start_of_time_gives_the_same_decisions),
        cmocka_unit_test(the_same_readings_give_the_same_bits),
        cmocka_unit_test(one_to_three_stray_readings_change_nothing),
        cmocka_unit_test(a_session_cut_between_immersions_gives_the_same_captures),
        cmocka_unit_test(readings_in_bursts_of_one_time_are_no_trouble),
        cmocka_unit_test(nonsense_gives_no_wrong_number),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
