/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The front end's time constants against the dwell. */
#include "signal/made.h"
#include "signal/pace.h"

static void from_22_s_on_they_are_those_of_the_method(void **state)
{
    (void)state;
    for (int64_t dwell_s = 22; dwell_s <= 3600; dwell_s *= 2) {
        const struct sm_pace p = sm_pace_of(dwell_s * SM_NS_PER_S);

        check_close("odd readings", 1e-9 * (double)p.odd_ns, 1, 0.001);
        check_close("slope ahead", 1e-9 * (double)p.grow_ns, 5, 0.001);
        check_close("blocks", 1e-9 * (double)p.block_ns, 1, 0.001);
        check_close("bins", 1e-9 * (double)p.bin_ns, 0.5, 0.001);
        check_close("worth putting back", 1e-9 * (double)p.worth_ns, 6, 0.001);
        check_close("lift", 1e-9 * (double)p.lift_ns, 10, 0.001);
        check_close("away", 1e-9 * (double)p.away_ns, 3, 0.001);
    }
}

/* Every capture follows its moved: what may be told late is told well before the dwell is over. */
static void at_any_dwell_what_is_told_late_comes_before_the_dwell_is_over(void **state)
{
    (void)state;
    for (int64_t dwell_ns = 0; dwell_ns < 100 * SM_NS_PER_S;
         dwell_ns = dwell_ns * 5 / 4 + SM_NS_PER_MS) {
        const struct sm_pace p = sm_pace_of(dwell_ns);

        assert_true(p.dwell_ns == dwell_ns);
        assert_true(p.lift_ns <= dwell_ns / 2);
        assert_true(p.calm_ns <= dwell_ns / 4);
        assert_true(p.worth_ns <= dwell_ns / 3);
        assert_true(p.odd_ns <= dwell_ns / 20 && p.away_ns <= dwell_ns / 7);
        assert_true(p.block_ns > 0 && p.bin_ns > 0 && p.grow_ns > 0);
        assert_true(p.block_ns <= dwell_ns / 6 || p.block_ns == SM_NS_PER_MS);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(from_22_s_on_they_are_those_of_the_method),
        cmocka_unit_test(at_any_dwell_what_is_told_late_comes_before_the_dwell_is_over),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
