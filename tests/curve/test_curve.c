/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_curve.c: models, electrodes, readings, and what is refused. Published values:
 * test_published.c. */
#include "curve/curve.h"

#include <math.h>
#include <string.h>

#include <gsl/gsl_errno.h>

#include "check.h"

static struct sm_curve fitted(enum sm_model m, const struct sm_point *p, size_t n)
{
    struct sm_curve c;
    const enum sm_status status = sm_curve_fit(m, p, n, 7, &c);

    if (status != SM_OK)
        fail_msg("fit of %s to %zu points: status %d", sm_model_name(m), n, status);
    return c;
}

static void every_model_is_known_by_its_name(void **state)
{
    enum sm_model got = SM_MODEL_COUNT;

    (void)state;
    for (size_t i = 0; i < SM_MODEL_COUNT; i++) {
        assert_true(sm_model_known(sm_model_name((enum sm_model)i), &got));
        assert_int_equal(got, i);
    }
    assert_false(sm_model_known("cubic", &got));
    assert_int_equal(got, SM_MODEL_COUNT - 1);
    assert_string_equal(sm_model_name(SM_MODEL_LOG_LINE), "log-line");
    assert_true(sm_model_built(SM_MODEL_NERNST));
    assert_false(sm_model_built(SM_MODEL_LOG_OFFSET));
    assert_false(sm_model_built(SM_MODEL_COUNT));
    assert_int_equal(sm_model_coefficients(SM_MODEL_QUADRATIC), 3);
    assert_int_equal(sm_model_coefficients(SM_MODEL_PROPORTIONAL), 1);
}

/* Electrode: E = Eiso - s kN(t) (pH - pHiso), made here with s = 0.975, Eiso = 11 mV, pHiso = 6.8.
 */
static const struct sm_curve *electrode(void)
{
    static struct sm_curve c;
    static const double ph[] = { 1.68, 4.0, 6.88, 9.22, 10.07 },
                        t_c[] = { 18.2, 21.9, 20, 24.5, 19.4 };
    struct sm_point p[5];

    for (size_t i = 0; i < 5; i++)
        p[i] =
            (struct sm_point){ ph[i], 11 - 0.975 * sm_nernst_mv(t_c[i]) * (ph[i] - 6.8), t_c[i] };
    assert_int_equal(sm_curve_fit(SM_MODEL_NERNST, p, 5, 6.8, &c), SM_OK);
    return &c;
}

static void an_electrode_at_several_temperatures_is_found_again(void **state)
{
    const struct sm_curve *c = electrode();
    const double k = sm_nernst_mv(20.8);

    (void)state;
    check_close("s", c->slope_fraction, 0.975, 1e-13);
    check_close("Eiso", c->e_iso, 11, 1e-11);
    check_close("mean temperature", c->t_c, 20.8, 1e-12);
    check_close("slope", c->coefficient[1].value, -0.975 * k, 1e-11);
    check_close("intercept", c->coefficient[0].value, 11 + 0.975 * k * 6.8, 1e-10);
    check_close("offset", c->offset_mv, 11 - 0.975 * k * 0.2, 1e-10);
    check_close("zero point", c->zero_point, 6.8 + 11 / (0.975 * k), 1e-12);
    check_close("R squared", c->r_squared, 1, 1e-14);
    assert_int_equal(c->levels, 5);
    assert_string_equal(c->coefficient[0].name, "intercept");
    assert_string_equal(c->coefficient[1].name, "slope");
}

static void a_sample_is_read_at_its_own_temperature(void **state)
{
    static const struct {
        double ph, t_c;
        bool between;
    } cases[] = { { 8.12, 10.8, true }, { 6.8, 35, true },    { 1.7, 20.8, true },
                  { 10.05, 5, true },   { 1.0, 20.8, false }, { 12, 25, false } };
    const struct sm_curve *c = electrode();
    struct sm_read_off r;

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const double mv = 11 - 0.975 * sm_nernst_mv(cases[i].t_c) * (cases[i].ph - 6.8);
        check_close("mV", sm_curve_y(c, cases[i].ph, cases[i].t_c), mv, 1e-10);
        assert_int_equal(sm_curve_read(c, mv, 1, cases[i].t_c, &r), SM_OK);
        check_close("pH", r.x, cases[i].ph, 1e-12);
        assert_int_equal(r.between_standards, cases[i].between);
    }
    assert_int_equal(sm_curve_read(c, 0, 1, NAN, &r), SM_EVALUE);
    assert_int_equal(sm_curve_read(c, 0, 1, -300, &r), SM_EVALUE);
}

/* One mV is another pH at another temperature: pHiso + kN(t1) / kN(t2) times as far from pHiso, and
 * as uncertain. */
static void uncertainty_follows_the_temperature_of_the_sample(void **state)
{
    const struct sm_point p[] = { { 1.68, 305.2, 20 },
                                  { 4, 171.9, 20 },
                                  { 6.88, 8.1, 20 },
                                  { 9.22, -127.3, 20 },
                                  { 10.07, -177.4, 20 } };
    const struct sm_curve c = fitted(SM_MODEL_NERNST, p, COUNT(p));

    (void)state;
    for (double t_c = 5; t_c < 36; t_c += 7.5) {
        const double ratio = sm_nernst_mv(20) / sm_nernst_mv(t_c);
        struct sm_read_off at_20, at_t;
        assert_int_equal(sm_curve_read(&c, -60, 2, 20, &at_20), SM_OK);
        assert_int_equal(sm_curve_read(&c, -60, 2, t_c, &at_t), SM_OK);
        check_close("pH", at_t.x - 7, (at_20.x - 7) * ratio, 1e-13);
        check_digits("u", at_t.standard_uncertainty, at_20.standard_uncertainty * ratio, 13);
        check_digits("u of the curve", at_t.curve_uncertainty, at_20.curve_uncertainty * ratio, 13);
    }
}

/* Where all temperatures are alike nernst is the plain line, whatever the isopotential point. */
static void at_one_temperature_nernst_is_the_plain_line(void **state)
{
    struct sm_point p[] = { { 1.68, 305.2, 20 },  { 4, 171.9, 20 },      { 6.88, 8.1, 20 },
                            { 9.22, -127.3, 20 }, { 10.07, -177.4, 20 }, { 4, 172.6, 20 } };
    const struct sm_curve line = fitted(SM_MODEL_LINE, p, COUNT(p));
    struct sm_linearity l, ln;

    (void)state;
    sm_curve_linearity(SM_MODEL_LINE, p, COUNT(p), 7, &l);
    for (double iso = 6.5; iso < 7.6; iso += 0.5) {
        struct sm_curve c;
        struct sm_read_off want, got;
        assert_int_equal(sm_curve_fit(SM_MODEL_NERNST, p, COUNT(p), iso, &c), SM_OK);
        for (size_t i = 0; i < 2; i++) {
            check_digits("coefficient", c.coefficient[i].value, line.coefficient[i].value, 12);
            check_digits("standard error", c.coefficient[i].standard_error,
                         line.coefficient[i].standard_error, 11);
            for (size_t j = 0; j < 2; j++)
                check_digits("covariance", c.covariance[i][j], line.covariance[i][j], 11);
        }
        check_digits("residual SD", c.residual_sd, line.residual_sd, 11);
        check_digits("R squared", c.r_squared, line.r_squared, 14);
        check_digits("Sxx", c.sxx, line.sxx, 13);
        check_digits("mean x", c.x_mean, line.x_mean, 13);
        assert_int_equal(c.levels, 5);
        for (double mv = -170; mv < 300; mv += 31.7) {
            assert_int_equal(sm_curve_read(&line, mv, 3, 0, &want), SM_OK);
            assert_int_equal(sm_curve_read(&c, mv, 3, 20, &got), SM_OK);
            check_digits("pH", got.x, want.x, 12);
            check_digits("u", got.standard_uncertainty, want.standard_uncertainty, 11);
            check_digits("u of the curve", got.curve_uncertainty, want.curve_uncertainty, 10);
        }
        sm_curve_linearity(SM_MODEL_NERNST, p, COUNT(p), iso, &ln);
        assert_true(l.has && ln.has);
        check_digits("Mandel", ln.statistic, l.statistic, 8);
    }
}

/* 1, 2 … 6 in y = 1 + 6 x - x^2 / 2, which turns at x = 6, and with more bend inside the standards.
 */
static void a_quadratic_gives_only_an_x_that_is_the_one(void **state)
{
    static const struct {
        const char *name;
        double bend, y, x; /* y = 1 + 6 x - bend x^2 */
        enum sm_status status;
        bool between;
    } cases[] = {
        { "between the standards", 0.5, 14.5, 3, SM_OK, true },
        { "at the lowest, nearly", 0.5, 6.5001, 1.00002000004, SM_OK, true },
        { "below the lowest", 0.5, 1, 0, SM_OK, false },
        { "over the top", 0.5, 19.5, 0, SM_EVALUE, false },
        { "two between the standards", 1, 9.0, 0, SM_EVALUE, false },
        { "one between, its twin beyond", 0.75, 10, 2, SM_OK, true },
        { "one either side, both beyond", 1, -6, 0, SM_EVALUE, false },
        { "bending upwards", -0.5, 23.5, 3, SM_OK, true },
        { "bending upwards, above", -0.5, 61.5, 6.529964086141668, SM_OK, false },
        { "never so low", -0.5, -100, 0, SM_EVALUE, false },
        { "not a number", 0.5, NAN, 0, SM_EVALUE, false },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_point p[5];
        for (size_t k = 0; k < 5; k++) {
            const double x = 1 + (double)k; /* 1 … 5 */
            p[k] = (struct sm_point){ x, 1 + 6 * x - cases[i].bend * x * x, 0 };
        }
        const struct sm_curve c = fitted(SM_MODEL_QUADRATIC, p, 5);
        struct sm_read_off r = { .x = 99 };
        const enum sm_status got = sm_curve_read(&c, cases[i].y, 1, 0, &r);
        if (got != cases[i].status)
            fail_msg("%s: status %d, want %d (x %g)", cases[i].name, got, cases[i].status, r.x);
        if (got != SM_OK) {
            check_close("untouched", r.x, 99, 0);
            continue;
        }
        check_close(cases[i].name, r.x, cases[i].x, 1e-10);
        assert_int_equal(r.between_standards, cases[i].between);
    }
}

static void what_cannot_be_fitted_is_refused_and_changes_nothing(void **state)
{
    static struct sm_point many[SM_FIT_POINTS_MAX + 1];
    static const struct {
        const char *name;
        enum sm_model model;
        struct sm_point p[6];
        size_t n;
        enum sm_status want;
    } cases[] = {
        { "no points", SM_MODEL_LINE, { { 0, 0, 0 } }, 0, SM_ESHORT },
        { "two for a line", SM_MODEL_LINE, { { 1, 1, 0 }, { 2, 3, 0 } }, 2, SM_ESHORT },
        { "two levels for a line",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 1, 1.1, 0 }, { 2, 3.1, 0 } },
          4,
          SM_ESHORT },
        { "three levels for a quadratic",
          SM_MODEL_QUADRATIC,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4, 0 }, { 3, 4.2, 0 } },
          4,
          SM_ESHORT },
        { "one level through zero",
          SM_MODEL_PROPORTIONAL,
          { { 2, 1, 0 }, { 2, 1.1, 0 }, { 2, 1.2, 0 } },
          3,
          SM_ESHORT },
        { "x not a number",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { NAN, 3, 0 }, { 3, 4, 0 } },
          3,
          SM_EVALUE },
        { "y infinite",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, INFINITY, 0 }, { 3, 4, 0 } },
          3,
          SM_EVALUE },
        { "x beyond a double's range",
          SM_MODEL_LINE,
          { { -1.7e308, 1, 0 }, { 1.7e308, 2, 0 }, { 1.6e308, 4, 0 } },
          3,
          SM_EVALUE },
        { "temperature not known",
          SM_MODEL_NERNST,
          { { 4, 171, 20 }, { 7, 1, NAN }, { 10, -170, 20 } },
          3,
          SM_EVALUE },
        { "below absolute zero",
          SM_MODEL_NERNST,
          { { 4, 171, 20 }, { 7, 1, -274 }, { 10, -170, 20 } },
          3,
          SM_EVALUE },
        { "not built", SM_MODEL_LOG_LINE, { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4, 0 } }, 3, SM_EINVAL },
        { "no model", SM_MODEL_COUNT, { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4, 0 } }, 3, SM_EINVAL },
    };
    struct sm_curve c, before;

    (void)state;
    memset(&before, 0x5a, sizeof before);
    for (size_t i = 0; i < COUNT(cases); i++) {
        memcpy(&c, &before, sizeof c);
        const enum sm_status got = sm_curve_fit(cases[i].model, cases[i].p, cases[i].n, 7, &c);
        if (got != cases[i].want || memcmp(&c, &before, sizeof c) != 0)
            fail_msg("%s: status %d, want %d", cases[i].name, got, cases[i].want);
    }
    assert_int_equal(sm_curve_fit(SM_MODEL_LINE, many, COUNT(many), 7, &c), SM_EFULL);
    assert_int_equal(sm_curve_fit(SM_MODEL_NERNST, cases[8].p, 3, NAN, &c), SM_EINVAL);
}

static void equal_readings_give_a_flat_line_that_reads_nothing(void **state)
{
    const struct sm_point p[] = {
        { 0.1, 0.3, 20 }, { 0.2, 0.3, 20 }, { 0.7, 0.3, 20 }, { 1.9, 0.3, 20 }
    };
    const struct sm_curve c = fitted(SM_MODEL_LINE, p, COUNT(p));
    const struct sm_curve e = fitted(SM_MODEL_NERNST, p, COUNT(p));
    struct sm_read_off r;
    struct sm_linearity l;

    (void)state;
    assert_true(c.coefficient[1].value == 0);
    check_close("intercept", c.coefficient[0].value, 0.3, 1e-15);
    assert_true(isnan(c.r_squared)); /* unknown, not 0 */
    assert_true(isnan(e.zero_point));
    assert_int_equal(sm_curve_read(&c, 0.3, 1, 0, &r), SM_EVALUE);
    assert_int_equal(sm_curve_read(&e, 0.3, 1, 20, &r), SM_EVALUE);
    sm_curve_linearity(SM_MODEL_LINE, p, COUNT(p), 7, &l);
    assert_false(l.has);
    for (size_t n = 3; n < SM_POINTS_MAX;
         n++) { /* sums of 0.1 round, the slope is 0 all the same */
        struct sm_point many[SM_POINTS_MAX];
        for (size_t i = 0; i < n; i++)
            many[i] = (struct sm_point){ (double)i, 0.1, 0 };
        const struct sm_curve flat = fitted(SM_MODEL_LINE, many, n);
        if (flat.coefficient[1].value != 0 || !isnan(flat.r_squared))
            fail_msg("%zu points: slope %g, R squared %g", n, flat.coefficient[1].value,
                     flat.r_squared);
    }
}

static void linearity_is_left_out_where_it_cannot_be_computed(void **state)
{
    static const struct {
        const char *name;
        enum sm_model model;
        struct sm_point p[6];
        size_t n;
        bool has, pass;
    } cases[] = {
        { "three points",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4, 0 } },
          3,
          false,
          false },
        { "two levels",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 1, 1.1, 0 }, { 2, 3.1, 0 } },
          4,
          false,
          false },
        { "three levels, one twice",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4.5, 0 }, { 3, 4.6, 0 } },
          4,
          true,
          true },
        { "on the line to the last digit",
          SM_MODEL_LINE,
          { { 0.1, 0.3, 0 }, { 0.2, 0.6, 0 }, { 0.3, 0.9, 0 }, { 0.7, 2.1, 0 } },
          4,
          false,
          false },
        { "on a parabola to the last digit",
          SM_MODEL_LINE,
          { { 1, 1, 0 }, { 2, 4, 0 }, { 3, 9, 0 }, { 4, 16, 0 }, { 5, 25, 0 } },
          5,
          true,
          false },
        { "another model",
          SM_MODEL_PROPORTIONAL,
          { { 1, 1, 0 }, { 2, 3, 0 }, { 3, 4, 0 }, { 4, 6, 0 } },
          4,
          false,
          false },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_linearity l;
        sm_curve_linearity(cases[i].model, cases[i].p, cases[i].n, 7, &l);
        if (l.has != cases[i].has || l.pass != cases[i].pass)
            fail_msg("%s: has %d pass %d (statistic %g)", cases[i].name, l.has, l.pass,
                     l.statistic);
        assert_string_equal(l.test, "mandel");
        if (!(l.statistic < 1e28)) /* rounding of y alone makes 1e-13 of residual SD */
            fail_msg("%s: a statistic of %g is more than the digits hold", cases[i].name,
                     l.statistic);
    }
}

static void levels_count_distinct_values_whatever_their_order(void **state)
{
    static struct sm_point many[SM_FIT_POINTS_MAX];
    const struct sm_point p[] = {
        { 4, 0, 0 }, { 7, 0, 0 }, { 4, 1, 0 }, { -0.0, 0, 0 }, { 0.0, 0, 0 }
    };

    (void)state;
    assert_int_equal(sm_curve_levels(p, COUNT(p)), 3);
    assert_int_equal(sm_curve_levels(p, 0), 0);
    for (size_t i = 0; i < COUNT(many); i++)
        many[i].x = (double)((i * 7919) % 5003);
    assert_int_equal(sm_curve_levels(many, COUNT(many)), 5003);
}

static void replicates_of_no_reading_are_refused(void **state)
{
    struct sm_read_off r;

    (void)state;
    assert_int_equal(sm_curve_read(electrode(), 1, 0, 20, &r), SM_EINVAL);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_model_is_known_by_its_name),
        cmocka_unit_test(an_electrode_at_several_temperatures_is_found_again),
        cmocka_unit_test(a_sample_is_read_at_its_own_temperature),
        cmocka_unit_test(uncertainty_follows_the_temperature_of_the_sample),
        cmocka_unit_test(at_one_temperature_nernst_is_the_plain_line),
        cmocka_unit_test(a_quadratic_gives_only_an_x_that_is_the_one),
        cmocka_unit_test(what_cannot_be_fitted_is_refused_and_changes_nothing),
        cmocka_unit_test(equal_readings_give_a_flat_line_that_reads_nothing),
        cmocka_unit_test(linearity_is_left_out_where_it_cannot_be_computed),
        cmocka_unit_test(levels_count_distinct_values_whatever_their_order),
        cmocka_unit_test(replicates_of_no_reading_are_refused),
    };
    gsl_set_error_handler_off();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
