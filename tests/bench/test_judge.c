/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Judging a curve and results off it. The session's figures are invented; they are arithmetically
 * those of a glass electrode at 20.0 °C (Nernst slope 58.1672 mV, SI 2019). */
#include "check.h"

#include <math.h>
#include <string.h>

#include "bench/judge.h"
#include "bench/result.h"

static struct sm_method method;
static struct sm_point good[5];

static int begin(void **state)
{
    static const double x[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };
    static const double y[] = { 308.6, 176.3, 10.8, -123.2, -172.5 };

    (void)state;
    memset(&method, 0, sizeof method);
    method.measures = SM_UNIT_PH;
    method.model = SM_MODEL_NERNST;
    method.ph_iso = 7;
    method.levels = 5;
    method.r_squared = (struct sm_limit){ true, 0.990 };
    method.residual_sd = (struct sm_limit){ true, 1.2 };
    method.slope.from = (struct sm_limit){ true, 90 };
    method.slope.to = (struct sm_limit){ true, 105 };
    method.offset.from = (struct sm_limit){ true, -30 };
    method.offset.to = (struct sm_limit){ true, 30 };
    method.back_calculated = (struct sm_limit){ true, 0.05 };
    method.check = (struct sm_limit){ true, 0.1 };
    for (size_t i = 0; i < 5; i++)
        good[i] = (struct sm_point){ x[i], y[i], 20.0 };
    return 0;
}

static const struct sm_judged *find(const struct sm_judgement *j, const char *quantity)
{
    for (size_t i = 0; i < j->n; i++) {
        if (strcmp(j->judged[i].quantity, quantity) == 0)
            return &j->judged[i];
    }
    fail_msg("%s was not judged", quantity);
    return NULL;
}

static void a_good_curve_is_accepted_with_r_squared_last(void **state)
{
    struct sm_judgement j;

    (void)state;
    sm_judge_curve(&method, good, 5, &j);
    for (size_t i = 0; i < j.n; i++) {
        if (!j.judged[i].pass)
            fail_msg("%s failed: %s", j.judged[i].quantity, j.judged[i].text);
    }
    assert_true(j.accepted);
    assert_string_equal(j.judged[j.n - 1].quantity, "r_squared");
    /* the figures of the good day: slope 98.6 %, offset +3.9 mV, residual SD 0.38 mV */
    check_close("slope, %", find(&j, "slope")->value, 98.6, 0.05);
    check_close("offset, mV", find(&j, "offset")->value, 3.9, 0.05);
    check_close("residual SD, mV", find(&j, "residual_sd")->value, 0.38, 0.005);
}

static void an_old_buffer_is_refused_although_slope_and_r_squared_pass(void **state)
{
    struct sm_judgement j;

    (void)state;
    good[4].y = -164.0;
    sm_judge_curve(&method, good, 5, &j);
    assert_false(j.accepted);
    assert_true(find(&j, "slope")->pass);
    assert_true(find(&j, "r_squared")->pass);
    assert_false(find(&j, "residual_sd")->pass);
    assert_false(find(&j, "back_calculated")->pass);
    check_close("residual SD, mV", find(&j, "residual_sd")->value, 3.3, 0.05);
}

static void four_levels_are_refused_where_five_are_needed(void **state)
{
    struct sm_judgement j;

    (void)state;
    sm_judge_curve(&method, good, 4, &j);
    assert_false(j.accepted);
    assert_true(j.fitted);
    assert_false(find(&j, "levels")->pass);
    good[4] = good[3]; /* one more capture of the same standard adds no level */
    sm_judge_curve(&method, good, 5, &j);
    assert_false(j.accepted);
}

static void no_standards_at_all_is_a_refusal_and_no_number(void **state)
{
    struct sm_judgement j;

    (void)state;
    sm_judge_curve(&method, good, 0, &j);
    assert_false(j.accepted);
    assert_false(j.fitted);
}

static void a_result_is_compensated_to_its_own_temperature(void **state)
{
    struct sm_judgement j;
    struct sm_made_result r;

    (void)state;
    sm_judge_curve(&method, good, 5, &j);
    sm_result_make(&method, &j.curve, -58.3, 0.4, true, 10.8, 0.01, &r);
    assert_true(r.has_value);
    assert_false(r.held);
    check_close("final water at 10.8 °C, pH", r.value, 8.12, 0.005);
    sm_result_make(&method, &j.curve, -58.3, 0.4, true, 20.0, 0.01, &r);
    check_close("the same without compensation, pH", r.value, 8.085, 0.003);
    assert_true(r.u95 > 0.4 / 58.2);
}

static void outside_the_standards_there_is_no_number(void **state)
{
    struct sm_judgement j;
    struct sm_made_result r;

    (void)state;
    sm_judge_curve(&method, good, 5, &j);
    sm_result_make(&method, &j.curve, -267.2, 0.4, true, 12.0, 0.01, &r);
    assert_false(r.has_value);
    assert_true(r.held);
    assert_string_equal(r.shown, "> 10.07");
    sm_result_make(&method, &j.curve, 350.0, 0.4, true, 20.0, 0.01, &r);
    assert_false(r.has_value);
    assert_true(r.held);
    assert_string_equal(r.shown, "< 1.68");
    method.measures = SM_UNIT_MG_L; /* a concentration below the lowest standard is a result */
    sm_result_make(&method, &j.curve, 350.0, 0.4, true, 20.0, 0.01, &r);
    assert_false(r.has_value);
    assert_false(r.held);
}

static void a_temperature_that_nobody_knows_holds_the_result(void **state)
{
    struct sm_judgement j;
    struct sm_made_result r;

    (void)state;
    sm_judge_curve(&method, good, 5, &j);
    sm_result_make(&method, &j.curve, -58.3, 0.4, false, 0, 0.01, &r);
    assert_false(r.has_value);
    assert_true(r.held);
}

static void a_check_is_judged_before_rounding(void **state)
{
    char why[SM_REASON_SIZE];

    (void)state;
    assert_true(sm_judge_check(&method, 7.0, 7.0999, why));
    assert_false(sm_judge_check(&method, 7.0, 7.1001, why));
    assert_false(sm_judge_check(&method, 7.0, 6.8999, why));
    assert_false(sm_judge_check(&method, 7.0, (double)NAN, why));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup(a_good_curve_is_accepted_with_r_squared_last, begin),
        cmocka_unit_test_setup(an_old_buffer_is_refused_although_slope_and_r_squared_pass, begin),
        cmocka_unit_test_setup(four_levels_are_refused_where_five_are_needed, begin),
        cmocka_unit_test_setup(no_standards_at_all_is_a_refusal_and_no_number, begin),
        cmocka_unit_test_setup(a_result_is_compensated_to_its_own_temperature, begin),
        cmocka_unit_test_setup(outside_the_standards_there_is_no_number, begin),
        cmocka_unit_test_setup(a_temperature_that_nobody_knows_holds_the_result, begin),
        cmocka_unit_test_setup(a_check_is_judged_before_rounding, begin),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
