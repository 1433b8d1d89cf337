/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_ask.c: when which question is asked and whose answer a line is, as tables of steps with
 * times. */
#include "check.h"

#include "base/time.h"
#include "reading/ask.h"

enum step_kind { END, UP, DOWN, TICK, SENT, LINE, DEADLINE, OPEN };

struct step {
    enum step_kind kind;
    int ms;       /* when */
    int want;     /* TICK: kind asked; LINE: whose; DEADLINE: ms or NONE; OPEN: 0 or 1 */
    int first_ms; /* LINE: time of its first byte; TICK: 1 = a limit passed */
};

#define NONE (-1)
#define STEPS_MAX 24

static struct sm_profile profile(bool asks, bool identity)
{
    struct sm_profile p = { 0 };

    if (asks)
        p.ask = (struct sm_question){
            .text = "R\r", .n = 2, .every_ns = 1000 * SM_NS_PER_MS, .within_ns = 600 * SM_NS_PER_MS
        };
    if (identity)
        p.identity = (struct sm_question){ .text = "I\r", .n = 2, .within_ns = 300 * SM_NS_PER_MS };
    return p;
}

static void check_step(const char *name, size_t i, struct sm_asker *a, struct step s)
{
    const int64_t t_ns = s.ms * SM_NS_PER_MS;
    bool timed_out = false;
    int got = s.want;

    switch (s.kind) {
    case END:
        break;
    case UP:
    case DOWN:
        sm_asker_link(a, t_ns, s.kind == UP);
        break;
    case TICK:
        got = (int)sm_asker_tick(a, t_ns, &timed_out);
        if (timed_out != (s.first_ms == 1))
            fail_msg("%s, step %zu at %d ms: timed out %d", name, i, s.ms, timed_out);
        break;
    case SENT:
        sm_asker_sent(a, t_ns);
        break;
    case LINE:
        got = (int)sm_asker_line(a, t_ns, s.first_ms * SM_NS_PER_MS);
        break;
    case DEADLINE: {
        const int64_t due_t_ns = sm_asker_deadline(a);

        got = due_t_ns == SM_NEVER ? NONE : (int)(due_t_ns / SM_NS_PER_MS);
        break;
    }
    case OPEN:
        got = sm_asker_open(a);
        break;
    }
    if (got != s.want)
        fail_msg("%s, step %zu at %d ms: got %d, want %d", name, i, s.ms, got, s.want);
}

static void questions_and_answers_by_the_clock(void **state)
{
    static const struct {
        const char *name;
        bool asks, identity;
        struct step step[STEPS_MAX];
    } cases[] = {
        { "nothing before the link is up",
          true,
          true,
          { { DEADLINE, 0, NONE, 0 }, { TICK, 5, SM_ASK_NONE, 0 }, { OPEN, 5, 0, 0 } } },
        { "a meter that sends by itself is never asked",
          false,
          false,
          { { UP, 0, 0, 0 },
            { DEADLINE, 0, NONE, 0 },
            { TICK, 9000, SM_ASK_NONE, 0 },
            { LINE, 9100, SM_ANSWER_STREAM, 9050 } } },
        { "identity first, then a reading at once, then every second",
          true,
          true,
          { { UP, 100, 0, 0 },
            { DEADLINE, 0, 100, 0 },
            { TICK, 100, SM_ASK_IDENTITY, 0 },
            { TICK, 100, SM_ASK_NONE, 0 },
            { OPEN, 100, 1, 0 },
            { DEADLINE, 0, NONE, 0 }, /* until it is sent */
            { SENT, 110, 0, 0 },
            { DEADLINE, 0, 410, 0 },
            { LINE, 200, SM_ANSWER_IDENTITY, 190 },
            { OPEN, 200, 0, 0 },
            { DEADLINE, 0, 110, 0 },
            { TICK, 200, SM_ASK_READING, 0 },
            { SENT, 205, 0, 0 },
            { LINE, 300, SM_ANSWER_READING, 290 },
            { DEADLINE, 0, 1205, 0 }, /* after the last was sent */
            { TICK, 1204, SM_ASK_NONE, 0 },
            { TICK, 1205, SM_ASK_READING, 0 },
            { TICK, 1205, SM_ASK_NONE, 0 } } },
        { "a late answer is unread and frees the line",
          true,
          false,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 1, 0, 0 },
            { DEADLINE, 0, 601, 0 },
            { TICK, 600, SM_ASK_NONE, 0 },
            { TICK, 601, SM_ASK_NONE, 1 }, /* timed out */
            { TICK, 601, SM_ASK_NONE, 0 }, /* said once */
            { OPEN, 601, 1, 0 },
            { DEADLINE, 0, 1201, 0 },
            { TICK, 1001, SM_ASK_NONE, 0 }, /* due, but its answer may still come */
            { LINE, 1100, SM_ANSWER_LATE, 1090 },
            { OPEN, 1100, 0, 0 },
            { TICK, 1100, SM_ASK_READING, 0 },
            { SENT, 1101, 0, 0 },
            { LINE, 1150, SM_ANSWER_READING, 1140 } } },
        { "after one further limit it is asked again",
          true,
          false,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 0, 0, 0 },
            { TICK, 600, SM_ASK_NONE, 1 },
            { TICK, 1199, SM_ASK_NONE, 0 },
            { TICK, 1200, SM_ASK_READING, 0 },
            { LINE, 1205, SM_ANSWER_UNASKED, 1204 }, /* before the new one is sent */
            { SENT, 1210, 0, 0 },
            { LINE, 1220, SM_ANSWER_UNASKED, 1208 }, /* begun before it was sent */
            { OPEN, 1220, 1, 0 },
            { LINE, 1230, SM_ANSWER_READING, 1225 } } },
        { "one tick long after both limits says so and asks",
          true,
          false,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 0, 0, 0 },
            { TICK, 5000, SM_ASK_READING, 1 } } },
        { "what nobody asked for, before the first question and after the answer",
          true,
          false,
          { { UP, 0, 0, 0 },
            { LINE, 0, SM_ANSWER_UNASKED, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 10, 0, 0 },
            { LINE, 50, SM_ANSWER_READING, 40 },
            { LINE, 51, SM_ANSWER_UNASKED, 50 } } },
        { "bytes of the very time of sent were there before it",
          true,
          false,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 10, 0, 0 },
            { LINE, 20, SM_ANSWER_UNASKED, 10 },
            { LINE, 20, SM_ANSWER_READING, 11 } } },
        { "a line at the limit is late whether or not a tick said so",
          true,
          false,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_READING, 0 },
            { SENT, 0, 0, 0 },
            { LINE, 600, SM_ANSWER_LATE, 500 },
            { TICK, 999, SM_ASK_NONE, 0 },
            { TICK, 1000, SM_ASK_READING, 0 } } },
        { "no answer to the identity question: readings after twice its limit",
          true,
          true,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_IDENTITY, 0 },
            { SENT, 0, 0, 0 },
            { TICK, 300, SM_ASK_NONE, 1 },
            { DEADLINE, 0, 600, 0 },
            { TICK, 600, SM_ASK_READING, 0 } } },
        { "a link that goes forgets the question; identity is asked anew",
          true,
          true,
          { { UP, 0, 0, 0 },
            { TICK, 0, SM_ASK_IDENTITY, 0 },
            { SENT, 1, 0, 0 },
            { DOWN, 50, 0, 0 },
            { OPEN, 50, 0, 0 },
            { DEADLINE, 0, NONE, 0 },
            { TICK, 900, SM_ASK_NONE, 0 },
            { UP, 1000, 0, 0 },
            { LINE, 1000, SM_ANSWER_UNASKED, 1000 },
            { TICK, 1000, SM_ASK_IDENTITY, 0 } } },
        { "identity of a meter that sends by itself",
          false,
          true,
          { { UP, 0, 0, 0 },
            { LINE, 1, SM_ANSWER_STREAM, 0 },
            { TICK, 1, SM_ASK_IDENTITY, 0 },
            { LINE, 2, SM_ANSWER_STREAM, 1 }, /* not sent yet */
            { SENT, 3, 0, 0 },
            { LINE, 9, SM_ANSWER_STREAM, 2 }, /* begun before */
            { LINE, 20, SM_ANSWER_IDENTITY, 10 },
            { LINE, 30, SM_ANSWER_STREAM, 25 },
            { DEADLINE, 0, NONE, 0 } } },
        { "sent without a question changes nothing",
          true,
          false,
          { { UP, 0, 0, 0 },
            { SENT, 400, 0, 0 },
            { DEADLINE, 0, 0, 0 },
            { TICK, 400, SM_ASK_READING, 0 } } },
    };
    (void)state;
    for (size_t c = 0; c < COUNT(cases); c++) {
        const struct sm_profile p = profile(cases[c].asks, cases[c].identity);
        struct sm_asker a;

        sm_asker_init(&a, &p);
        for (size_t i = 0; i < STEPS_MAX && cases[c].step[i].kind != END; i++)
            check_step(cases[c].name, i, &a, cases[c].step[i]);
    }
}

static void unanswered_are_counted_in_a_row(void **state)
{
    const struct sm_profile p = profile(true, false);
    struct sm_asker a;
    bool timed_out;
    (void)state;
    sm_asker_init(&a, &p);
    sm_asker_link(&a, 0, true);
    for (int i = 0; i < 3; i++) {
        const int64_t t_ns = i * 2 * SM_NS_PER_S;

        assert_int_equal(sm_asker_tick(&a, t_ns, &timed_out), SM_ASK_READING);
        sm_asker_sent(&a, t_ns);
        (void)sm_asker_tick(&a, t_ns + SM_NS_PER_S, &timed_out);
        assert_true(timed_out);
        assert_int_equal(a.unanswered, i + 1);
    }
    (void)sm_asker_tick(&a, 6 * SM_NS_PER_S, &timed_out);
    sm_asker_sent(&a, 6 * SM_NS_PER_S);
    assert_int_equal(sm_asker_line(&a, 6 * SM_NS_PER_S + 2, 6 * SM_NS_PER_S + 1),
                     SM_ANSWER_READING);
    assert_int_equal(a.unanswered, 0);
}

static void the_last_times_do_not_overflow(void **state)
{
    const struct sm_profile p = profile(true, false);
    struct sm_asker a;
    bool timed_out;
    (void)state;
    sm_asker_init(&a, &p);
    sm_asker_link(&a, INT64_MAX - 10, true);
    assert_int_equal(sm_asker_tick(&a, INT64_MAX - 10, &timed_out), SM_ASK_READING);
    sm_asker_sent(&a, INT64_MAX - 9);
    assert_true(sm_asker_deadline(&a) == SM_NEVER);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(questions_and_answers_by_the_clock),
                                        cmocka_unit_test(unanswered_are_counted_in_a_row),
                                        cmocka_unit_test(the_last_times_do_not_overflow) };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
