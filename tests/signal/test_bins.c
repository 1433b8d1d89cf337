/* SPDX-License-Identifier: GPL-3.0-or-later */
/* 64 bins of equal width, pairs merged when a 65th is needed. */
#include "signal/bins.h"
#include "signal/made.h"

static void every_reading_is_in_exactly_one_bin_and_bins_stay_few(void **state)
{
    static const struct {
        double spacing_s;
        int readings;
    } cases[] = {
        { 0.05, 20 }, { 0.5, 64 }, { 0.5, 65 }, { 1, 1000 }, { 0.1, 50000 }, { 900, 100 }
    };

    (void)state;
    for (size_t c = 0; c < COUNT(cases); c++) {
        struct bench b = made_bench((unsigned)c);
        struct sm_bins bins;
        double t_s = 0, sum_x = 0, sum_t = 0, got_x = 0, got_t = 0, span_s;
        long long n = 0;

        sm_bins_begin(&bins, 777, SM_NS_PER_S / 2);
        for (int i = 0; i < cases[c].readings; i++) {
            const double x = 20 + 3 * made_normal(&b);

            sm_bins_add(&bins, 777 + made_ns(t_s), x);
            sum_x += x;
            sum_t += 1e-9 * (double)made_ns(t_s);
            t_s += cases[c].spacing_s * (0.5 + made_uniform(&b));
        }
        for (size_t i = 0; i < SM_BINS; i++) {
            const struct sm_bin *bin = &bins.bin[i];
            const double width_s = 1e-9 * (double)bins.width_ns;

            n += bin->n;
            got_x += bin->sum_x + bin->n * bins.reference;
            got_t += bin->sum_t;
            if (bin->n > 0 && (bin->sum_t / bin->n < width_s * (double)i - 1e-6 ||
                               bin->sum_t / bin->n > width_s * (double)(i + 1) + 1e-6))
                fail_msg("case %zu: bin %zu has mean time %.3f", c, i, bin->sum_t / bin->n);
        }
        assert_int_equal(n, cases[c].readings);
        check_close("sum x", got_x, sum_x, 1e-7 * fabs(sum_x));
        check_close("sum t", got_t, sum_t, 1e-9 * sum_t + 1e-9);
        span_s = sm_bins_span_s(&bins);
        if (cases[c].readings > 100 && bins.open < SM_BINS / 2 - 1)
            fail_msg("case %zu: only %zu bins, span %.1f", c, bins.open, span_s);
    }
}

static void it_says_when_a_bin_is_closed(void **state)
{
    struct sm_bins bins;

    (void)state;
    sm_bins_begin(&bins, 0, SM_NS_PER_S);
    assert_false(sm_bins_add(&bins, made_ns(0.1), 1));
    assert_false(sm_bins_add(&bins, made_ns(0.999), 1));
    assert_true(sm_bins_add(&bins, made_ns(1), 1));
    assert_false(sm_bins_add(&bins, made_ns(1.5), 1));
    assert_true(sm_bins_add(&bins, made_ns(7.5), 1)); /* a gap */
    check_close("span of the closed ones", sm_bins_span_s(&bins), 7, 1e-12);
    assert_true(sm_bins_add(&bins, made_ns(64), 1)); /* pairs merged */
    assert_true(bins.width_ns == 2 * SM_NS_PER_S);
    check_close("span", sm_bins_span_s(&bins), 64, 1e-12);
    assert_int_equal(bins.bin[0].n, 4);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_reading_is_in_exactly_one_bin_and_bins_stay_few),
        cmocka_unit_test(it_says_when_a_bin_is_closed),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
