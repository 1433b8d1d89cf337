/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A log run again is compared entry by entry: what was changed in it is found, told once, and the
 * rest still compared. The log is the demonstration's, made in memory. */
#include "log_maker.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "view/rerun.h"

#define UTC_US INT64_C(1796112000000000)

static char *log_text; /* the demonstration's log */
static size_t log_n;

static void play_demonstration(struct log_maker *m, struct sm_scenario *sc)
{
    struct sm_blame list[1];
    struct sm_blames b;
    struct sm_sim *sim;
    size_t n, sheet_n;
    char *text = check_read_file("tests/sim/scenarios/try.scn", &n);
    char *sheet = check_read_file("conf/sheets/try.yaml", &sheet_n);

    sm_blames_init(&b, list, 1);
    sm_scenario_init(sc);
    assert_int_equal(sm_scenario_read(sc, "try.scn", text, n, &b), SM_OK);
    assert_int_equal(sm_sim_create(sc, &sim), SM_OK);
    log_maker_open(m);
    log_maker_act(m, SM_ACT_ANALYST, "try");
    log_maker_sheet(m, "sheets/try.yaml", sheet, sheet_n);
    log_maker_play(m, sim, SM_NEVER);
    sm_sim_destroy(sim);
    free(text);
    free(sheet);
}

static int make_log(void **state)
{
    struct log_maker m;
    struct sm_scenario sc;

    (void)state;
    log_maker_prepare(&m, "conf/try.yaml", "try", UTC_US);
    play_demonstration(&m, &sc);
    log_maker_end(&m);
    log_text = m.file[0].text;
    log_n = m.file[0].n;
    m.file[0].text = NULL;
    log_maker_finish(&m);
    sm_scenario_free(&sc);
    return 0;
}

static int free_log(void **state)
{
    (void)state;
    free(log_text);
    return 0;
}

/* What was told, one line after the other. */
static char told_lines[20000];

static void tell(void *arg, const char *line)
{
    (void)arg;
    snprintf(told_lines + strlen(told_lines), sizeof told_lines - strlen(told_lines), "%s\n", line);
}

static struct sm_rerun_told rerun(const char *text, size_t n)
{
    const struct sm_rerun_ask ask = { .text = text, .n = n, .tell = tell, .most_told = 20 };
    struct sm_rerun_told told;

    told_lines[0] = '\0';
    if (sm_rerun(&ask, &told) != SM_OK)
        fail_msg("cannot be run again: %s", told.why);
    free(told.last);
    told.last = NULL;
    return told;
}

/* The log with the first `old` after the first `after` replaced by `new`. To be freed. */
static char *change(const char *after, const char *old, const char *new, size_t *ret_n)
{
    char *at = memmem(log_text, log_n, after, strlen(after)), *out;
    size_t before;

    assert_non_null(at);
    at = memmem(at, log_n - (size_t)(at - log_text), old, strlen(old));
    assert_non_null(at);
    before = (size_t)(at - log_text);
    *ret_n = log_n - strlen(old) + strlen(new);
    out = malloc(*ret_n);
    assert_non_null(out);
    memcpy(out, log_text, before);
    memcpy(out + before, new, strlen(new));
    memcpy(out + before + strlen(new), at + strlen(old), log_n - before - strlen(old));
    return out;
}

static void untouched_it_has_no_difference(void **state)
{
    const struct sm_rerun_told t = rerun(log_text, log_n);

    (void)state;
    assert_int_equal(t.differences, 0);
    assert_int_equal(t.how, SM_COMPARE_BYTES);
    assert_string_equal(t.meter, "try");
    assert_true(t.inputs > 1000 && t.events > 100 && t.passed_over == 0);
}

static void one_changed_digit_is_one_difference_told_with_both_values(void **state)
{
    size_t n;
    char *text = change("\"k\":\"result\"", "\"value\":7.3", "\"value\":7.4", &n);
    const struct sm_rerun_told t = rerun(text, n);

    (void)state;
    assert_int_equal(t.differences, 1);
    if (strstr(told_lines, "value: logged 7.4") == NULL || strstr(told_lines, "again 7.3") == NULL)
        fail_msg("told: %s", told_lines);
    free(text);
}

static void a_changed_state_in_carried_is_a_difference(void **state)
{
    size_t n;
    char *text = change("\"k\":\"carried\"", "\"captures\":1", "\"captures\":2", &n);

    (void)state;
    assert_int_equal(rerun(text, n).differences, 1);
    if (strstr(told_lines, "captures") == NULL)
        fail_msg("told: %s", told_lines);
    free(text);
}

/* From just behind the newline before `what` to its own: one line. */
static void line_around(const char *what, size_t *ret_from, size_t *ret_n)
{
    const char *at = memmem(log_text, log_n, what, strlen(what)), *from = at, *to = at;

    assert_non_null(at);
    while (from > log_text && from[-1] != '\n')
        from--;
    while (*to++ != '\n')
        ;
    *ret_from = (size_t)(from - log_text);
    *ret_n = (size_t)(to - from);
}

static void an_event_left_out_of_the_log_is_told_and_the_rest_compared(void **state)
{
    size_t from, n;
    char *text = malloc(log_n);
    struct sm_rerun_told t;

    (void)state;
    assert_non_null(text);
    line_around("\"k\":\"transit\"", &from, &n);
    memcpy(text, log_text, from);
    memcpy(text + from, log_text + from + n, log_n - from - n);
    t = rerun(text, log_n - n);
    /* the transit meets the `moved` after it, which is then the one too many */
    assert_in_range(t.differences, 1, 2);
    free(text);
}

static void an_event_that_never_was_is_told_and_the_rest_compared(void **state)
{
    size_t from, n;
    char *text = malloc(2 * log_n);

    (void)state;
    assert_non_null(text);
    line_around("\"k\":\"capture\"", &from, &n);
    /* the capture once more */
    memcpy(text, log_text, from + n);
    memcpy(text + from + n, log_text + from, log_n - from);
    /* it meets the `carried` that follows the capture, which is then the one too many */
    assert_int_equal(rerun(text, log_n + n).differences, 2);
    if (strstr(told_lines, "does not come out now") == NULL)
        fail_msg("told: %s", told_lines);
    free(text);
}

static void other_rules_are_run_to_the_end_and_give_other_events(void **state)
{
    size_t method_n;
    char *method = check_read_file("conf/methods/try-ph.yaml", &method_n), *other, *at;
    struct sm_rerun_ask ask = {
        .text = log_text, .n = log_n, .tell = tell, .most_told = 20, .method_name = "try-ph.yaml"
    };
    struct sm_rerun_told t;

    (void)state;
    /* a longer dwell: captures come later; and none at all where the stays are shorter */
    other = strdup(method);
    assert_non_null(other);
    at = strstr(other, "dwell: 3 s");
    assert_non_null(at);
    at[7] = '4';
    ask.method_text = other;
    ask.method_n = method_n;
    told_lines[0] = '\0';
    if (sm_rerun(&ask, &t) != SM_OK)
        fail_msg("cannot be run: %s", t.why);
    assert_true(t.differences > 15);
    free(t.last);
    at[7] = '1'; /* and a shorter one: more events than were logged */
    if (sm_rerun(&ask, &t) != SM_OK)
        fail_msg("cannot be run: %s", t.why);
    assert_true(t.differences > 15);
    free(t.last);
    free(other);
    free(method);
}

static void rules_that_replace_nothing_are_refused(void **state)
{
    struct sm_rerun_ask ask = { .text = log_text,
                                .n = log_n,
                                .tell = tell,
                                .most_told = 20,
                                .method_name = "other.yaml",
                                .method_text = "measures: pH\n",
                                .method_n = 13 };
    struct sm_rerun_told t;

    (void)state;
    assert_int_equal(sm_rerun(&ask, &t), SM_ESYNTAX);
    assert_non_null(strstr(t.why, "no method file of that name"));
    free(t.last);
}

/* The log's first file may be anything that was stamped: at every stamp it can be cut. */
static void cut_at_any_stamp_it_runs_again_without_a_difference(void **state)
{
    size_t cuts = 0;

    (void)state;
    for (const char *at = log_text; at != NULL;) {
        const char *stamp = memmem(at, log_n - (size_t)(at - log_text), "\"k\":\"stamp\"", 11);
        struct sm_rerun_told t;

        if (stamp == NULL)
            break;
        at = memchr(stamp, '\n', log_n - (size_t)(stamp - log_text));
        assert_non_null(at);
        at++;
        if (cuts++ % 7 != 0)
            continue;
        t = rerun(log_text, (size_t)(at - log_text));
        if (t.differences > 0)
            fail_msg("cut after %zu bytes: %s", (size_t)(at - log_text), told_lines);
    }
    assert_true(cuts > 100);
}

static void a_sheet_refused_for_several_things_is_refused_alike(void **state)
{
    static const char bad[] = "method: nobody\nsensor: simulated\nitems:\n  - { standard: B99 }\n";
    struct sm_input in = { .kind = SM_INPUT_ACT };
    struct log_maker m;
    struct sm_rerun_told t;

    (void)state;
    log_maker_begin(&m, "conf/try.yaml", "try", UTC_US);
    in.act.act = SM_ACT_SHEET;
    sm_text_copy(in.act.sheet_file, sizeof in.act.sheet_file, "bad.yaml");
    sm_text_copy(in.act.sheet_why, sizeof in.act.sheet_why,
                 "bad.yaml:1:9: one thing; bad.yaml:4:17: another"); /* as the daemon put it */
    in.act.sheet_text = bad;
    in.act.sheet_text_n = sizeof bad - 1;
    log_maker_feed_act(&m, &in);
    assert_false(m.done);
    log_maker_end(&m);
    t = rerun(m.file[0].text, m.file[0].n);
    if (t.differences > 0)
        fail_msg("%s", told_lines);
    log_maker_finish(&m);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(untouched_it_has_no_difference),
        cmocka_unit_test(one_changed_digit_is_one_difference_told_with_both_values),
        cmocka_unit_test(a_changed_state_in_carried_is_a_difference),
        cmocka_unit_test(an_event_left_out_of_the_log_is_told_and_the_rest_compared),
        cmocka_unit_test(an_event_that_never_was_is_told_and_the_rest_compared),
        cmocka_unit_test(other_rules_are_run_to_the_end_and_give_other_events),
        cmocka_unit_test(rules_that_replace_nothing_are_refused),
        cmocka_unit_test(cut_at_any_stamp_it_runs_again_without_a_difference),
        cmocka_unit_test(a_sheet_refused_for_several_things_is_refused_alike),
    };

    return cmocka_run_group_tests(tests, make_log, free_log);
}
