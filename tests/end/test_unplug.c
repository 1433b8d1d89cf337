/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_unplug.c: a meter whose plug is pulled, end to end: some rounds (fifty are in
 * test_unplug_fifty.c), and a long absence. */
#include "check.h"

#include "outside.h"
#include "unplug_rounds.h"

#define CPU_SHARE 0.03 /* of one processor, at most, while the adapter is away */

static struct live l; /* large */
static struct log_check log_;

static void six_times_back_within_5_s_and_no_growth(void **state)
{
    (void)state;
    unplug_rounds(6);
}

static void an_absent_adapter_costs_nothing_and_is_said_once(void **state)
{
    struct outside begin, end;
    int64_t begin_ns;
    double share;
    char line[512];

    (void)state;
    live_make(&l, 2);
    l.from = 0;
    live_start(&l);
    if (!live_connect(&l, 5000))
        fail_msg("no daemon after 5 s");
    live_await(&l, "\"state\":\"up\"", 5000, line, sizeof line);
    outside_unplug(&l, 0);
    live_await(&l, "is not there", 5000, line, sizeof line);
    begin = outside_look(l.daemon);
    begin_ns = live_now_ns();
    live_sleep_ms(5000);
    end = outside_look(l.daemon);
    share = (end.cpu_s - begin.cpu_s) / (1e-9 * (double)(live_now_ns() - begin_ns));
    print_message("away for 5 s: %.1f %% of a processor\n", 100 * share);
    assert_true(share <= CPU_SHARE);
    assert_int_equal(end.descriptors, begin.descriptors);
    outside_plug(&l, 0);
    live_await(&l, "\"state\":\"up\"", 5000, line, sizeof line);
    outside_stop_and_check(&l, 0, &log_, "absent");
    assert_int_equal(outside_count(&log_, "link", "\"state\":\"lost\""),
                     2); /* hung up, not there */
    assert_int_equal(outside_count(&log_, "link", "\"state\":\"up\""), 2);
    log_check_free(&log_);
    live_remove(&l);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(six_times_back_within_5_s_and_no_growth),
        cmocka_unit_test(an_absent_adapter_costs_nothing_and_is_said_once),
    };

    return cmocka_run_group_tests_name("unplug", tests, NULL, NULL);
}
