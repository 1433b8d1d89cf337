/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The half-window bound: by hand, and against known tails. */
#include "signal/halves.h"
#include "signal/made.h"

/* A bin is up to a 32nd of the span, so the quarter's edge may lie half of that beside T/4, where a
 * square-root tail has fallen by 1 - sqrt(0.25 / (0.25 + 1/64)) = 3 %; both edges together: */
#define EDGES 1.06

/* What a curve gives over span_s, one reading each 0.05 s. */
static struct sm_halves over(double (*f)(double, double), double a, double span_s)
{
    struct sm_bins bins;
    struct sm_halves h = { 0 };

    sm_bins_begin(&bins, 0, SM_NS_PER_S / 2);
    for (int i = 0; 0.05 * i <= span_s; i++)
        sm_bins_add(&bins, made_ns(0.05 * i), f(0.05 * i, a));
    assert_true(sm_halves_of(&bins, 0, &h));
    return h;
}

static double staircase(double t, double a)
{
    (void)a;
    return t < 8 ? 100 : t < 16 ? 7 : 4;
}

static double exponential(double t, double tau)
{
    return 100 * exp(-t / tau);
}

static double hyperbolic(double t, double a)
{
    return 100 * a / (t + 0.05);
}

static double square_root(double t, double a)
{
    return 100 * sqrt(a / (t + 0.05));
}

static void a_calculator_gives_the_same(void **state)
{
    /* 32 s in bins of 0.5 s: bins of [8, 16) are 7, those of [16, 32) are 4 */
    const struct sm_halves h = over(staircase, 0, 32);

    (void)state;
    check_close("mean", h.mean, 4, 1e-9);
    check_close("difference", h.difference, -3, 1e-9);
    check_close("to come", sm_halves_to_come(&h), 7.23, 1e-9);
    /* no noise: what is left is the step's part, 2 × 0.05 */
    check_close("bound", sm_halves_bound(&h, 2, 0.05), 7.33, 1e-6);
}

/* The factor covers what is yet to come of the tails it was made for. (It is no more than that: an
 * exponential younger than its time constant still runs straight, and nobody can tell where to.) */
static void the_bound_covers_the_end_of_each_published_tail(void **state)
{
    static const struct {
        const char *name;
        double (*f)(double, double);
        double a[3];
    } shapes[] = { { "exponential", exponential, { 3, 10, 40 } },
                   { "hyperbolic", hyperbolic, { 1, 5, 20 } },
                   { "square root", square_root, { 0.002, 0.1, 5 } } };

    (void)state;
    for (size_t s = 0; s < COUNT(shapes); s++) {
        for (size_t i = 0; i < 3; i++) {
            for (double span_s = 20; span_s < 2000; span_s *= 1.13) {
                if (shapes[s].f == exponential && span_s < shapes[s].a[i])
                    continue;
                const struct sm_halves h = over(shapes[s].f, shapes[s].a[i], span_s);

                if (!(fabs(h.mean) <= sm_halves_to_come(&h) * EDGES + 1e-9))
                    fail_msg("%s %g after %.0f s: %.4f still to come, bound %.4f", shapes[s].name,
                             shapes[s].a[i], span_s, fabs(h.mean), sm_halves_to_come(&h));
            }
        }
    }
}

/* Flat signal with noise: |mean - truth| is below the bound in at least 95 of 100 cases, and the
 * variance of the mean is what white noise makes it. */
static void noise_alone_is_covered(void **state)
{
    static const double phis[] = { 0, 0.7 };

    (void)state;
    for (size_t p = 0; p < COUNT(phis); p++) {
        struct bench b = made_bench(5);
        int covered = 0;
        double var = 0, want;
        const int cases = 2000;

        for (int c = 0; c < cases; c++) {
            struct sm_bins bins;
            struct sm_halves h;
            double ar = made_normal(&b);

            sm_bins_begin(&bins, 0, SM_NS_PER_S / 2);
            for (int i = 0; i < 400; i++) {
                ar = phis[p] * ar + sqrt(1 - phis[p] * phis[p]) * made_normal(&b);
                sm_bins_add(&bins, made_ns(0.1 * i), ar);
            }
            assert_true(sm_halves_of(&bins, 0, &h));
            covered += fabs(h.mean) <= sm_halves_bound(&h, 2, 0);
            var += h.var_mean / cases;
        }
        if (covered < 0.95 * cases)
            fail_msg("phi %.1f: %d of %d covered", phis[p], covered, cases);
        /* about 200 readings in the second half; AR(1): (1 + phi) / (1 - phi) times white noise.
         * It errs upwards, by up to two fifths. */
        want = (1 + phis[p]) / (1 - phis[p]) / 200;
        if (!(var >= want && var <= 1.4 * want))
            fail_msg("phi %.1f: variance of the mean %.5f, is %.5f", phis[p], var, want);
    }
}

static void too_few_bins_say_nothing(void **state)
{
    struct sm_bins bins;
    struct sm_halves h;

    (void)state;
    sm_bins_begin(&bins, 0, SM_NS_PER_S);
    assert_false(sm_halves_of(&bins, 0, &h));
    sm_bins_add(&bins, 0, 1);
    sm_bins_add(&bins, made_ns(0.5), 1);
    assert_false(sm_halves_of(&bins, 0, &h));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_calculator_gives_the_same),
        cmocka_unit_test(the_bound_covers_the_end_of_each_published_tail),
        cmocka_unit_test(noise_alone_is_covered),
        cmocka_unit_test(too_few_bins_say_nothing),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
