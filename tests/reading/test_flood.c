/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_flood.c: a flood of unread lines is logged in full ten a minute, then counted. */
#include "check.h"

#include "base/time.h"
#include "reading/flood.h"

#define S SM_NS_PER_S

static void ten_a_minute_in_full_then_a_count(void **state)
{
    struct sm_flood f;
    uint64_t count = 99;
    (void)state;
    sm_flood_init(&f);
    for (int i = 0; i < 10; i++)
        assert_true(sm_flood_line(&f, 7 * S + i));
    assert_true(sm_flood_deadline(&f) == SM_NEVER); /* nothing to tell */
    for (int i = 0; i < 5; i++)
        assert_false(sm_flood_line(&f, 8 * S));
    assert_true(sm_flood_deadline(&f) == 67 * S);
    assert_false(sm_flood_tick(&f, 67 * S - 1, &count));
    assert_int_equal(count, 99);
    assert_true(sm_flood_tick(&f, 67 * S, &count));
    assert_int_equal(count, 5);
    assert_false(sm_flood_tick(&f, 68 * S, &count)); /* told once */
    assert_true(sm_flood_deadline(&f) == SM_NEVER);
}

static void a_minute_begins_with_its_first_line(void **state)
{
    struct sm_flood f;
    (void)state;
    sm_flood_init(&f);
    for (int i = 0; i < 10; i++)
        assert_true(sm_flood_line(&f, i * 6 * S)); /* ten in 54 s */
    assert_false(sm_flood_line(&f, 60 * S - 1));
    assert_true(sm_flood_line(&f, 60 * S)); /* the next minute, from here on */
    for (int i = 0; i < 9; i++)
        assert_true(sm_flood_line(&f, 100 * S));
    assert_false(sm_flood_line(&f, 119 * S));
    assert_true(sm_flood_line(&f, 500 * S));
}

/* Where ticks come late, what was passed over in two minutes is told together: nothing is lost. */
static void a_late_tick_loses_no_count(void **state)
{
    struct sm_flood f;
    uint64_t count = 0;
    int full = 0;
    (void)state;
    sm_flood_init(&f);
    for (int i = 0; i < 240; i++)
        full += sm_flood_line(&f, i * S / 2) ? 1 : 0; /* 2 a second, 2 minutes */
    assert_int_equal(full, 20);
    assert_true(sm_flood_deadline(&f) == 60 * S);
    assert_true(sm_flood_tick(&f, 130 * S, &count));
    assert_int_equal(count, 220);
}

static void an_end_tells_at_once(void **state)
{
    struct sm_flood f;
    uint64_t count = 0;
    (void)state;
    sm_flood_init(&f);
    assert_false(sm_flood_end(&f, &count));
    for (int i = 0; i < 13; i++)
        (void)sm_flood_line(&f, S);
    assert_true(sm_flood_end(&f, &count));
    assert_int_equal(count, 3);
    assert_false(sm_flood_end(&f, &count));
}

static void the_last_times_do_not_overflow(void **state)
{
    struct sm_flood f;
    uint64_t count = 0;
    (void)state;
    sm_flood_init(&f);
    for (int i = 0; i < 12; i++)
        (void)sm_flood_line(&f, INT64_MAX - 1);
    assert_true(sm_flood_deadline(&f) == SM_NEVER);
    assert_true(sm_flood_end(&f, &count));
    assert_int_equal(count, 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(ten_a_minute_in_full_then_a_count),
                                        cmocka_unit_test(a_minute_begins_with_its_first_line),
                                        cmocka_unit_test(a_late_tick_loses_no_count),
                                        cmocka_unit_test(an_end_tells_at_once),
                                        cmocka_unit_test(the_last_times_do_not_overflow) };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
