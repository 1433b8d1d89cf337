/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The window against a slow twin that keeps every reading and searches it. */
#include "signal/made.h"
#include "signal/window.h"

#define MOST 20000

static struct sm_signal_reading all[MOST];

static struct sm_window *new_window(size_t n_others)
{
    struct sm_window *w = calloc(1, sizeof *w);

    assert_non_null(w);
    w->n_others = n_others;
    w->other = calloc(SM_WINDOW_GROUPS * n_others + 1, sizeof *w->other);
    assert_non_null(w->other);
    sm_window_begin(w);
    return w;
}

static void delete_window(struct sm_window *w)
{
    free(w->other);
    free(w);
}

struct twin {
    unsigned n;
    double mean, sd, least, largest, other_mean, other_range;
};

static struct twin slow(int from, int to)
{
    struct twin t = { 0 };
    long double sum = 0, squares = 0, other = 0;
    double lo = INFINITY, hi = -INFINITY, others = 0;

    t.least = INFINITY;
    t.largest = -INFINITY;
    for (int i = from; i <= to; i++) {
        const struct sm_other *o = &all[i].other[0];

        t.n++;
        sum += all[i].value;
        t.least = fmin(t.least, all[i].value);
        t.largest = fmax(t.largest, all[i].value);
        if (!o->present || o->age_ns > SM_OTHER_OLDEST_NS)
            continue;
        others++;
        other += o->value;
        lo = fmin(lo, o->value);
        hi = fmax(hi, o->value);
    }
    t.mean = (double)(sum / t.n);
    for (int i = from; i <= to; i++)
        squares += (all[i].value - sum / t.n) * (all[i].value - sum / t.n);
    t.sd = t.n > 1 ? (double)sqrtl(squares / (t.n - 1)) : 0;
    t.other_mean = others > 0 ? (double)(other / others) : 0;
    t.other_range = hi - lo;
    return t;
}

static void compare(const char *name, int i, const struct sm_window *w, int from)
{
    const struct twin want = slow(from, i);
    struct sm_window_sum got;
    char what[80];

    sm_window_sum(w, &got);
    snprintf(what, sizeof what, "%s, reading %d", name, i);
    if (got.n != want.n || got.from_t_ns != all[from].t_ns || got.to_t_ns != all[i].t_ns)
        fail_msg("%s: %u readings, want %u", what, got.n, want.n);
    check_close(what, got.mean, want.mean, 1e-11 * (1 + fabs(want.mean)));
    check_close(what, got.sd, want.sd, 1e-11 * (1 + want.sd));
    check_close(what, sm_window_least(w), want.least, 0);
    check_close(what, sm_window_largest(w), want.largest, 0);
    if (want.other_range >= 0) {
        check_close(what, got.other_mean[0].value, want.other_mean, 1e-11);
        check_close(what, got.other_range[0].value, want.other_range, 1e-12);
    }
}

static void it_agrees_with_the_slow_twin(void **state)
{
    static const struct {
        const char *name;
        double rate, over_s, slope, offset;
    } cases[] = { { "quiet", 1, 20, 0, 50 },    { "rising", 10, 20, 3, 0 },
                  { "falling", 10, 20, -3, 0 }, { "far from zero", 5, 7.5, 0.1, 1e6 },
                  { "short", 0.5, 1, 0, -3 },   { "fast", 50, 2, 0, 1 } };

    (void)state;
    for (size_t c = 0; c < COUNT(cases); c++) {
        struct bench b = made_bench((unsigned)c);
        struct sm_window *w = new_window(1);
        const int64_t over_ns = made_ns(cases[c].over_s);
        int from = 0;

        for (int i = 0; i < 1500; i++) {
            const double t_s = (i + made_uniform(&b)) / cases[c].rate;

            all[i] = (struct sm_signal_reading){ .t_ns = made_ns(t_s) };
            all[i].value = cases[c].offset + cases[c].slope * t_s + made_normal(&b);
            all[i].other[0] = (struct sm_other){ made_uniform(&b) < 0.8, 20 + made_normal(&b),
                                                 made_ns(6 * made_uniform(&b)) };
            sm_window_add(w, &all[i], over_ns);
            while (all[i].t_ns - all[from].t_ns > over_ns)
                from++;
            if (i % 7 == 0)
                compare(cases[c].name, i, w, from);
        }
        delete_window(w);
    }
}

static void with_more_readings_than_room_every_one_still_counts(void **state)
{
    struct bench b = made_bench(11);
    struct sm_window *w = new_window(1);

    (void)state;
    for (int i = 0; i < MOST; i++) {
        all[i] = (struct sm_signal_reading){ .t_ns = i };
        all[i].value = 50 + 1e-4 * i + made_normal(&b);
        all[i].other[0] = (struct sm_other){ true, 20 + made_normal(&b), 0 };
        sm_window_add(w, &all[i], INT64_MAX);
    }
    compare("all of them", MOST - 1, w, 0);
    delete_window(w);
}

static void with_more_readings_than_room_the_edge_is_coarser_by_a_thousandth(void **state)
{
    struct bench b = made_bench(12);
    struct sm_window *w = new_window(0);
    const int64_t over = 9000;

    (void)state;
    for (int i = 0; i < MOST; i++) {
        struct sm_window_sum got;

        all[i] = (struct sm_signal_reading){ .t_ns = i };
        all[i].value = 1e-3 * i + made_normal(&b);
        sm_window_add(w, &all[i], over);
        if (i < over || i % 997 != 0)
            continue;
        sm_window_sum(w, &got);
        /* never less than `over` is judged, and at most one group more */
        if (got.n < over + 1 || got.n > over + 1 + over / 1024 || got.to_t_ns != i)
            fail_msg("reading %d: %u in the window", i, got.n);
        check_close("mean", got.mean, slow(i + 1 - (int)got.n, i).mean, 1e-10);
        check_close("least", sm_window_least(w), slow(i + 1 - (int)got.n, i).least, 0);
        check_close("largest", sm_window_largest(w), slow(i + 1 - (int)got.n, i).largest, 0);
    }
    delete_window(w);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(it_agrees_with_the_slow_twin),
        cmocka_unit_test(with_more_readings_than_room_every_one_still_counts),
        cmocka_unit_test(with_more_readings_than_room_the_edge_is_coarser_by_a_thousandth),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
