/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Random days at the bench, from printed seeds. A person goes from beaker to beaker in the order of
 * the sheet, reads the screen or does not, presses next or the meter's key, skips, pauses, while
 * the meter falls silent, its plug is pulled, the program is killed, the file changed. The truth,
 * which beaker the probe is in, is kept here alone.
 *
 * What the person never does: have the probe in the first beaker when the sheet is handed over, go
 * back to a beaker that was measured, leave one before the dwell, press next elsewhere than in the
 * item that the screen calls the next or the present one. */
#include "bench_day.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define SEEDS 400
#define STEPS 60
#define NOWHERE (-1)
#define BEAKER_S 5.0 /* least stay: well over the dwell of 3 s */
#define LATE_NS                                                                                    \
    (SM_NS_PER_S / 20 * 3) /* a reading or two after a move still show the beaker before */
#define RESULTS 400

enum fate { FATE_PROVISIONAL, FATE_HELD, FATE_RELEASED };

struct any {
    struct day d;
    uint64_t seed, state;
    bool plain;        /* nothing that a change of file could make another day of */
    bool rolls;        /* the file is changed now and then, where it may be */
    unsigned files;    /* how often it was */
    int at;            /* the truth: index of the item whose beaker the probe is in; NOWHERE */
    int was;           /* … before that */
    int64_t since_us;  /* of the wall clock */
    int64_t settle_us; /* when it was last touched there */
    double ph[SM_ITEMS_MAX];
    bool good_curve;
    int64_t curve_n, run;
    int64_t moved_n;     /* of the immersion now; 0: none in this file, or captured already */
    bool passed, failed; /* the check of the input under way */
    int64_t check_n, check_curve;
    struct {
        int64_t n, curve, run;
        enum fate fate;
    } result[RESULTS];
    size_t n_results;
    unsigned captures, given, released, held; /* what there was */
};

static struct any any;
static uint64_t only; /* 0: all */

static void tell(const struct any *a, const char *what, int64_t item)
{
    const int64_t since_us = a->d.utc_us + a->d.t_ns / 1000 - INT64_C(1796112000000000);

    if (only != 0)
        print_message("%8.1f s in %2d: %s %lld\n", 1e-6 * (double)since_us, a->at + 1, what,
                      (long long)item);
}

static double draw(struct any *a)
{
    uint64_t z = a->state += UINT64_C(0x9e3779b97f4a7c15); /* splitmix64 */

    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return (double)((z ^ (z >> 31)) >> 11) / 9007199254740992.0;
}

static unsigned below(struct any *a, unsigned n)
{
    return (unsigned)(draw(a) * n);
}

static int64_t now_us(const struct any *a)
{
    return a->d.utc_us + a->d.t_ns / 1000;
}

#define BROKEN(a, ...)                                                                             \
    do {                                                                                           \
        print_message("seed %llu: ", (unsigned long long)(a)->seed);                               \
        fail_msg(__VA_ARGS__);                                                                     \
    } while (0)

/* ---- what must hold of every event ---- */

static void look_at_capture(struct any *a, const struct sm_event_capture *c)
{
    const int truth = now_us(a) - a->since_us <= LATE_NS / 1000 ? a->was : a->at;

    a->captures++;
    if (a->moved_n == 0 || c->moved != a->moved_n)
        BROKEN(a, "a capture without its moved, or a second one");
    a->moved_n = 0;
    if (a->d.carried.rest.has)
        BROKEN(a, "captured while resting");
    if (!c->where.has)
        return;
    a->given++;
    if ((int)c->where.item - 1 != truth)
        BROKEN(a, "item %zu got the capture of beaker %d", c->where.item, truth + 1);
}

static void look_at_change(struct any *a, const struct sm_event_change *c, enum fate fate)
{
    for (size_t i = 0; i < c->n; i++) {
        size_t r = 0;

        while (r < a->n_results && a->result[r].n != c->result[i])
            r++;
        if (r == a->n_results || a->result[r].fate != FATE_PROVISIONAL)
            BROKEN(a, "result %lld changed and was not provisional", (long long)c->result[i]);
        a->result[r].fate = fate;
        if (fate == FATE_HELD)
            continue;
        if (!a->passed || c->check != a->check_n || a->check_curve != a->result[r].curve ||
            a->result[r].run != a->run)
            BROKEN(a, "result %lld released without a passing check on its curve, in its run",
                   (long long)c->result[i]);
    }
}

static void look(void *arg, const struct sm_event *e)
{
    struct any *a = arg;

    if (sm_event_class(e->kind) != SM_LIVE && e->kind != SM_EVENT_CARRIED)
        tell(a, sm_event_kind_name(e->kind),
             e->kind == SM_EVENT_MOVED
                 ? 100 * (int64_t)e->u.moved.by + (int64_t)e->u.moved.where.item
             : e->kind == SM_EVENT_CAPTURE ? (int64_t)e->u.capture.where.item
                                           : e->n);
    switch (e->kind) {
    case SM_EVENT_MOVED:
        a->moved_n = e->n;
        break;
    case SM_EVENT_CAPTURE:
        look_at_capture(a, &e->u.capture);
        break;
    case SM_EVENT_CURVE:
        a->good_curve = e->u.curve.accepted;
        a->curve_n = e->n;
        break;
    case SM_EVENT_CHECK:
        a->passed = e->u.check.pass;
        a->failed = !e->u.check.pass;
        a->check_n = e->n;
        a->check_curve = e->u.check.curve;
        if (a->passed && (!a->good_curve || e->u.check.curve != a->curve_n))
            BROKEN(a, "a check passed without an accepted curve");
        break;
    case SM_EVENT_RESULT:
        assert_true(a->n_results < RESULTS);
        a->result[a->n_results].n = e->n;
        a->result[a->n_results].curve = e->u.result.curve;
        a->result[a->n_results].run = a->run = e->u.result.where.run;
        a->result[a->n_results++].fate =
            e->u.result.state == SM_RESULT_PROVISIONAL ? FATE_PROVISIONAL : FATE_HELD;
        if (e->u.result.state == SM_RESULT_PROVISIONAL && !a->good_curve)
            BROKEN(a, "a result without an accepted curve");
        break;
    case SM_EVENT_RELEASE:
        a->released++;
        look_at_change(a, &e->u.change, FATE_RELEASED);
        break;
    case SM_EVENT_HOLD:
        a->held++;
        look_at_change(a, &e->u.change, FATE_HELD);
        break;
    case SM_EVENT_CARRIED: /* an input is over */
        for (size_t i = 0; a->failed && i < a->n_results; i++) {
            if (a->result[i].fate == FATE_PROVISIONAL)
                BROKEN(a, "still provisional after a failed check");
        }
        a->passed = a->failed = false;
        break;
    default:
        break;
    }
}

/* ---- the bench ---- */

static double mv_of(const struct any *a, int beaker)
{
    return day_mv(a->ph[beaker]);
}

/* An item with a beaker of its own, whose value is not that of the one before (but a duplicate's).
 */
static void put(struct any *a, enum sm_item_kind kind, const char *name, double ph)
{
    a->ph[a->d.sheet.n] = ph;
    day_item(&a->d, kind, name);
}

static void put_samples(struct any *a, unsigned n)
{
    char name[16];

    while (n-- > 0) {
        const size_t i = a->d.sheet.n;
        const double before = a->ph[i - 1];
        double ph;

        do
            ph = 2.0 + 9 * draw(a);
        while (ph > before - 0.4 && ph < before + 0.4);
        snprintf(name, sizeof name, "s%zu", i);
        put(a, below(a, 8) == 0 ? SM_ITEM_BLANK : SM_ITEM_SAMPLE, name, ph);
        if (below(a, 6) == 0)
            put(a, SM_ITEM_DUPLICATE, name, ph);
    }
}

/* A row of standards in any order, now and then with a wrong one in it, then checks and samples. */
static void put_block(struct any *a)
{
    static const char *const name[] = { "B1", "B4", "B7", "B9", "B10" };
    static const double ph[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };
    unsigned order[] = { 0, 1, 2, 3, 4 };

    for (unsigned i = 4; i > 0; i--) {
        const unsigned k = below(a, i + 1), swap = order[i];

        order[i] = order[k];
        order[k] = swap;
    }
    for (unsigned i = 0; i < 5; i++)
        put(a, SM_ITEM_STANDARD, name[order[i]],
            ph[order[i]] + (below(a, 40) == 0 ? 0.7 * draw(a) : 0));
    for (unsigned i = 0; i < 2; i++) {
        put(a, SM_ITEM_CHECK, "C7", 7.02);
        put_samples(a, 1 + below(a, 4));
    }
    put(a, SM_ITEM_CHECK, "C7", below(a, 4) == 0 ? 7.25 : 7.02);
    if (below(a, 4) == 0) {
        put(a, SM_ITEM_CHECK, "B4", below(a, 3) == 0 ? 4.3 : 4.0);
        put_samples(a, 1);
    }
}

static void begin_day(struct any *a, uint64_t seed)
{
    memset(a, 0, sizeof *a);
    a->seed = a->state = seed;
    a->at = a->was = NOWHERE;
    day_setup(&a->d);
    a->d.seed = seed;
    a->d.look = look;
    a->d.look_arg = a;
    put_block(a);
    if (below(a, 3) == 0)
        put_block(a);
}

static void is_in(struct any *a, int beaker)
{
    a->was = a->at;
    a->at = beaker;
    a->since_us = a->settle_us = now_us(a);
    tell(a, "the probe is in", beaker + 1);
}

/* The probe stays where it is. */
static void stay(struct any *a, double s)
{
    day_in(&a->d, a->at == NOWHERE ? day_mv(4.5) : mv_of(a, a->at), s);
}

static void stay_long_enough(struct any *a)
{
    const double stayed = 1e-6 * (double)(now_us(a) - a->settle_us);

    if (a->at != NOWHERE && stayed < BEAKER_S)
        stay(a, BEAKER_S - stayed);
}

static bool alike(const struct any *a, int one, int two)
{
    return one != NOWHERE && two != NOWHERE && fabs(a->ph[one] - a->ph[two]) < 0.1;
}

enum way { WAY_AIR, WAY_OPEN, WAY_RINSE, WAY_STEP, WAY_COUNT };

static void go(struct any *a, int beaker, enum way way)
{
    stay_long_enough(a);
    if (beaker == a->at)
        return;
    if (alike(a, beaker, a->at)) /* in one step: nothing could be seen */
        way = WAY_AIR;
    if (way != WAY_STEP) {
        is_in(a, NOWHERE);
        if (way == WAY_OPEN)
            day_open(&a->d, 0.5 + draw(a));
        else
            day_air(&a->d, 1.0 + draw(a));
        if (way == WAY_RINSE)
            day_in(&a->d, day_mv(6.5), 1.4);
    }
    is_in(a, beaker);
    stay(a, 0.3);
}

/* ---- the person ---- */

/* Index of the item whose turn it is. */
static int turn(const struct any *a)
{
    static struct sm_carried c;

    sm_core_carried(a->d.core, &c);
    return (int)c.run.next;
}

static bool done(const struct any *a)
{
    return turn(a) >= (int)a->d.sheet.n;
}

/* Only where the screen's next item or the present one is where the probe is. */
static void press(struct any *a, bool key)
{
    if (a->at == NOWHERE || a->at != turn(a))
        return;
    if (key) {
        a->d.key = true;
        stay(a, 0.1);
    } else {
        day_act(&a->d, SM_ACT_NEXT, "");
    }
    a->settle_us = now_us(a);
}

/* On to the beaker that the screen wants, as it wants it. */
static void follow(struct any *a)
{
    go(a, turn(a), (enum way)below(a, a->plain ? WAY_STEP : WAY_COUNT));
    if (below(a, 2) == 0)
        stay(a, 0.2 + 2 * draw(a));
    if (below(a, 3) > 0)
        press(a, !a->plain && below(a, 4) == 0);
    if (below(a, 8) == 0)
        press(a, false);
}

/* On to the beaker behind, without a look at the screen; maybe with the meter's key. */
static void wander(struct any *a)
{
    if (a->at == NOWHERE || a->at + 1 >= (int)a->d.sheet.n || a->at + 1 < turn(a) ||
        a->d.sheet.item[a->at + 1].kind == SM_ITEM_DUPLICATE)
        return;
    go(a, a->at + 1, (enum way)below(a, WAY_COUNT));
    if (below(a, 3) == 0) {
        a->d.key = true;
        stay(a, 0.1);
        a->settle_us = now_us(a);
    }
}

/* Time passes unseen; the person may go on, or stay. */
static void unseen(struct any *a)
{
    const int to[] = { a->at, turn(a), NOWHERE };

    is_in(a, to[below(a, 3)]);
    a->d.mv = a->at == NOWHERE ? day_mv(4.5) : mv_of(a, a->at);
}

static void skip_one(struct any *a)
{
    const bool late = below(a, 2) == 0 && turn(a) + 1 < (int)a->d.sheet.n;

    if (late) { /* the probe is in the one behind already */
        go(a, turn(a) + 1, (enum way)below(a, WAY_STEP));
        stay(a, draw(a));
    }
    day_act(&a->d, SM_ACT_SKIP, "broken");
    a->settle_us = now_us(a);
}

/* Its value changes in one step, and not again within the dwell: two such are a transit. */
static void disturb(struct any *a)
{
    if (a->at == NOWHERE)
        return;
    stay_long_enough(a);
    a->ph[a->at] += below(a, 2) == 0 ? 0.2 : -0.2;
    a->settle_us = now_us(a);
    stay(a, 6 * draw(a));
}

static void lift(struct any *a)
{
    if (a->at == NOWHERE || a->at != turn(a)) /* not out of a beaker that was measured */
        return;
    day_open(&a->d, 0.3);
    a->settle_us = now_us(a);
    stay(a, 0.2 + 3 * draw(a)); /* so that a reading has shown it */
}

static void rest(struct any *a)
{
    day_act(&a->d, SM_ACT_PAUSE, "");
    stay(a, 4 * draw(a));
    unseen(a);
    stay(a, 6 * draw(a));
    day_act(&a->d, SM_ACT_RESUME, "");
    a->settle_us = now_us(a);
}

static void suspend(struct any *a)
{
    struct sm_input in = { .kind = SM_INPUT_CLOCK };

    in.clock_what = SM_CLOCK_SUSPEND;
    in.clock_by_us = 60 * 1000000;
    a->d.t_ns += 60 * SM_NS_PER_S;
    unseen(a);
    day_feed(&a->d, &in);
}

static void other_sheet(struct any *a)
{
    const int64_t run = a->run;

    stay(a, 1);
    a->at = NOWHERE; /* its beaker is none of the new sheet */
    a->was = NOWHERE;
    day_act(&a->d, SM_ACT_SHEET, "");
    assert_true(day_last(&a->d, SM_EVENT_ANSWER)->good);
    a->run = run + 1;
    is_in(a, NOWHERE);
    stay(a, 2);
}

static void roll(struct any *a, bool cut)
{
    if (!(cut ? sm_core_may_cut(a->d.core) : sm_core_may_roll(a->d.core)))
        return;
    day_roll(&a->d);
    a->files++;
    a->moved_n = 0;
}

static void trouble(struct any *a)
{
    switch (below(a, 8)) {
    case 0:
        day_nothing(&a->d, 11 + 20 * draw(a));
        unseen(a);
        break;
    case 1:
        day_link(&a->d, false);
        day_nothing(&a->d, 20 * draw(a));
        unseen(a);
        day_link(&a->d, true);
        break;
    case 2:
        unseen(a);
        day_restart(&a->d, 1000 * draw(a));
        a->moved_n = 0;
        break;
    case 3:
        roll(a, true);
        break;
    case 4:
        rest(a);
        break;
    case 5:
        suspend(a);
        break;
    case 6:
        skip_one(a);
        break;
    case 7:
        if (below(a, 4) == 0)
            other_sheet(a);
        break;
    }
}

static void one_step(struct any *a)
{
    static const enum sm_act_kind harmless[] = { SM_ACT_NOTE, SM_ACT_ANALYST, SM_ACT_TEMPERATURE,
                                                 SM_ACT_REDO, SM_ACT_SIGN,    SM_ACT_RESUME };
    const unsigned what = below(a, 20);

    if (what < 10)
        follow(a);
    else if (what == 10)
        stay(a, 10 * draw(a));
    else if (what == 11)
        day_bytes(&a->d, below(a, 2) == 0 ? "rubbish\r\n" : "\x80\xff 12.0 ab\r\n");
    else if (what == 12)
        day_act(&a->d, harmless[below(a, COUNT(harmless))], below(a, 2) == 0 ? "" : "anna");
    else if (a->plain)
        stay(a, 6);
    else if (what == 13)
        wander(a);
    else if (what == 14)
        disturb(a);
    else if (what == 15)
        lift(a);
    else
        trouble(a);
}

static void play(struct any *a)
{
    day_start(&a->d, false);
    day_act(&a->d, SM_ACT_SHEET, "");
    a->run = 1;
    stay(a, 2 + 8 * draw(a));
    for (unsigned i = 0; i < STEPS && !done(a); i++) {
        one_step(a);
        if (a->rolls && (a->seed * 31 + i) % 5 == 0)
            roll(a, false);
    }
    day_stop(&a->d);
}

static void no_beaker_gets_anothers_value_and_no_result_is_free_without_its_check(void **state)
{
    unsigned captures = 0, given = 0, released = 0, held = 0;

    (void)state;
    for (uint64_t seed = 1; seed <= SEEDS; seed++) {
        if (only != 0)
            seed = only;
        begin_day(&any, seed);
        play(&any);
        captures += any.captures;
        given += any.given;
        released += any.released;
        held += any.held;
        if (only != 0)
            return;
    }
    print_message("    seeds 1 to %d: %u captures, %u given to items, %u releases, %u holds\n",
                  SEEDS, captures, given, released, held);
    assert_true(given > 20 * SEEDS / 10 && released > SEEDS / 10 && held > SEEDS / 20);
}

/* What is compared of a day that was cut into files: not numbers and times. */
static bool is_verdict(enum sm_event_kind k)
{
    return k == SM_EVENT_CAPTURE || k == SM_EVENT_CURVE || k == SM_EVENT_CHECK ||
           k == SM_EVENT_RESULT || k == SM_EVENT_HOLD || k == SM_EVENT_RELEASE ||
           k == SM_EVENT_QUESTION;
}

static const struct day_kept *next_verdict(const struct day *d, size_t *at)
{
    while (*at < d->kept && !is_verdict(d->event[*at].kind))
        ++*at;
    return *at < d->kept ? &d->event[(*at)++] : NULL;
}

/* The largest difference of two captures, in tolerances. */
static double compare_days(const struct any *whole, const struct any *cut)
{
    double largest = 0;
    size_t i = 0, k = 0;

    for (;;) {
        const struct day_kept *w = next_verdict(&whole->d, &i), *c = next_verdict(&cut->d, &k);

        if (w == NULL && c == NULL)
            return largest;
        if (w == NULL || c == NULL || w->kind != c->kind || w->has_where != c->has_where ||
            w->item != c->item || w->good != c->good || w->state != c->state)
            BROKEN(whole, "whole: %s of item %zu, cut into %u files: %s of item %zu",
                   w == NULL ? "nothing" : sm_event_kind_name(w->kind), w == NULL ? 0 : w->item,
                   cut->files + 1, c == NULL ? "nothing" : sm_event_kind_name(c->kind),
                   c == NULL ? 0 : c->item);
        if (w->kind != SM_EVENT_CAPTURE)
            continue;
        if (!(fabs(w->value - c->value) <= 0.6)) /* the tolerance, in mV */
            BROKEN(whole, "capture of item %zu: %.4f, cut into files %.4f", w->item, w->value,
                   c->value);
        largest = fmax(largest, fabs(w->value - c->value) / 0.6);
    }
}

static void a_day_cut_into_files_gives_the_same_verdicts(void **state)
{
    static struct any whole;
    unsigned captures = 0, files = 0;
    double largest = 0;

    (void)state;
    for (uint64_t seed = only != 0 ? only : 1; seed <= (only != 0 ? only : SEEDS / 2); seed++) {
        begin_day(&whole, seed);
        whole.plain = true;
        play(&whole);
        begin_day(&any, seed);
        any.plain = any.rolls = true;
        play(&any);
        largest = fmax(largest, compare_days(&whole, &any));
        captures += whole.captures;
        files += any.files;
    }
    print_message("    seeds 1 to %d: %u captures, %u changes of file, values differ by at most "
                  "%.2f tolerances\n",
                  SEEDS / 2, captures, files, largest);
    assert_true(files > SEEDS);
}

/* A seed as argument: that day alone, told. */
int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(no_beaker_gets_anothers_value_and_no_result_is_free_without_its_check),
        cmocka_unit_test(a_day_cut_into_files_gives_the_same_verdicts),
    };

    only = argc > 1 ? strtoull(argv[1], NULL, 10) : 0;
    return cmocka_run_group_tests(tests, NULL, NULL);
}
