/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_unplug_fifty.c: the plug of a meter pulled and put back fifty times, end to end. */
#include "check.h"

#include "unplug_rounds.h"

static void fifty_times_back_within_5_s_and_no_growth(void **state)
{
    (void)state;
    unplug_rounds(50);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(
        fifty_times_back_within_5_s_and_no_growth) };

    return cmocka_run_group_tests_name("unplug-fifty", tests, NULL, NULL);
}
