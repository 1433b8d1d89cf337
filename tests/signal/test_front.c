/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The front end alone: what is stray, what is a departure, what is neither. */
#include "signal/front.h"
#include "signal/made.h"

static struct sm_front front;

struct seen {
    int departures, taken;
    struct sm_departure first;
};

static void begin(double dwell_s)
{
    sm_front_init(&front, sm_pace_of(made_ns(dwell_s)), 0, 0);
}

static void feed(struct seen *seen, double t_s, double x, double step)
{
    struct sm_signal_reading r = { .t_ns = made_ns(t_s), .value = x, .step = step };
    struct sm_departure d;

    if (sm_front_reading(&front, &r, 0.6, &d) && seen->departures++ == 0)
        seen->first = d;
    seen->taken += (int)front.n_taken;
}

/* Every published response only slows down: no reading of it may be taken for a departure, at any
 * speed and rate, with gaps, once it has been seen for three readings. */
static void no_response_that_slows_down_is_a_departure(void **state)
{
    static const double rates[] = { 0.5, 1, 3, 10 }, steps[] = { -180, -20, 5, 180 };

    (void)state;
    for (size_t r = 0; r < COUNT(rates); r++) {
        for (size_t k = 0; k < COUNT(steps); k++) {
            for (int shape = 0; shape < 3; shape++) {
                for (double a = 1; a <= 40; a *= 1.9) {
                    struct bench b = made_bench(3);
                    struct seen seen = { 0 };
                    double t_s = 0;
                    int n = 0;

                    begin(22);
                    for (; t_s < 300; n++) {
                        const double left = shape == 0   ? exp(-t_s / a)
                                            : shape == 1 ? 1 / (1 + t_s / a)
                                                         : 1 / (1 + sqrt(t_s / (0.1 * a)));

                        feed(&seen, t_s, steps[k] * left, 0.01);
                        t_s += (0.8 + 0.4 * made_uniform(&b)) / rates[r];
                        if (made_uniform(&b) < 0.02)
                            t_s += 4;
                    }
                    if (seen.departures > 0 || seen.taken != n)
                        fail_msg("shape %d, a %.1f s, step %.0f, %.1f readings/s: %d departures, "
                                 "%d of %d taken, first at %.2f s",
                                 shape, a, steps[k], rates[r], seen.departures, seen.taken, n,
                                 1e-9 * (double)seen.first.t_ns);
                }
            }
        }
    }
}

static void up_to_three_odd_readings_that_come_back_are_stray(void **state)
{
    (void)state;
    for (int odd = 1; odd <= 5; odd++) {
        struct seen seen = { 0 };
        double t_s = 0;

        begin(22);
        for (int i = 0; i < 20; i++)
            feed(&seen, t_s++, 50, 0.1);
        for (int i = 0; i < odd; i++)
            feed(&seen, t_s++, 70, 0.1);
        for (int i = 0; i < 3; i++)
            feed(&seen, t_s++, 50, 0.1);
        if (odd <= 3 && (seen.departures != 0 || seen.taken != 23))
            fail_msg("%d odd: %d departures, %d taken", odd, seen.departures, seen.taken);
        if (odd > 3 && seen.departures != 1)
            fail_msg("%d odd: %d departures", odd, seen.departures);
    }
}

static void a_departure_says_when_it_began_and_both_levels(void **state)
{
    struct seen seen = { 0 };
    double t_s = 0;

    (void)state;
    begin(22);
    for (int i = 0; i < 20; i++)
        feed(&seen, t_s++, 50, 0.1);
    for (int i = 0; i < 4; i++)
        feed(&seen, t_s++, 70, 0.1);
    assert_int_equal(seen.departures, 1);
    assert_true(seen.first.t_ns == made_ns(20));
    check_close("before", seen.first.before, 50, 0);
    check_close("level", seen.first.level, 70, 0);
    check_close("reach", seen.first.reach, 0, 0);
    assert_int_equal(seen.taken, 24);
}

static void odd_readings_for_less_than_a_second_are_stray_however_many(void **state)
{
    struct seen seen = { 0 };

    (void)state;
    begin(22);
    for (int i = 0; i < 100; i++)
        feed(&seen, 0.05 * i, 50, 0.1);
    for (int i = 0; i < 5; i++)
        feed(&seen, 5 + 0.05 * i, 70, 0.1);
    for (int i = 5; i < 100; i++)
        feed(&seen, 5 + 0.05 * i, 50, 0.1);
    assert_int_equal(seen.departures, 0);
    assert_int_equal(seen.taken, 195);
}

static void a_slow_start_that_single_readings_hide_is_seen_by_blocks(void **state)
{
    int seen_in = 0;

    (void)state;
    for (unsigned seed = 0; seed < 40; seed++) {
        struct bench b = made_bench(seed);
        struct seen seen = { 0 };

        begin(22);
        for (int i = 0; i < 200; i++)
            feed(&seen, 0.1 * i, 50 + 0.15 * made_normal(&b), 0.01);
        if (seen.departures != 0)
            fail_msg("seed %u: a departure out of noise", seed);
        for (int i = 0; i < 40; i++) /* 1 u/s²: the speed rises by 0.1 u/s a reading */
            feed(&seen, 20 + 0.1 * i, 50 + 0.5 * pow(0.1 * i, 2) + 0.15 * made_normal(&b), 0.01);
        seen_in += seen.departures > 0;
    }
    if (seen_in < 38)
        fail_msg("seen in %d of 40", seen_in);
}

static void readings_that_jump_about_are_no_accident_though_each_comes_back(void **state)
{
    struct seen seen = { 0 };

    (void)state;
    begin(22);
    for (int i = 0; i < 40; i++)
        feed(&seen, i, 50, 0.1);
    for (int i = 0; i < 40; i++)
        feed(&seen, 40 + i, i % 2 == 0 ? 80 + i : 50, 0.1);
    if (seen.departures < 3)
        fail_msg("%d departures", seen.departures);
}

static void a_stirrer_that_makes_noise_is_got_used_to(void **state)
{
    struct bench b = made_bench(2);
    struct seen early = { 0 }, late = { 0 };

    (void)state;
    begin(22);
    for (int i = 0; i < 500; i++)
        feed(&early, 0.2 * i, 50 + 0.05 * made_normal(&b), 0.01);
    assert_int_equal(early.departures, 0);
    for (int i = 500; i < 1500; i++) /* noise 16 times larger, 1.3 tolerances */
        feed(&early, 0.2 * i, 50 + 0.8 * made_normal(&b), 0.01);
    for (int i = 1500; i < 2500; i++)
        feed(&late, 0.2 * i, 50 + 0.8 * made_normal(&b), 0.01);
    if (late.departures > 2 || late.taken < 950)
        fail_msg("%d departures, %d of 1000 taken", late.departures, late.taken);
}

static void where_restless_air_ends_is_seen(void **state)
{
    int seen_in = 0;

    (void)state;
    for (unsigned seed = 0; seed < 40; seed++) {
        struct bench b = made_bench(seed);
        struct seen before = { 0 }, after = { 0 };

        begin(22);
        for (int i = 0; i < 300; i++)
            feed(&before, 0.1 * i, 50 + 0.05 * made_normal(&b), 0.01);
        for (int i = 300; i < 340; i++)
            feed(&before, 0.1 * i, 90 + 1.5 * made_normal(&b), 0.01);
        for (int i = 340; i < 360; i++)
            feed(&after, 0.1 * i, 110 + 0.05 * made_normal(&b), 0.01);
        seen_in += before.departures > 0 && after.departures > 0;
    }
    if (seen_in < 38)
        fail_msg("seen in %d of 40", seen_in);
}

static void what_is_far_noisier_than_the_tolerance_never_rests(void **state)
{
    static const double rates[] = { 1, 5 };

    (void)state;
    for (size_t r = 0; r < COUNT(rates); r++) {
        struct bench b = made_bench(9);
        struct seen seen = { 0 };

        begin(22);
        for (int i = 0; i < (int)(440 * rates[r]); i++) /* twenty dwells, 20 tolerances */
            feed(&seen, i / rates[r], 50 + 12 * made_normal(&b), 0.01);
        if (seen.departures < 20)
            fail_msg("%g readings/s: %d departures in twenty dwells", rates[r], seen.departures);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(no_response_that_slows_down_is_a_departure),
        cmocka_unit_test(up_to_three_odd_readings_that_come_back_are_stray),
        cmocka_unit_test(a_departure_says_when_it_began_and_both_levels),
        cmocka_unit_test(odd_readings_for_less_than_a_second_are_stray_however_many),
        cmocka_unit_test(a_slow_start_that_single_readings_hide_is_seen_by_blocks),
        cmocka_unit_test(readings_that_jump_about_are_no_accident_though_each_comes_back),
        cmocka_unit_test(where_restless_air_ends_is_seen),
        cmocka_unit_test(what_is_far_noisier_than_the_tolerance_never_rests),
        cmocka_unit_test(a_stirrer_that_makes_noise_is_got_used_to),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
