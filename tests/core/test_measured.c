/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What captures become: rows of standards with gaps, curves of other methods, sets of checks, what
 * a new row and a new sheet hold. */
#include "bench_day.h"

#include <math.h>
#include <string.h>

static struct day day;
static struct sm_method methods[2];
static struct sm_event_check checked; /* the last check, whole */
static struct sm_event_curve curve;   /* the last curve, whole */

static void look(void *arg, const struct sm_event *e)
{
    (void)arg;
    if (e->kind == SM_EVENT_CHECK)
        checked = e->u.check;
    if (e->kind == SM_EVENT_CURVE)
        curve = e->u.curve;
}

static int begin(void **state)
{
    (void)state;
    day_setup(&day);
    day.look = look;
    memset(&checked, 0, sizeof checked);
    memset(&curve, 0, sizeof curve);
    return 0;
}

static int end(void **state)
{
    (void)state;
    day_stop(&day);
    return 0;
}

static const double buffers[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };
static const char *const names[] = { "B1", "B4", "B7", "B9", "B10" };

static void put_standards(void)
{
    for (size_t i = 0; i < COUNT(names); i++)
        day_item(&day, SM_ITEM_STANDARD, names[i]);
}

static void measure(double ph)
{
    day_move(&day, day_mv(ph), 6);
}

static void measure_standards(size_t n)
{
    for (size_t i = 0; i < n; i++)
        measure(buffers[i]);
}

static void a_row_whose_last_standard_is_skipped_is_fitted_all_the_same(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_CHECK, "C7");
    day.method.levels = 4;
    day_start(&day, true);
    measure_standards(4);
    day_act(&day, SM_ACT_SKIP, "broken bottle");
    assert_int_equal(day_count(&day, SM_EVENT_CURVE), 1);
    assert_true(day_last(&day, SM_EVENT_CURVE)->good);
    assert_int_equal(day.carried.curve.n, day_last(&day, SM_EVENT_CURVE)->n);
    measure(7.02);
    assert_true(checked.pass);
}

static void points_of_an_unfinished_row_are_no_part_of_the_next_sheets(void **state)
{
    (void)state;
    day_usual_sheet(&day);
    day_start(&day, true);
    measure(1.90); /* B1, and a bad one */
    measure(4.00);
    day_act(&day, SM_ACT_SHEET, "");
    assert_false(day.carried.curve.has);
    day_in(&day, day_mv(4.5), 1);
    measure_standards(5);
    assert_int_equal(curve.n_points, 5);
    assert_true(curve.accepted);
}

static void a_standard_without_a_value_at_its_temperature_is_named(void **state)
{
    (void)state;
    day_usual_sheet(&day);
    day_start(&day, true);
    measure_standards(3);
    day.t_c = 26;
    measure(9.22);
    assert_non_null(strstr(day_last(&day, SM_EVENT_CAPTURE)->why, "not at 26.0"));
    day.t_c = 20;
    measure(10.07);
    assert_int_equal(curve.n_points, 4);
    assert_false(curve.accepted); /* four levels are left, five are needed */
    assert_string_equal(curve.judged[0].quantity, "left_out");
    assert_non_null(strstr(curve.judged[0].text, "item 4, B9"));
    assert_false(curve.judged[0].pass);
    assert_string_equal(curve.judged[curve.n_judged - 1].quantity, "r_squared"); /* shown last */
}

static void enough_levels_without_it_are_a_curve_and_it_is_still_named(void **state)
{
    (void)state;
    day_usual_sheet(&day);
    day.method.levels = 4;
    day_start(&day, true);
    measure_standards(4);
    day.t_c = 26;
    measure(10.07);
    assert_true(curve.accepted);
    assert_string_equal(curve.judged[0].quantity, "left_out");
    assert_true(curve.judged[0].pass);
    check_close("between the standards to", curve.curve.x_to, 9.22, 0);
}

static void a_lot_that_expires_during_the_run_is_not_used_from_then_on(void **state)
{
    (void)state;
    day_usual_sheet(&day);
    day.standards.list[5].has_expires = true; /* the check standard */
    day.standards.list[5].expires_day = day.utc_us / SM_US_PER_DAY;
    day_start(&day, true);
    measure_standards(5);
    measure(7.02);
    assert_true(checked.pass);
    measure(7.34);
    measure(6.41);
    day.utc_us += SM_US_PER_DAY; /* after midnight */
    measure(8.12);
    measure(7.02);
    assert_false(checked.pass || checked.computed);
    assert_non_null(strstr(checked.why, "expired"));
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 0);
}

static void a_check_without_a_limit_or_a_curve_never_passes(void **state)
{
    (void)state;
    day.method.check.has = false;
    day_usual_sheet(&day);
    day_start(&day, true);
    measure_standards(5);
    measure(7.02);
    assert_true(checked.computed && !checked.pass && isnan(checked.within));
    assert_non_null(strstr(checked.why, "no limit"));
    day.sheet.n = 0;
    day.method.check.has = true;
    day_item(&day, SM_ITEM_CHECK, "C7");
    day_act(&day, SM_ACT_SHEET, "");
    day_link(&day, false);
    day.utc_us += INT64_C(9) * 3600 * 1000000;
    day.t_ns += INT64_C(9) * 3600 * SM_NS_PER_S; /* the curve is valid for eight hours */
    day_link(&day, true);
    day_in(&day, day_mv(7.02), 1);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(7.02), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CHECK)->item, 1);
    assert_true(!checked.computed && !checked.pass);
    assert_non_null(strstr(checked.why, "older"));
}

static void a_curve_of_one_method_outlives_a_run_of_another_and_a_change_of_file(void **state)
{
    struct sm_curve before;

    (void)state;
    methods[0] = day.method;
    methods[1] = day.method;
    methods[1].model = SM_MODEL_LINE;
    sm_text_copy(methods[1].name, sizeof methods[1].name, "line");
    day.setup.method = methods;
    day.setup.n_methods = 2;
    put_standards();
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_start(&day, true);
    day.t_c = 20.8; /* so that the mean temperature is not the sample's */
    measure_standards(5);
    before = curve.curve;
    day.sheet.n = 0;
    day.sheet.method = 1;
    day_item(&day, SM_ITEM_SAMPLE, "b");
    day_act(&day, SM_ACT_SHEET, "");
    measure(7.34);
    assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_HELD);
    assert_non_null(strstr(day_last(&day, SM_EVENT_RESULT)->why, "another method"));
    day_roll(&day);
    day.sheet.method = 0;
    day_act(&day, SM_ACT_SHEET, "");
    day.t_c = 10;
    day_in(&day, day_mv(4.5), 1);
    day_move(&day, 3.9 - 0.986 * sm_nernst_mv(10) * 1.34, 6);
    assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_PROVISIONAL);
    check_close("at 10 °C, by the first method", day_last(&day, SM_EVENT_RESULT)->value, 8.34,
                0.02);
    assert_true(before.model == SM_MODEL_NERNST);
}

static void another_sensor_in_the_setup_ends_the_curve_at_the_next_start(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_start(&day, true);
    measure_standards(5);
    sm_text_copy(day.setup.sensor, sizeof day.setup.sensor, "el-15");
    day_restart(&day, 60);
    day_in(&day, day_mv(7.34), 1);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(7.34), 6);
    assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_HELD);
    assert_non_null(strstr(day_last(&day, SM_EVENT_RESULT)->why, "another sensor"));
}

static void checks_that_follow_one_another_release_only_together(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_item(&day, SM_ITEM_CHECK, "C7");
    day_item(&day, SM_ITEM_CHECK, "B4");
    day_item(&day, SM_ITEM_SAMPLE, "b");
    day_item(&day, SM_ITEM_CHECK, "C7");
    day_item(&day, SM_ITEM_CHECK, "B4");
    day_start(&day, true);
    measure_standards(5);
    measure(7.34);
    measure(7.02);
    assert_true(checked.pass);
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 0);
    measure(4.00);
    check_close("released", day_last(&day, SM_EVENT_RELEASE)->value, 1, 0);
    measure(8.12);
    measure(7.02);
    assert_true(checked.pass);
    measure(4.30);
    assert_false(checked.pass);
    check_close("held", day_last(&day, SM_EVENT_HOLD)->value, 1, 0);
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 1);
}

static void a_new_row_of_standards_holds_what_no_check_has_closed(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_SAMPLE, "a");
    put_standards();
    day_item(&day, SM_ITEM_CHECK, "C7");
    day_start(&day, true);
    measure_standards(5);
    measure(7.34);
    measure_standards(5);
    assert_non_null(strstr(day_last(&day, SM_EVENT_HOLD)->why, "anew"));
    measure(7.02);
    assert_true(checked.pass); /* on the new curve: it says nothing about the old one */
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 0);
}

static void blanks_do_not_count_towards_the_next_check(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_BLANK, "water");
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_start(&day, true);
    measure_standards(5);
    measure(6.10);
    assert_int_equal(day.carried.checks.since, 0);
    measure(7.34);
    assert_int_equal(day.carried.checks.since, 1);
}

static void the_oldest_age_there_is_does_no_harm(void **state)
{
    (void)state;
    put_standards();
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_start(&day, true);
    measure_standards(5);
    day.carried.curve.age_ns = INT64_MAX;
    day_restart(&day, 1e9);
    day_in(&day, day_mv(7.34), 1);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(7.34), 6);
    assert_non_null(strstr(day_last(&day, SM_EVENT_RESULT)->why, "older"));
    assert_true(day.carried.curve.age_ns > 0);
}

int main(void)
{
#define TEST(name) cmocka_unit_test_setup_teardown(name, begin, end)
    const struct CMUnitTest tests[] = {
        TEST(a_row_whose_last_standard_is_skipped_is_fitted_all_the_same),
        TEST(points_of_an_unfinished_row_are_no_part_of_the_next_sheets),
        TEST(a_standard_without_a_value_at_its_temperature_is_named),
        TEST(enough_levels_without_it_are_a_curve_and_it_is_still_named),
        TEST(a_lot_that_expires_during_the_run_is_not_used_from_then_on),
        TEST(a_check_without_a_limit_or_a_curve_never_passes),
        TEST(a_curve_of_one_method_outlives_a_run_of_another_and_a_change_of_file),
        TEST(another_sensor_in_the_setup_ends_the_curve_at_the_next_start),
        TEST(checks_that_follow_one_another_release_only_together),
        TEST(a_new_row_of_standards_holds_what_no_check_has_closed),
        TEST(blanks_do_not_count_towards_the_next_check),
        TEST(the_oldest_age_there_is_does_no_harm),
    };
#undef TEST
    return cmocka_run_group_tests(tests, NULL, NULL);
}
