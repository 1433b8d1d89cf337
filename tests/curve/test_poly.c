/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_poly.c: the fit against a slow twin: normal equations in long double, over random shapes. */
#include "curve/poly.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include <gsl/gsl_errno.h>

#include "check.h"
#include "curve/curve.h"

#define SHAPES 2000
#define N_MAX 60

/* xorshift64* (Marsaglia; Vigna): 0 <= r < 1. */
static double uniform(uint64_t *seed)
{
    *seed ^= *seed >> 12;
    *seed ^= *seed << 25;
    *seed ^= *seed >> 27;
    return (double)((*seed * UINT64_C(2685821657736338717)) >> 11) / 9007199254740992.0;
}

struct twin {
    long double b[3], v[3][3], residual_sd, r_squared;
};

/* Gauss-Jordan with pivots on the p normal equations beside the unit matrix. */
static void invert_twin(size_t p, long double a[3][6])
{
    for (size_t k = 0; k < p; k++) {
        size_t best = k;
        for (size_t i = k + 1; i < p; i++)
            if (fabsl(a[i][k]) > fabsl(a[best][k]))
                best = i;
        for (size_t j = 0; j < 2 * p; j++) {
            const long double swap = a[k][j];
            a[k][j] = a[best][j];
            a[best][j] = swap;
        }
        const long double pivot = a[k][k];
        for (size_t j = 0; j < 2 * p; j++)
            a[k][j] /= pivot;
        for (size_t i = 0; i < p; i++) {
            const long double f = a[i][k];
            for (size_t j = 0; i != k && j < 2 * p; j++)
                a[i][j] -= f * a[k][j];
        }
    }
}

static struct twin slow(const double *u, const double *y, size_t n, unsigned from, unsigned to)
{
    struct twin t = { .residual_sd = 0 };
    const size_t p = to - from + 1;
    long double a[3][6] = { { 0 } }, xy[3] = { 0 }, rss = 0, tss = 0, mean = 0;

    for (size_t i = 0; i < n; i++) {
        mean += from == 0 ? (long double)y[i] / (long double)n : 0;
        for (size_t j = 0; j < p; j++) {
            xy[j] += powl(u[i], (long double)(j + from)) * y[i];
            for (size_t k = 0; k < p; k++)
                a[j][k] += powl(u[i], (long double)(j + k + 2 * from));
        }
    }
    for (size_t j = 0; j < p; j++)
        a[j][p + j] = 1;
    invert_twin(p, a);
    for (size_t j = 0; j < p; j++)
        for (size_t k = 0; k < p; k++)
            t.b[j] += a[j][p + k] * xy[k];
    for (size_t i = 0; i < n; i++) {
        long double r = y[i];
        for (size_t j = 0; j < p; j++)
            r -= t.b[j] * powl(u[i], (long double)(j + from));
        rss += r * r;
        tss += (y[i] - mean) * (y[i] - mean);
    }
    for (size_t j = 0; j < p; j++)
        for (size_t k = 0; k < p; k++)
            t.v[j][k] = rss / (long double)(n - p) * a[j][p + k];
    t.residual_sd = sqrtl(rss / (long double)(n - p));
    t.r_squared = 1 - rss / tss;
    return t;
}

struct shape {
    double u[N_MAX], y[N_MAX];
    size_t n;
};

/* Uneven x from anywhere, some repeated; y on a bent curve with noise. */
static struct shape made_up(uint64_t *seed, size_t at_least)
{
    struct shape s = { .n = at_least + (size_t)(uniform(seed) * (double)(N_MAX - at_least)) };
    const double width = exp(14 * uniform(seed) - 7), at = width * (20 * uniform(seed) - 10);
    const double height = exp(10 * uniform(seed) - 5), noise = exp(-9 * uniform(seed));

    for (size_t i = 0; i < s.n; i++) {
        const double z = i < at_least ? ((double)i + 0.8 * uniform(seed)) / (double)at_least
                         : uniform(seed) < 0.3 ? (s.u[i - 1] - at) / width
                                               : uniform(seed);
        s.u[i] = at + width * z;
        s.y[i] = height * (3 * uniform(seed) * noise + 2.385 * z - 0.4 * z * z + 1.1);
    }
    return s;
}

static void compare(const char *what, uint64_t seed, double got, long double want, double tol)
{
    if (!(fabsl(got - want) <= tol))
        fail_msg("seed %llu: %s: got %.17g, want %.17Lg +- %.2g", (unsigned long long)seed, what,
                 got, want, tol);
}

static void fits_agree_with_slow_normal_equations(void **state)
{
    static const struct {
        unsigned from, to;
    } kinds[] = { { 0, 1 }, { 1, 1 }, { 0, 2 }, { 1, 2 } };
    uint64_t seed = UINT64_C(20261201);

    (void)state;
    print_message("seed of the first shape: %llu\n", (unsigned long long)seed);
    for (size_t i = 0; i < SHAPES; i++) {
        const uint64_t this_seed = seed;
        const unsigned from = kinds[i % COUNT(kinds)].from, to = kinds[i % COUNT(kinds)].to;
        const struct shape s = made_up(&seed, 4);
        const struct twin want = slow(s.u, s.y, s.n, from, to);
        struct sm_poly got;
        assert_int_equal(sm_poly_fit(s.u, s.y, s.n, from, to, &got), SM_OK);
        assert_int_equal(got.dof, s.n - (to - from + 1));
        for (size_t k = 0; k < got.n_coefficients; k++) {
            const double se = (double)sqrtl(want.v[k][k]);
            compare("coefficient", this_seed, got.coefficient[k], want.b[k], 1e-8 * se);
            compare("standard error", this_seed, got.standard_error[k], sqrtl(want.v[k][k]),
                    1e-8 * se);
            for (size_t j = 0; j < got.n_coefficients; j++)
                compare("covariance", this_seed, got.covariance[k][j], want.v[k][j],
                        1e-8 * se * (double)sqrtl(want.v[j][j]));
        }
        compare("residual SD", this_seed, got.residual_sd, want.residual_sd,
                1e-10 * (double)want.residual_sd);
        compare("R squared", this_seed, got.r_squared, want.r_squared, 1e-12);
    }
}

/* u^2(x) of a reading off a quadratic, from the twin's coefficients and covariance (JCGM 100, 5.2).
 */
static void quadratic_readings_agree_with_the_slow_covariance(void **state)
{
    uint64_t seed = UINT64_C(4711);
    size_t read = 0;

    (void)state;
    print_message("seed of the first shape: %llu\n", (unsigned long long)seed);
    for (size_t i = 0; i < 300; i++) {
        const uint64_t this_seed = seed;
        const struct shape s = made_up(&seed, 4);
        const struct twin want = slow(s.u, s.y, s.n, 0, 2);
        struct sm_point p[N_MAX];
        struct sm_curve c;
        struct sm_read_off r;
        const unsigned m = 1 + (unsigned)(i % 3);
        const double y = s.y[i % s.n];
        for (size_t k = 0; k < s.n; k++)
            p[k] = (struct sm_point){ s.u[k], s.y[k], 0 };
        assert_int_equal(sm_curve_fit(SM_MODEL_QUADRATIC, p, s.n, 7, &c), SM_OK);
        if (sm_curve_read(&c, y, m, 0, &r) != SM_OK)
            continue;
        const long double g[] = { 1, r.x, (long double)r.x * r.x };
        const long double slope = want.b[1] + 2 * want.b[2] * r.x;
        long double u2 = 0;
        for (size_t a = 0; a < 3; a++)
            for (size_t b = 0; b < 3; b++)
                u2 += g[a] * want.v[a][b] * g[b];
        const long double position = sqrtl(u2) / fabsl(slope);
        const long double whole =
            sqrtl(u2 + want.residual_sd * want.residual_sd / m) / fabsl(slope);
        compare("y at x", this_seed, sm_curve_y(&c, r.x, 0), y, 1e-9 * fabs(y));
        compare("u of the curve", this_seed, r.curve_uncertainty, position,
                1e-6 * (double)position);
        compare("u of the reading", this_seed, r.standard_uncertainty, whole, 1e-6 * (double)whole);
        read++;
    }
    assert_true(read > 200);
}

static void scale_and_place_of_the_data_change_nothing_but_units(void **state)
{
    static const double scales[] = { 1e-120, 1e-30, 1e-3, 7, 1e30, 1e120 };
    uint64_t seed = UINT64_C(99);
    const struct shape s = made_up(&seed, 8);
    struct sm_poly want, got;

    (void)state;
    assert_int_equal(sm_poly_fit(s.u, s.y, s.n, 0, 1, &want), SM_OK);
    for (size_t i = 0; i < COUNT(scales); i++) {
        struct shape big = s;
        for (size_t k = 0; k < s.n; k++)
            big.y[k] *= scales[i];
        assert_int_equal(sm_poly_fit(big.u, big.y, big.n, 0, 1, &got), SM_OK);
        check_digits("slope", got.coefficient[1], want.coefficient[1] * scales[i], 12);
        check_digits("standard error", got.standard_error[1], want.standard_error[1] * scales[i],
                     12);
        check_digits("residual SD", got.residual_sd, want.residual_sd * scales[i], 12);
        check_digits("R squared", got.r_squared, want.r_squared, 13);
    }
}

static void twenty_thousand_points_are_fitted(void **state)
{
    static double u[SM_FIT_POINTS_MAX], y[SM_FIT_POINTS_MAX];
    uint64_t seed = UINT64_C(31);
    double sum = 0;
    struct sm_poly got;

    (void)state;
    for (size_t i = 0; i < COUNT(u); i++) {
        u[i] = 12 * uniform(&seed);
        y[i] = 2 + 3 * u[i] - 0.05 * u[i] * u[i] + (i % 2 == 0 ? 0.25 : -0.25);
        sum += u[i];
    }
    assert_int_equal(sm_poly_fit(u, y, COUNT(u), 0, 2, &got), SM_OK);
    check_close("constant", got.coefficient[0], 2, 4 * got.standard_error[0]);
    check_close("slope", got.coefficient[1], 3, 4 * got.standard_error[1]);
    check_close("bend", got.coefficient[2], -0.05, 4 * got.standard_error[2]);
    check_close("residual SD", got.residual_sd, 0.25, 1e-3);
    check_close("mean", got.u_mean, sum / (double)COUNT(u), 1e-10);
}

static void too_little_is_refused_and_changes_nothing(void **state)
{
    static const struct {
        const char *name;
        double u[5], y[5];
        size_t n;
        unsigned from, to;
        enum sm_status want;
    } cases[] = {
        { "one more than coefficients needed", { 1, 2 }, { 1, 2 }, 2, 0, 1, SM_ESHORT },
        { "x all alike", { 0.3, 0.3, 0.3 }, { 1, 2, 3 }, 3, 0, 1, SM_ESHORT },
        { "x all zero", { 0, 0 }, { 1, 2 }, 2, 1, 1, SM_ESHORT },
        { "two x for a bend", { 1, 2, 1, 2 }, { 1, 2, 3, 4 }, 4, 0, 2, SM_ESHORT },
        { "a cubic", { 1, 2, 3, 4, 5 }, { 1, 2, 3, 4, 5 }, 5, 0, 3, SM_EINVAL },
        { "a constant alone", { 1, 2, 3 }, { 1, 2, 3 }, 3, 0, 0, SM_EINVAL },
        { "no number", { 1, 2, 3 }, { 1, NAN, 3 }, 3, 0, 1, SM_EVALUE },
        { "squares beyond a double", { 1e200, 2e200, 3e200 }, { 1, 2, 4 }, 3, 0, 1, SM_EVALUE },
    };
    struct sm_poly got, before;

    (void)state;
    memset(&before, 0x5a, sizeof before);
    for (size_t i = 0; i < COUNT(cases); i++) {
        memcpy(&got, &before, sizeof got);
        const enum sm_status status =
            sm_poly_fit(cases[i].u, cases[i].y, cases[i].n, cases[i].from, cases[i].to, &got);
        if (status != cases[i].want || memcmp(&got, &before, sizeof got) != 0)
            fail_msg("%s: status %d, want %d", cases[i].name, status, cases[i].want);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(fits_agree_with_slow_normal_equations),
        cmocka_unit_test(quadratic_readings_agree_with_the_slow_covariance),
        cmocka_unit_test(scale_and_place_of_the_data_change_nothing_but_units),
        cmocka_unit_test(twenty_thousand_points_are_fitted),
        cmocka_unit_test(too_little_is_refused_and_changes_nothing),
    };
    gsl_set_error_handler_off();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
