/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_published.c: curve.h against published values. Their sources are named in the files of
 * tests/reference/ from which they are read. */
#include "curve/curve.h"

#include <math.h>
#include <stdio.h>

#include <gsl/gsl_errno.h>

#include "check.h"
#include "reference/reference.h"

static size_t load(const char *file, struct sm_point p[SM_POINTS_MAX])
{
    double x[SM_POINTS_MAX], y[SM_POINTS_MAX];
    const size_t n = reference_pairs(file, SM_POINTS_MAX, x, y);

    for (size_t i = 0; i < n; i++)
        p[i] = (struct sm_point){ x[i], y[i], 0 };
    return n;
}

static struct sm_curve fitted(enum sm_model m, const struct sm_point *p, size_t n)
{
    struct sm_curve c;
    const enum sm_status status = sm_curve_fit(m, p, n, 7, &c);

    if (status != SM_OK)
        fail_msg("fit of %s to %zu points: status %d", sm_model_name(m), n, status);
    return c;
}

static void the_nernst_slope_agrees_with_the_recomputed_table(void **state)
{
    double t_c[64], want[64];
    const size_t n = reference_pairs("nernst_slope.csv", 64, t_c, want);

    (void)state;
    assert_int_equal(n, 24);
    for (size_t i = 0; i < n; i++)
        check_close("mV per pH", sm_nernst_mv(t_c[i]), want[i], 0.51e-10);
}

/* NIST StRD: Norris, Pontius, NoInt1. */
static void nist_certified_values_come_back_to_eleven_digits(void **state)
{
    static const struct {
        const char *set, *file;
        enum sm_model model;
        size_t first, n; /* B0 or B1 first; coefficients */
    } cases[] = { { "norris", "nist_norris.csv", SM_MODEL_LINE, 0, 2 },
                  { "pontius", "nist_pontius.csv", SM_MODEL_QUADRATIC, 0, 3 },
                  { "noint1", "nist_noint1.csv", SM_MODEL_PROPORTIONAL, 1, 1 } };
    static const char *const names[] = { "B0", "B1", "B2" };
    const char *const file = "nist_certified.csv";

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_point p[SM_POINTS_MAX];
        const size_t n = load(cases[i].file, p);
        const struct sm_curve c = fitted(cases[i].model, p, n);
        char what[64];
        assert_int_equal(c.n_coefficients, cases[i].n);
        for (size_t k = 0; k < c.n_coefficients; k++) {
            const char *name = names[cases[i].first + k];
            snprintf(what, sizeof what, "%s %s", cases[i].set, name);
            check_digits(what, c.coefficient[k].value,
                         reference_value(file, cases[i].set, name, "certified"), 11);
            snprintf(what, sizeof what, "sd_%s", name);
            check_digits(what, c.coefficient[k].standard_error,
                         reference_value(file, cases[i].set, what, "certified"), 11);
            check_digits("variance", c.covariance[k][k], pow(c.coefficient[k].standard_error, 2),
                         14);
        }
        check_digits("residual SD", c.residual_sd,
                     reference_value(file, cases[i].set, "residual_sd", "certified"), 11);
        check_digits("R squared", c.r_squared,
                     reference_value(file, cases[i].set, "r_squared", "certified"), 13);
        check_close("dof", (double)c.dof, reference_value(file, cases[i].set, "df", "certified"),
                    0);
    }
}

/* Exact covariance: reference README, trap (b) of the NIST sets, there recomputed in exact
 * fractions. */
static void the_covariance_of_norris_is_the_exact_one(void **state)
{
    struct sm_point p[SM_POINTS_MAX];
    const size_t n = load("nist_norris.csv", p);
    const struct sm_curve c = fitted(SM_MODEL_LINE, p, n);

    (void)state;
    check_digits("covariance", c.covariance[0][1],
                 reference_value("nist_certified.csv", "norris", "cov_B0_B1", "recomputed"), 11);
    assert_true(c.covariance[0][1] == c.covariance[1][0]);
    assert_int_equal(c.levels, 35); /* 36 points, of which 0.3 twice */
}

/* Miller and Miller, Statistics and Chemometrics for Analytical Chemistry, chapter 5: fluorescein.
 */
static void fluorescein_reads_back_with_the_textbook_uncertainty(void **state)
{
    static const struct {
        double y;
        unsigned m;
        const char *x, *u;
    } cases[] = { { 2.9, 1, "x0(y0=2.9)", "s_x0(y0=2.9; m=1)" },
                  { 2.9, 4, "x0(y0=2.9)", "s_x0(y0=2.9; m=4)" },
                  { 13.5, 1, "x0(y0=13.5)", "s_x0(y0=13.5; m=1)" },
                  { 13.5, 6, "x0(y0=13.5) as read", "s_x0(y0=13.5; m=6) as read" },
                  { 23.0, 1, "x0(y0=23.0)", "s_x0(y0=23.0; m=1)" },
                  { 23.0, 4, "x0(y0=23.0)", "s_x0(y0=23.0; m=4)" } };
    static const char *const quantities[] = { "intercept", "slope",       "sd_intercept",
                                              "sd_slope",  "residual_sd", "r_squared" };
    const char *const file = "cal_results.csv", *const set = "fluorescein";
    struct sm_point p[SM_POINTS_MAX];
    const size_t n = load("cal_fluorescein.csv", p);
    const struct sm_curve c = fitted(SM_MODEL_LINE, p, n);
    const double got[] = {
        c.coefficient[0].value,          c.coefficient[1].value, c.coefficient[0].standard_error,
        c.coefficient[1].standard_error, c.residual_sd,          c.r_squared
    };

    (void)state;
    for (size_t i = 0; i < COUNT(got); i++)
        check_digits(quantities[i], got[i], reference_value(file, set, quantities[i], "recomputed"),
                     12);
    check_close("slope as published", got[1], reference_value(file, set, "slope", "published"),
                5e-5);
    check_close("intercept as published", got[0],
                reference_value(file, set, "intercept", "published"), 5e-5);
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_read_off r;
        assert_int_equal(sm_curve_read(&c, cases[i].y, cases[i].m, 0, &r), SM_OK);
        check_digits(cases[i].x, r.x, reference_value(file, set, cases[i].x, "recomputed"), 12);
        check_digits(cases[i].u, r.standard_uncertainty,
                     reference_value(file, set, cases[i].u, "recomputed"), 12);
        check_close("as published", r.standard_uncertainty,
                    reference_value(file, set, cases[i].u, "published"), 5.1e-3);
        assert_true(r.between_standards);
        const double reading = c.residual_sd / c.coefficient[1].value;
        check_digits("curve and reading together",
                     pow(r.curve_uncertainty, 2) + reading * reading / cases[i].m,
                     pow(r.standard_uncertainty, 2), 13);
    }
}

/* DIN 38402-51 examples B.1 (572 against 10.6) and B.6; fluorescein, and the same where it bends.
 */
static void mandels_test_gives_the_recomputed_statistic(void **state)
{
    static const struct {
        const char *file, *set, *limit;
        bool pass;
    } cases[] = {
        { "cal_din38402_b1.csv", "din38402_b1", "F(0.99;1;9)", false },
        { "cal_din38402_b6.csv", "din38402_b6", "F(0.99;1;9)", false },
        { "cal_fluorescein.csv", "fluorescein", "F(0.99;1;4)", true },
        { "cal_fluorescein_extended.csv", "fluorescein_extended", "F(0.99;1;8)", false },
    };
    const char *const file = "cal_results.csv";

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_point p[SM_POINTS_MAX];
        struct sm_linearity l;
        const size_t n = load(cases[i].file, p);
        sm_curve_linearity(SM_MODEL_LINE, p, n, 7, &l);
        assert_true(l.has);
        check_digits(cases[i].set, l.statistic,
                     reference_value(file, cases[i].set, "mandel_test_value", "recomputed"), 10);
        check_digits(cases[i].limit, l.critical,
                     reference_value(file, cases[i].set, cases[i].limit, "recomputed"), 10);
        assert_int_equal(l.pass, cases[i].pass);
        assert_int_equal(l.p > 0.01, cases[i].pass);
    }
}

static void the_quadratic_of_din_38402_b1_is_the_recomputed_one(void **state)
{
    static const double want[] = { 0.000847713108866, 0.00669148572613, 1.65839565804e-5 };
    struct sm_point p[SM_POINTS_MAX];
    const size_t n = load("cal_din38402_b1.csv", p);
    const struct sm_curve c = fitted(SM_MODEL_QUADRATIC, p, n);
    char text[REFERENCE_LINE];

    (void)state;
    reference_text("cal_results.csv", "din38402_b1", "quadratic c0 c1 c2", "recomputed", text);
    assert_string_equal(text, "0.000847713108866 0.00669148572613 1.65839565804e-5");
    for (size_t k = 0; k < 3; k++)
        check_digits("c", c.coefficient[k].value, want[k], 11);
    check_digits(
        "residual SD", c.residual_sd,
        reference_value("cal_results.csv", "din38402_b1", "quadratic_residual_sd", "recomputed"),
        11);
}

static void quantiles_of_t_and_f_agree_with_the_tables(void **state)
{
    double df[64], unused[64];
    const size_t n = reference_pairs("t_critical.csv", 64, df, unused);

    (void)state;
    assert_true(n > 30);
    for (size_t i = 0; i < n; i++) {
        char row[16];
        snprintf(row, sizeof row, "%.0f", df[i]);
        check_digits(row, sm_t95((size_t)df[i]),
                     reference_value("t_critical.csv", row, NULL, "p0.975"), 10);
    }
    for (size_t nu = 1; nu <= 20; nu++) { /* the limit that Mandel's test uses */
        struct sm_point p[SM_POINTS_MAX];
        struct sm_linearity l;
        char row[16];
        for (size_t i = 0; i < nu + 3; i++)
            p[i] = (struct sm_point){ (double)i, (double)i + (i % 3 == 1 ? 0.01 : 0), 0 };
        sm_curve_linearity(SM_MODEL_LINE, p, nu + 3, 7, &l);
        snprintf(row, sizeof row, "%zu", nu);
        check_digits(row, l.critical, reference_value("f_critical.csv", "0.99", row, "nu1_1"), 9);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_nernst_slope_agrees_with_the_recomputed_table),
        cmocka_unit_test(nist_certified_values_come_back_to_eleven_digits),
        cmocka_unit_test(the_covariance_of_norris_is_the_exact_one),
        cmocka_unit_test(fluorescein_reads_back_with_the_textbook_uncertainty),
        cmocka_unit_test(mandels_test_gives_the_recomputed_statistic),
        cmocka_unit_test(the_quadratic_of_din_38402_b1_is_the_recomputed_one),
        cmocka_unit_test(quantiles_of_t_and_f_agree_with_the_tables),
    };
    gsl_set_error_handler_off();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
