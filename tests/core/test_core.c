/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The core over an invented day at the bench: what is captured, given to which item, computed,
 * released and held; acts; silence, unplugging and a change of file. */
#include "bench_day.h"

#include <string.h>

static struct day day;

static int begin(void **state)
{
    (void)state;
    day_setup(&day);
    day_usual_sheet(&day);
    return 0;
}

static int end(void **state)
{
    (void)state;
    day_stop(&day);
    return 0;
}

static void standards(struct day *d)
{
    static const double ph[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };

    for (size_t i = 0; i < COUNT(ph); i++)
        day_move(d, day_mv(ph[i]), 6);
}

static void without_a_sheet_what_settles_is_captured_and_numbered(void **state)
{
    (void)state;
    day_start(&day, false);
    day_in(&day, 100, 6);
    day_move(&day, -50, 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 2);
    check_close("first, mV", day_nth(&day, SM_EVENT_CAPTURE, 0)->value, 100, 0.3);
    check_close("second, mV", day_nth(&day, SM_EVENT_CAPTURE, 1)->value, -50, 0.3);
    assert_false(day_nth(&day, SM_EVENT_CAPTURE, 1)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 0);
    assert_int_equal(day.carried.captures, 2);
}

static void a_whole_sheet_gives_a_curve_results_and_their_release(void **state)
{
    static const double ph[] = { 7.34, 6.41, 8.12 };

    (void)state;
    day_start(&day, true);
    standards(&day);
    assert_int_equal(day_count(&day, SM_EVENT_CURVE), 1);
    assert_true(day_last(&day, SM_EVENT_CURVE)->good);
    day_move(&day, day_mv(7.02), 6);
    assert_true(day_last(&day, SM_EVENT_CHECK)->good);
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 0);
    for (size_t i = 0; i < COUNT(ph); i++) {
        day_move(&day, day_mv(ph[i]), 6);
        assert_int_equal(day_count(&day, SM_EVENT_RESULT), i + 1);
        check_close("result, pH", day_last(&day, SM_EVENT_RESULT)->value, ph[i], 0.02);
        assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_PROVISIONAL);
        assert_int_equal(day_last(&day, SM_EVENT_RESULT)->item, 7 + i);
    }
    assert_int_equal(day.carried.n_results, 3);
    day_move(&day, day_mv(7.02), 6);
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 1);
    check_close("released", day_last(&day, SM_EVENT_RELEASE)->value, 3, 0);
    assert_int_equal(day.carried.n_results, 0);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 10);
    assert_int_equal(day_count(&day, SM_EVENT_HOLD), 0);
}

static void a_failed_closing_check_holds_what_came_before(void **state)
{
    (void)state;
    day_start(&day, true);
    standards(&day);
    day_move(&day, day_mv(7.02), 6);
    day_move(&day, day_mv(7.34), 6);
    day_move(&day, day_mv(6.41), 6);
    day_move(&day, day_mv(8.12), 6);
    day_move(&day, day_mv(7.02 + 0.15), 6);
    assert_false(day_last(&day, SM_EVENT_CHECK)->good);
    assert_int_equal(day_count(&day, SM_EVENT_RELEASE), 0);
    check_close("held", day_last(&day, SM_EVENT_HOLD)->value, 3, 0);
    assert_int_equal(day.carried.n_results, 3);
    for (size_t i = 0; i < 3; i++)
        assert_int_equal(day.carried.result[i].state, SM_RESULT_HELD);
}

static void a_refused_curve_gives_no_results_and_no_check_passes(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_move(&day, day_mv(4.00), 6);
    day_move(&day, day_mv(6.88), 6);
    day_move(&day, day_mv(9.22), 6);
    day_move(&day, day_mv(9.90), 6); /* an old buffer in place of 10.07 */
    assert_false(day_last(&day, SM_EVENT_CURVE)->good);
    day_move(&day, day_mv(7.02), 6);
    assert_false(day_last(&day, SM_EVENT_CHECK)->good);
    day_move(&day, day_mv(7.34), 6);
    assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_HELD);
    assert_false(day_last(&day, SM_EVENT_RESULT)->good);
}

static void above_the_highest_standard_there_is_no_number(void **state)
{
    (void)state;
    day_start(&day, true);
    standards(&day);
    day_move(&day, day_mv(7.02), 6);
    day_move(&day, day_mv(11.86), 6);
    assert_int_equal(day_last(&day, SM_EVENT_RESULT)->state, SM_RESULT_HELD);
    assert_false(day_last(&day, SM_EVENT_RESULT)->good);
}

static void a_value_that_changes_without_a_transit_is_given_to_no_item(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_in(&day, day_mv(1.68) + 15, 8);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 2);
    assert_true(day_nth(&day, SM_EVENT_CAPTURE, 0)->has_where);
    assert_false(day_nth(&day, SM_EVENT_CAPTURE, 1)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
}

static void what_reads_like_the_item_before_is_asked_about(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_move(&day, day_mv(1.68), 6); /* the same beaker again: B4 is not what this is */
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 2);
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    day_move(&day, day_mv(4.00), 6); /* only a mark goes on */
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(4.00), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 2);
    day_move(&day, day_mv(4.00), 3); /* and a mark says that it is another beaker, however alike */
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(4.00), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 3);
}

static void where_the_method_wants_no_marks_it_is_only_remarked_on(void **state)
{
    (void)state;
    day.method.marks = SM_MARKS_NONE;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_move(&day, day_mv(1.68), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 2);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 0);
}

static void a_duplicate_is_given_to_nobody_without_its_mark(void **state)
{
    (void)state;
    day.sheet.n = 0;
    day_item(&day, SM_ITEM_STANDARD, "B4");
    day_item(&day, SM_ITEM_SAMPLE, "a");
    day_item(&day, SM_ITEM_DUPLICATE, "a");
    day_item(&day, SM_ITEM_CHECK, "C7");
    day_start(&day, true);
    day_move(&day, day_mv(4.0), 6);
    day_move(&day, day_mv(7.3), 6);
    day_move(&day, day_mv(7.3), 6);
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    day_act(&day, SM_ACT_NEXT, "");
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
    assert_int_equal(day_last(&day, SM_EVENT_MOVED)->by, SM_MOVED_MARK);
    day_in(&day, day_mv(7.3), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 3);
}

static void a_double_press_of_next_is_one_item(void **state)
{
    (void)state;
    day_start(&day, true);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(1.68), 0.5);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(1.68), 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 1);
}

static void an_act_that_has_not_seen_the_newest_is_refused(void **state)
{
    static struct sm_input in;

    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    memset(&in, 0, sizeof in);
    in.kind = SM_INPUT_ACT;
    in.act.act = SM_ACT_SKIP;
    in.act.has_seen = true;
    in.act.seen = day_last(&day, SM_EVENT_CAPTURE)->n - 1;
    sm_text_copy(in.act.id, sizeof in.act.id, "late-1");
    sm_text_copy(in.act.why, sizeof in.act.why, "broken bottle");
    day_feed(&day, &in);
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
    in.act.seen = day_last(&day, SM_EVENT_CAPTURE)->n;
    day_feed(&day, &in); /* the same id again: ignored */
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
    sm_text_copy(in.act.id, sizeof in.act.id, "late-2");
    day_feed(&day, &in);
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
    assert_true(day.carried.run.item[1].skipped);
}

static void skipping_needs_a_reason_and_unbuilt_acts_say_so(void **state)
{
    (void)state;
    day_start(&day, true);
    day_act(&day, SM_ACT_SKIP, "");
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
    for (int a = 0; a < SM_ACT_COUNT; a++) {
        if (sm_act_built((enum sm_act_kind)a))
            continue;
        day_act(&day, (enum sm_act_kind)a, "why not");
        assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
        assert_string_equal(day_last(&day, SM_EVENT_ANSWER)->why, "not possible yet");
    }
}

static void while_resting_nothing_is_captured(void **state)
{
    (void)state;
    day_start(&day, true);
    day_act(&day, SM_ACT_PAUSE, "");
    day_move(&day, day_mv(1.68), 8);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 0);
    day_act(&day, SM_ACT_RESUME, "");
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(1.68), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 1);
}

static void silence_is_an_event_and_makes_the_beaker_uncertain(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_nothing(&day, 30);
    assert_int_equal(day_count(&day, SM_EVENT_SILENT), 1);
    day_in(&day, day_mv(1.68), 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 2);
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
    day_move(&day, day_mv(4.00), 6); /* may be item 2, may be item 3: only a mark tells */
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    day_act(&day, SM_ACT_NEXT, "");
    day_in(&day, day_mv(4.00), 6);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 2);
}

static void a_lost_link_ends_the_immersion(void **state)
{
    struct sm_input lost = { .kind = SM_INPUT_LINK };
    struct sm_input up = { .kind = SM_INPUT_LINK };

    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 2);
    lost.link.state = SM_LINK_LOST;
    day_feed(&day, &lost);
    day_nothing(&day, 30);
    assert_int_equal(day_count(&day, SM_EVENT_SILENT), 0);
    up.link.state = SM_LINK_UP;
    day_feed(&day, &up);
    day_in(&day, day_mv(1.68), 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 1); /* the first, cut line after the link */
}

static void a_file_changed_over_a_captured_beaker_captures_it_once(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    assert_true(sm_core_may_roll(day.core));
    day_roll(&day);
    day_in(&day, day_mv(1.68), 20);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    day_move(&day, day_mv(4.00), 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 2);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 2);
}

static void a_file_changed_in_air_goes_on_with_the_next_item(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    for (int i = 0; i < 20; i++) {
        day_ticks(&day, day.t_ns + SM_NS_PER_S / 10);
        day_bytes(&day, "---- 20.0\r\n");
    }
    assert_true(sm_core_may_roll(day.core));
    day_roll(&day);
    day_in(&day, day_mv(4.00), 8);
    assert_int_equal(day_last(&day, SM_EVENT_CAPTURE)->item, 2);
}

static void a_file_changed_over_an_open_immersion_says_so_and_asks(void **state)
{
    (void)state;
    day_start(&day, true);
    day_move(&day, day_mv(1.68), 6);
    day_move(&day, day_mv(4.00), 2.5); /* not settled yet */
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    assert_false(sm_core_may_roll(day.core));
    assert_true(sm_core_may_cut(day.core));
    day_roll(&day);
    assert_string_equal(day_last(&day, SM_EVENT_NOT_SETTLED)->why, "not captured: log changed");
    day_in(&day, day_mv(4.00), 8);
    assert_false(day_last(&day, SM_EVENT_CAPTURE)->has_where);
    assert_int_equal(day_count(&day, SM_EVENT_QUESTION), 1);
}

static void a_sheet_with_an_expired_lot_is_refused(void **state)
{
    (void)state;
    day.standards.list[1].has_expires = true;
    day.standards.list[1].expires_day = day.utc_us / SM_US_PER_DAY - 1;
    day_start(&day, false);
    day_act(&day, SM_ACT_SHEET, "");
    assert_false(day_last(&day, SM_EVENT_ANSWER)->good);
    assert_non_null(strstr(day_last(&day, SM_EVENT_ANSWER)->why, "expired"));
    day.standards.list[1].expires_day++; /* its last good day is today */
    day_act(&day, SM_ACT_SHEET, "");
    assert_true(day_last(&day, SM_EVENT_ANSWER)->good);
}

static void rubbish_is_never_a_reading(void **state)
{
    (void)state;
    day_start(&day, false);
    day_in(&day, 100, 1);
    day_bytes(&day, "hello\r\n\r\n12..5 20\r\n\x80\xff\xfe\r\n");
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 3);
    day_in(&day, 100, 5);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    check_close("captured, mV", day_last(&day, SM_EVENT_CAPTURE)->value, 100, 0.3);
}

static void a_flood_of_rubbish_is_told_ten_times_a_minute_and_counted(void **state)
{
    (void)state;
    day_start(&day, false);
    for (int i = 0; i < 500; i++) {
        day_ticks(&day, day.t_ns + SM_NS_PER_S / 10);
        day_bytes(&day, "rubbish\r\n");
    }
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 10);
    day_nothing(&day, 60);
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 11);
}

static void sent(struct day *d)
{
    struct sm_input in = { .kind = SM_INPUT_SENT };

    in.sent_of = day_last(d, SM_EVENT_ASK)->n;
    day_feed(d, &in);
}

static void question(struct sm_question *q, const char *text)
{
    sm_text_copy(q->text, sizeof q->text, text);
    q->n = strlen(text);
    q->every_ns = SM_NS_PER_S;
    q->within_ns = 600 * SM_NS_PER_MS;
}

static void an_asked_meter_is_asked_at_its_time_and_a_late_answer_is_no_reading(void **state)
{
    (void)state;
    question(&day.profile.ask, "R\r");
    question(&day.profile.identity, "I\r");
    day_start(&day, false);
    day_nothing(&day, 0.1); /* who are you? */
    assert_int_equal(day_count(&day, SM_EVENT_ASK), 1);
    sent(&day);
    day_nothing(&day, 0.1);
    day_bytes(&day, "bench meter, invented\r\n");
    day_nothing(&day, 0.1);
    assert_int_equal(day_count(&day, SM_EVENT_ASK), 2);
    sent(&day);
    day_nothing(&day, 0.2);
    day_bytes(&day, "12.50 20.0\r\n");
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 0);
    day_nothing(&day, 1.0);
    assert_int_equal(day_count(&day, SM_EVENT_ASK), 3);
    sent(&day);
    day_nothing(&day, 0.9); /* its limit has passed: nothing is asked, the answer may still come */
    assert_int_equal(day_count(&day, SM_EVENT_ASK), 3);
    day_bytes(&day, "99.99 20.0\r\n");
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 1);
    day_nothing(&day, 1.0);
    assert_int_equal(day_count(&day, SM_EVENT_ASK), 4);
    day_act(&day, SM_ACT_NOTE, "anything, to see what is carried");
    assert_string_equal(day.carried.meter.identity, "bench meter, invented");
}

static void a_streaming_meter_may_send_a_reading_before_it_says_who_it_is(void **state)
{
    (void)state;
    question(&day.profile.identity, "I\r");
    day_start(&day, false);
    day_nothing(&day, 0.1);
    sent(&day);
    day_nothing(&day, 0.1);
    day_bytes(&day, "12.50 20.0\r\nbench meter, invented\r\n12.51 20.0\r\n");
    assert_int_equal(day_count(&day, SM_EVENT_UNREAD), 0);
    day_act(&day, SM_ACT_NOTE, "anything, to see what is carried");
    assert_string_equal(day.carried.meter.identity, "bench meter, invented");
}

int main(void)
{
#define TEST(name) cmocka_unit_test_setup_teardown(name, begin, end)
    const struct CMUnitTest tests[] = {
        TEST(without_a_sheet_what_settles_is_captured_and_numbered),
        TEST(a_whole_sheet_gives_a_curve_results_and_their_release),
        TEST(a_failed_closing_check_holds_what_came_before),
        TEST(a_refused_curve_gives_no_results_and_no_check_passes),
        TEST(above_the_highest_standard_there_is_no_number),
        TEST(a_value_that_changes_without_a_transit_is_given_to_no_item),
        TEST(what_reads_like_the_item_before_is_asked_about),
        TEST(where_the_method_wants_no_marks_it_is_only_remarked_on),
        TEST(a_duplicate_is_given_to_nobody_without_its_mark),
        TEST(a_double_press_of_next_is_one_item),
        TEST(an_act_that_has_not_seen_the_newest_is_refused),
        TEST(skipping_needs_a_reason_and_unbuilt_acts_say_so),
        TEST(while_resting_nothing_is_captured),
        TEST(silence_is_an_event_and_makes_the_beaker_uncertain),
        TEST(a_lost_link_ends_the_immersion),
        TEST(a_file_changed_over_a_captured_beaker_captures_it_once),
        TEST(a_file_changed_in_air_goes_on_with_the_next_item),
        TEST(a_file_changed_over_an_open_immersion_says_so_and_asks),
        TEST(a_sheet_with_an_expired_lot_is_refused),
        TEST(rubbish_is_never_a_reading),
        TEST(a_flood_of_rubbish_is_told_ten_times_a_minute_and_counted),
        TEST(an_asked_meter_is_asked_at_its_time_and_a_late_answer_is_no_reading),
        TEST(a_streaming_meter_may_send_a_reading_before_it_says_who_it_is),
    };
#undef TEST
    return cmocka_run_group_tests(tests, NULL, NULL);
}
