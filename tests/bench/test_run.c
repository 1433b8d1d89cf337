/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whose turn it is: items open by transit or mark, and close by their capture only. */
#include "check.h"

#include <string.h>

#include "bench/run.h"

static struct sm_sheet sheet;
static struct sm_carried_run run;

static void add(enum sm_item_kind kind, const char *name)
{
    struct sm_item *i = &sheet.item[sheet.n++];

    memset(i, 0, sizeof *i);
    i->kind = kind;
    sm_text_copy(i->name, sizeof i->name, name);
}

static int begin(void **state)
{
    (void)state;
    memset(&sheet, 0, sizeof sheet);
    add(SM_ITEM_STANDARD, "B4");
    add(SM_ITEM_STANDARD, "B7");
    add(SM_ITEM_CHECK, "C7");
    add(SM_ITEM_SAMPLE, "final");
    add(SM_ITEM_DUPLICATE, "final");
    add(SM_ITEM_CHECK, "C7");
    sm_run_begin(&run, 31, &sheet);
    return 0;
}

static bool enter(bool marked)
{
    char why[SM_REASON_SIZE] = "";
    const bool open = sm_run_enter(&run, &sheet, marked, why);

    if (!open && why[0] == '\0')
        fail_msg("refused without a reason");
    return open;
}

static void capture_up_to(size_t next)
{
    while (run.next < next) {
        assert_true(enter(true));
        sm_run_captured(&run, 100 + (int64_t)run.next);
    }
}

static void a_transit_opens_the_next_item_and_a_capture_closes_it(void **state)
{
    (void)state;
    assert_true(enter(false));
    assert_true(run.open);
    assert_int_equal(run.next, 0);
    sm_run_captured(&run, 77);
    assert_false(run.open);
    assert_int_equal(run.next, 1);
    assert_int_equal(run.item[0].captures, 1);
    assert_int_equal(run.item[0].capture, 77);
    assert_int_equal(sm_run_measured(&run), 1);
}

static void a_rinse_shorter_than_the_dwell_uses_no_item_up(void **state)
{
    (void)state;
    assert_true(enter(false));
    sm_run_left(&run, false);
    assert_false(run.open);
    assert_true(enter(false));
    assert_int_equal(run.next, 0);
}

static void an_item_left_before_it_settled_wants_a_mark(void **state)
{
    (void)state;
    assert_true(enter(false));
    sm_run_left(&run, true);
    assert_false(enter(false));
    assert_false(run.open);
    assert_true(enter(true));
    assert_int_equal(run.next, 0);
    assert_false(run.left);
}

static void skipping_what_was_left_lets_a_transit_go_on(void **state)
{
    (void)state;
    assert_true(enter(false));
    sm_run_left(&run, true);
    assert_int_equal(sm_run_skip(&run), SM_OK);
    assert_true(enter(false));
    assert_int_equal(run.next, 1);
    assert_true(run.item[0].skipped);
}

static void a_duplicate_opens_by_a_mark_only(void **state)
{
    (void)state;
    capture_up_to(4);
    assert_false(enter(false));
    assert_true(enter(true));
}

static void a_sheet_that_is_done_opens_nothing_and_skips_nothing(void **state)
{
    (void)state;
    capture_up_to(6);
    assert_false(enter(false));
    assert_false(enter(true));
    assert_int_equal(sm_run_skip(&run), SM_ESHORT);
}

static void the_row_of_standards_ends_where_something_else_comes(void **state)
{
    (void)state;
    capture_up_to(1);
    assert_false(sm_run_standards_done(&run, &sheet));
    capture_up_to(2);
    assert_true(sm_run_standards_done(&run, &sheet));
}

static void a_check_closes_when_only_checks_follow(void **state)
{
    (void)state;
    assert_false(sm_run_closing(&sheet, 2));
    assert_true(sm_run_closing(&sheet, 5));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup(a_transit_opens_the_next_item_and_a_capture_closes_it, begin),
        cmocka_unit_test_setup(a_rinse_shorter_than_the_dwell_uses_no_item_up, begin),
        cmocka_unit_test_setup(an_item_left_before_it_settled_wants_a_mark, begin),
        cmocka_unit_test_setup(skipping_what_was_left_lets_a_transit_go_on, begin),
        cmocka_unit_test_setup(a_duplicate_opens_by_a_mark_only, begin),
        cmocka_unit_test_setup(a_sheet_that_is_done_opens_nothing_and_skips_nothing, begin),
        cmocka_unit_test_setup(the_row_of_standards_ends_where_something_else_comes, begin),
        cmocka_unit_test_setup(a_check_closes_when_only_checks_follow, begin),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
