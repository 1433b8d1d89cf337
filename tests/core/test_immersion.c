/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whose capture it is, where that is not certain: given to nobody, asked about, and then only a
 * mark goes on. Each of these once gave a beaker's value to another item. */
#include "bench_day.h"

#include <string.h>

static struct day day;

static int begin(void **state)
{
    (void)state;
    day_setup(&day);
    day_usual_sheet(&day);
    day_start(&day, true);
    return 0;
}

static int end(void **state)
{
    (void)state;
    day_stop(&day);
    return 0;
}

static void expect_item(size_t item)
{
    const struct day_kept *c = day_last(&day, SM_EVENT_CAPTURE);

    if (c->has_where != (item > 0) || c->item != item)
        fail_msg("capture given to item %zu, want %zu", c->has_where ? c->item : 0, item);
}

/* 5 s in a solution whose value creeps too fast to settle. */
static void unsettled(double mv)
{
    for (int i = 0; i < 50; i++)
        day_in(&day, mv - 0.06 * i, 0.1);
}

/* The probe is in `mv` for long enough, and only a mark gives it to `item`. */
static void wants_a_mark(double mv, size_t item)
{
    day_move(&day, mv, 6);
    expect_item(0);
    day_act(&day, SM_ACT_NEXT, "");
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
    day_in(&day, mv, 6);
    expect_item(item);
}

static void a_beaker_reached_in_one_step_does_not_shift_the_sheet(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 6);
    day_in(&day, day_mv(4.00), 8); /* from beaker to beaker: no transit was seen */
    expect_item(0);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    wants_a_mark(day_mv(6.88), 2); /* whatever it is: the person says so */
}

static void a_beaker_left_unsettled_after_a_changed_value_does_not_shift_the_sheet(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 6);
    unsettled(day_mv(4.00)); /* straight on, in one step */
    wants_a_mark(day_mv(6.88), 2);
}

static void killed_in_the_first_beaker_it_is_not_the_second_that_is_the_first_item(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 2); /* nothing was captured ever */
    day_restart(&day, 60);
    day_in(&day, day_mv(1.68), 6);
    expect_item(0);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    wants_a_mark(day_mv(4.00), 1);
}

static void a_file_changed_on_the_way_to_the_first_beaker_is_no_start(void **state)
{
    (void)state;
    day_act(&day, SM_ACT_SHEET, "");
    day_in(&day, day_mv(4.50), 0.1);
    day_open(&day, 2);
    assert_true(sm_core_may_roll(day.core));
    day_roll(&day);
    day_in(&day, day_mv(1.68), 6);
    expect_item(0);
    wants_a_mark(day_mv(4.00), 1);
}

static void a_lost_link_in_the_first_beaker_asks(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 2);
    day_link(&day, false);
    day_link(&day, true);
    day_in(&day, day_mv(1.68), 6);
    expect_item(0);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    wants_a_mark(day_mv(1.68), 1);
}

static void where_the_probe_stood_when_the_sheet_came_is_no_item_and_says_so(void **state)
{
    (void)state;
    day_in(&day, day_mv(4.50), 6);
    expect_item(0);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 0);
    assert_non_null(
        strstr(day_last(&day, SM_EVENT_CAPTURE)->why, "when the sheet was handed over"));
    day_move(&day, day_mv(1.68), 6);
    expect_item(1);
}

static void skipped_too_late_the_probe_may_be_in_either(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 6);
    day_move(&day, day_mv(6.88), 1); /* B4's bottle is broken: straight on to B7 */
    day_act(&day, SM_ACT_SKIP, "broken");
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
    day_in(&day, day_mv(6.88), 6);
    expect_item(0);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    wants_a_mark(day_mv(6.88), 3);
}

static void skipped_in_air_or_in_the_beaker_before_the_next_transit_goes_on(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 6);
    day_act(&day, SM_ACT_SKIP, "broken");
    day_move(&day, day_mv(6.88), 6);
    expect_item(3);
    day_open(&day, 1);
    day_act(&day, SM_ACT_SKIP, "broken");
    day_open(&day, 1);
    day_in(&day, day_mv(10.07), 6);
    expect_item(5);
}

static void next_in_another_beaker_while_an_item_is_open_is_refused(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 0.5);
    unsettled(day_mv(1.68));
    day_act(&day, SM_ACT_NEXT, "");
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
    assert_non_null(strstr(day_last(&day, SM_EVENT_ANSWER)->why, "no capture yet"));
}

static void next_again_after_a_transit_without_a_capture_is_refused(void **state)
{
    (void)state;
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(1.68), 1.5);
    day_move(&day, day_mv(4.00), 1);
    day_act(&day, SM_ACT_NEXT, "");
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
}

static void the_meters_key_does_not_open_an_item_that_was_left_unsettled(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 0.5);
    unsettled(day_mv(1.68));
    day_move(&day, day_mv(4.00), 1);
    day.key = true;
    day_in(&day, day_mv(4.00), 6);
    expect_item(0);
    day_act(&day, SM_ACT_NEXT, ""); /* who says so has seen the question */
    day_in(&day, day_mv(4.00), 6);
    expect_item(1);
}

static void a_mark_a_little_too_early_still_opens_its_item(void **state)
{
    (void)state;
    day_move(&day, day_mv(1.68), 6);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(4.00), 6); /* straight on, in one step */
    expect_item(2);
}

static void a_method_that_wants_marks_opens_nothing_by_a_transit(void **state)
{
    (void)state;
    day.method.marks = SM_MARKS_REQUIRED;
    wants_a_mark(day_mv(1.68), 1);
}

int main(void)
{
#define TEST(name) cmocka_unit_test_setup_teardown(name, begin, end)
    const struct CMUnitTest tests[] = {
        TEST(a_beaker_reached_in_one_step_does_not_shift_the_sheet),
        TEST(a_beaker_left_unsettled_after_a_changed_value_does_not_shift_the_sheet),
        TEST(killed_in_the_first_beaker_it_is_not_the_second_that_is_the_first_item),
        TEST(a_file_changed_on_the_way_to_the_first_beaker_is_no_start),
        TEST(a_lost_link_in_the_first_beaker_asks),
        TEST(where_the_probe_stood_when_the_sheet_came_is_no_item_and_says_so),
        TEST(skipped_too_late_the_probe_may_be_in_either),
        TEST(skipped_in_air_or_in_the_beaker_before_the_next_transit_goes_on),
        TEST(next_in_another_beaker_while_an_item_is_open_is_refused),
        TEST(next_again_after_a_transit_without_a_capture_is_refused),
        TEST(the_meters_key_does_not_open_an_item_that_was_left_unsettled),
        TEST(a_mark_a_little_too_early_still_opens_its_item),
        TEST(a_method_that_wants_marks_opens_nothing_by_a_transit),
    };
#undef TEST
    return cmocka_run_group_tests(tests, NULL, NULL);
}
