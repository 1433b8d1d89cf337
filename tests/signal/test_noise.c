/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Noise from second differences, the display step, and what the step leaves. */
#include "signal/made.h"
#include "signal/noise.h"

/* Mean of the estimate over many readings of white noise of sd 1 on a trend, spaced unevenly. */
static double mean_estimate(unsigned seed, double trend, double uneven)
{
    struct bench b = made_bench(seed);
    struct sm_noise n;
    double t[3] = { 0 }, x[3] = { 0 }, sum = 0;
    const int readings = 60000;

    sm_noise_init(&n, 0);
    for (int i = 0; i < readings; i++) {
        t[2] = t[1], t[1] = t[0], x[2] = x[1], x[1] = x[0];
        t[0] += 1 + uneven * (2 * made_uniform(&b) - 1);
        x[0] = trend * t[0] + made_normal(&b);
        if (i >= 2)
            sm_noise_add(&n, x[0], t[0] - t[1], x[1], t[1] - t[2], x[2]);
        sum += n.sd;
    }
    return sum / readings;
}

/* The estimate is 1.4826 times the median of 15 sizes. For a normal variable the median of its size
 * is 0.6745 sd (1 / 1.4826), so the expectation is the sd, but for the small bias of a median of
 * few. */
static void white_noise_is_estimated_as_it_is_on_any_trend(void **state)
{
    static const struct {
        double trend, uneven;
    } cases[] = { { 0, 0 }, { 5, 0 }, { -40, 0 }, { 0, 0.8 }, { 5, 0.8 } };

    (void)state;
    for (unsigned i = 0; i < COUNT(cases); i++) {
        char what[80];

        snprintf(what, sizeof what, "trend %g, uneven %g", cases[i].trend, cases[i].uneven);
        check_close(what, mean_estimate(i, cases[i].trend, cases[i].uneven), 1, 0.06);
    }
}

static void a_few_stray_readings_hardly_move_it(void **state)
{
    struct bench b = made_bench(7);
    struct sm_noise n;
    double x[3] = { 0 };

    (void)state;
    sm_noise_init(&n, 0);
    for (int i = 0; i < 15; i++) {
        x[2] = x[1], x[1] = x[0];
        x[0] = made_normal(&b) + (i == 9 ? 1000 : 0); /* in three second differences */
        if (i >= 2)
            sm_noise_add(&n, x[0], 1, x[1], 1, x[2]);
    }
    if (!(n.sd > 0.3 && n.sd < 2.5))
        fail_msg("sd %.3f with one stray reading, want about 1", n.sd);
}

/* |(3 - 1) - (1 - 2)| / sqrt 6, every time */
static const double seen_sd = 1.4826 * 3 / 2.449489742783178;

static void without_memory_three_readings_tell_of_the_noise(void **state)
{
    struct sm_noise n;

    (void)state;
    sm_noise_init(&n, 0);
    for (int i = 0; i < 2; i++)
        sm_noise_add(&n, 3, 1, 1, 1, 2);
    assert_false(n.known);
    sm_noise_add(&n, 3, 1, 1, 1, 2);
    assert_true(n.known);
    check_close("seen", n.sd, seen_sd, 1e-12);
}

/* So that a change of file changes nothing: the memory is what was seen before it. */
static void what_it_remembers_weighs_as_much_as_all_that_is_kept(void **state)
{
    struct sm_noise n;

    (void)state;
    sm_noise_init(&n, 0.25);
    assert_true(n.known);
    check_close("remembered", n.sd, 0.25, 0);
    for (int i = 0; i < SM_NOISE_KEPT / 2; i++)
        sm_noise_add(&n, 3, 1, 1, 1, 2);
    check_close("a minority has seen otherwise", n.sd, 0.25, 1e-12);
    sm_noise_add(&n, 3, 1, 1, 1, 2);
    check_close("a majority", n.sd, seen_sd, 1e-12);
}

static void the_step_is_the_readings_own_or_the_smallest_change(void **state)
{
    struct sm_step s;

    (void)state;
    sm_step_init(&s, 0);
    sm_step_see(&s, 12.3, 0);
    check_close("unknown", sm_step_now(&s), 0, 0);
    sm_step_see(&s, 12.3, 0);
    sm_step_see(&s, 12.3 + 1e-15, 0); /* rounding, no change */
    check_close("still unknown", sm_step_now(&s), 0, 0);
    sm_step_see(&s, 12.6, 0);
    sm_step_see(&s, 12.5, 0);
    sm_step_see(&s, 13.5, 0);
    check_close("learned", sm_step_now(&s), 0.1, 1e-12);
    sm_step_see(&s, 13.5, 0.01);
    check_close("given", sm_step_now(&s), 0.01, 0);
    sm_step_see(&s, 13.5, 1); /* another range of the meter */
    check_close("given anew", sm_step_now(&s), 1, 0);
}

/* Readings rounded to a step, averaged: how far is the mean from the truth, over many positions of
 * the truth between two steps? Still signal: a rectangle, step / sqrt 12. With noise the rounding
 * is dithered away; what is left must not exceed what is claimed. */
static void the_step_leaves_no_more_than_is_claimed(void **state)
{
    static const double sds[] = { 0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.7, 1.0 };

    (void)state;
    for (size_t i = 0; i < COUNT(sds); i++) {
        double squares = 0;
        const int places = 400;

        for (int k = 0; k < places; k++) {
            const double truth = (k + 0.5) / places;
            double mean = 0;

            if (sds[i] > 0) { /* expectation of the rounded value */
                for (int digit = -8; digit <= 9; digit++)
                    mean += digit * 0.5 *
                            (erfc(-(digit + 0.5 - truth) / sds[i] / sqrt(2)) -
                             erfc(-(digit - 0.5 - truth) / sds[i] / sqrt(2)));
            } else {
                mean = floor(truth + 0.5);
            }
            squares += (mean - truth) * (mean - truth);
        }
        if (sqrt(squares / places) > sm_step_uncertainty(1, sds[i]) * 1.001)
            fail_msg("sd %.1f steps: the mean is off by %.5f, claimed %.5f", sds[i],
                     sqrt(squares / places), sm_step_uncertainty(1, sds[i]));
    }
    check_close("still", sm_step_uncertainty(0.1, 0), 0.1 / sqrt(12), 1e-15);
    check_close("no step", sm_step_uncertainty(0, 0.1), 0, 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(white_noise_is_estimated_as_it_is_on_any_trend),
        cmocka_unit_test(a_few_stray_readings_hardly_move_it),
        cmocka_unit_test(without_memory_three_readings_tell_of_the_noise),
        cmocka_unit_test(what_it_remembers_weighs_as_much_as_all_that_is_kept),
        cmocka_unit_test(the_step_is_the_readings_own_or_the_smallest_change),
        cmocka_unit_test(the_step_leaves_no_more_than_is_claimed),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
