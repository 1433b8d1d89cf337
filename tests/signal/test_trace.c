/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Settle decisions over a plain recording. */
#include "signal/made.h"
#include "signal/trace.h"

static size_t run(double start_s, double step, struct sm_trace_row *rows, size_t cap)
{
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    struct sm_trace *t = NULL;
    size_t n = 0;

    assert_int_equal(sm_trace_create(&rule, &t), SM_OK);
    for (int i = 0; i < 1200; i++) {
        struct sm_trace_row row;
        bool captured = true;
        const double x = i < 600 ? 12.3 : -45.6;

        assert_int_equal(sm_trace_feed(t, start_s + 0.1 * i, x, step, &captured, &row), SM_OK);
        if (captured && n < cap)
            rows[n] = row;
        n += captured;
    }
    sm_trace_destroy(t);
    return n;
}

static void a_row_per_capture_in_the_recordings_own_time(void **state)
{
    static const double starts[] = { 0, 1000, -60, 1.7e9 };

    (void)state;
    for (size_t i = 0; i < COUNT(starts); i++) {
        struct sm_trace_row rows[2];

        assert_int_equal(run(starts[i], 0.1, rows, 2), 2);
        check_close("moved", rows[0].moved_s, starts[i], 0);
        check_close("captured", rows[0].captured_s, starts[i] + 22, 0);
        check_close("value", rows[0].value, 12.3, 1e-12);
        check_close("U", rows[0].expanded_uncertainty, 2 * 0.1 / sqrt(12), 1e-15);
        assert_int_equal(rows[0].readings, 201);
        check_close("moved again", rows[1].moved_s, starts[i] + 60, 1e-6);
        check_close("captured again", rows[1].captured_s, starts[i] + 82, 1e-6);
    }
}

static void the_smallest_step_so_far_counts(void **state)
{
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    struct sm_trace *t = NULL;
    struct sm_trace_row row = { 0 };

    (void)state;
    assert_int_equal(sm_trace_create(&rule, &t), SM_OK);
    for (int i = 0; i <= 22; i++) {
        bool captured;

        /* "12.30" was written "12.3" by a table, "12.00" even "12" */
        assert_int_equal(sm_trace_feed(t, i, 12,
                                       i == 5  ? 0.01
                                       : i % 2 ? 0.1
                                               : 1,
                                       &captured, &row),
                         SM_OK);
    }
    check_close("U", row.expanded_uncertainty, 2 * 0.01 / sqrt(12), 1e-15);
    sm_trace_destroy(t);
}

static void what_is_out_of_order_or_range_is_refused(void **state)
{
    const struct sm_rule rule = made_rule(0.6, 22, 20);
    struct sm_trace *t = NULL;
    struct sm_trace_row row;
    struct sm_rule bad = rule;
    bool captured;

    (void)state;
    assert_int_equal(sm_trace_create(&rule, &t), SM_OK);
    assert_int_equal(sm_trace_feed(t, 5, 1, 0, &captured, &row), SM_OK);
    assert_int_equal(sm_trace_feed(t, 4.9, 1, 0, &captured, &row), SM_EORDER);
    assert_int_equal(sm_trace_feed(t, NAN, 1, 0, &captured, &row), SM_EVALUE);
    assert_int_equal(sm_trace_feed(t, 6, NAN, 0, &captured, &row), SM_EVALUE);
    assert_int_equal(sm_trace_feed(t, 1e10, 1, 0, &captured, &row), SM_EVALUE);
    assert_int_equal(sm_trace_feed(t, 5, 1, 0, &captured, &row), SM_OK);
    sm_trace_destroy(t);
    t = NULL;
    bad.kind = SM_RULE_HALVES;
    assert_int_equal(sm_trace_create(&bad, &t), SM_EINVAL);
    assert_null(t);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_row_per_capture_in_the_recordings_own_time),
        cmocka_unit_test(the_smallest_step_so_far_counts),
        cmocka_unit_test(what_is_out_of_order_or_range_is_refused),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
