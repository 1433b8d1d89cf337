/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_stillmark_acts.c: what `stillmark next` and its like tell a daemon, and what they make of
 * its answers. */
#include "stillmark_acts.h"

#include <jansson.h>
#include <string.h>

#include "capture_output.h"
#include "fake_daemon.h"
#include "scratch.h"
#include "stillmark_talk.h"

#define STATUS                                                                                     \
    "{\"t\":1,\"k\":\"status\",\"meter\":\"bench-2\",\"meters\":1,\"seen\":41,\"sentence\":"       \
    "\"Waiting for the first reading.\"}\n"
#define DONE "{\"n\":43,\"t\":1,\"k\":\"answer\",\"act\":42,\"id\":\"$ID\",\"done\":true}\n"
#define REFUSED                                                                                    \
    "{\"n\":43,\"k\":\"answer\",\"act\":42,\"id\":\"$ID\",\"done\":false,\"why\":\"something is "  \
    "new since entry 41: entry 44; look, then say it again\"}\n"

static const struct fake_rule says_done[] = { { "\"k\":\"status\"", STATUS, false },
                                              { "\"k\":\"act\"", DONE, false },
                                              { NULL, NULL, false } };

static enum sm_act_kind act_run;

static int run_act(int argc, char **argv)
{
    return sm_stillmark_act(act_run, argc, argv);
}

struct told {
    int status;
    char *out, *err;
    struct fake_daemon *daemon; /* ended; NULL: there was none */
};

static void copy_words(const char *const *words, char **argv)
{
    size_t n = 0;

    for (; words[n] != NULL; n++) {
        argv[n] = strdup(words[n]);
        assert_non_null(argv[n]);
    }
    argv[n] = NULL;
}

/* Tells an act to a daemon of these rules (NULL: none is there). */
static struct told tell(const struct fake_rule *rules, enum sm_act_kind act,
                        const char *const *words)
{
    struct told told = { .daemon = rules != NULL ? fake_daemon_start(rules) : NULL };
    const char *path = rules != NULL ? fake_daemon_path(told.daemon) : "/tmp/stillmark-none/socket";
    char *argv[16];

    setenv("STILLMARK_SOCKET", path, 1);
    act_run = act;
    copy_words(words, argv);
    told.status = capture_run(run_act, argv, &told.out, &told.err);
    for (size_t i = 0; argv[i] != NULL; i++)
        free(argv[i]);
    if (told.daemon != NULL)
        fake_daemon_stop(told.daemon);
    return told;
}

static void forget(struct told *t)
{
    free(t->out);
    free(t->err);
    if (t->daemon != NULL)
        fake_daemon_destroy(t->daemon);
}

static void expect(const struct told *t, int status, const char *out, const char *err)
{
    if (t->status != status || strcmp(t->out, out) != 0 || strcmp(t->err, err) != 0)
        fail_msg("got %d\n  out: %s  err: %s  want %d\n  out: %s  err: %s", t->status, t->out,
                 t->err, status, out, err);
}

/* The act that was told, as an object; there is exactly one. */
static json_t *act_of(const struct told *t)
{
    const char *line = strstr(fake_daemon_heard(t->daemon), "{\"k\":\"act\"");
    json_error_t e;
    json_t *o;

    if (line == NULL)
        fail_msg("no act was told: %s", fake_daemon_heard(t->daemon));
    assert_null(strstr(line + 1, "{\"k\":\"act\""));
    o = json_loadb(line, strcspn(line, "\n"), JSON_REJECT_DUPLICATES, &e);
    assert_non_null(o);
    return o;
}

static const char *word(const json_t *o, const char *key)
{
    const char *s = json_string_value(json_object_get(o, key));

    return s != NULL ? s : "";
}

#define WORDS(...) ((const char *const[]){ __VA_ARGS__, NULL })
#define NO_WORDS ((const char *const[]){ NULL })

static void an_act_is_told_with_what_its_sender_has_seen(void **state)
{
    struct told t = tell(says_done, SM_ACT_NEXT, NO_WORDS);
    json_t *o = act_of(&t);

    (void)state;
    expect(&t, 0, "Done: next.\nbench-2: Waiting for the first reading.\n", "");
    assert_string_equal(word(o, "act"), "next");
    assert_string_equal(word(o, "meter"), "bench-2");
    assert_int_equal(json_integer_value(json_object_get(o, "seen")), 41);
    assert_int_equal(strspn(word(o, "id"), "0123456789abcdef"), 16);
    assert_int_equal(strlen(word(o, "id")), 16);
    assert_null(json_object_get(o, "who"));
    json_decref(o);
    forget(&t);
}

static void every_act_has_an_id_of_its_own(void **state)
{
    char first[32];
    struct told t = tell(says_done, SM_ACT_PAUSE, NO_WORDS);
    json_t *o = act_of(&t);

    (void)state;
    snprintf(first, sizeof first, "%s", word(o, "id"));
    json_decref(o);
    forget(&t);
    t = tell(says_done, SM_ACT_PAUSE, NO_WORDS);
    o = act_of(&t);
    assert_string_not_equal(first, word(o, "id"));
    json_decref(o);
    forget(&t);
}

static void what_is_typed_arrives_in_the_words_of_the_log(void **state)
{
    static const struct {
        enum sm_act_kind act;
        const char *words[8];
        const char *key, *want; /* as compact JSON */
    } cases[] = {
        { SM_ACT_NOTE, { "rinsed", "twice" }, "text", "\"rinsed twice\"" },
        { SM_ACT_NOTE, { "--", "--json", "said" }, "text", "\"--json said\"" },
        { SM_ACT_ANALYST, { "bench-a" }, "text", "\"bench-a\"" },
        { SM_ACT_SKIP, { "--why", "beaker broken" }, "why", "\"beaker broken\"" },
        { SM_ACT_SKIP, { "--why=x", "--who", "bench-b" }, "who", "\"bench-b\"" },
        { SM_ACT_NEXT, { "--seen", "12" }, "seen", "12" },
        { SM_ACT_NEXT, { "--id", "7f2c-19" }, "id", "\"7f2c-19\"" },
        { SM_ACT_VOID, { "61879" }, "of", "61879" },
        { SM_ACT_TEMPERATURE, { "10.5 °C" }, "temperature", "10.5" },
        { SM_ACT_TEMPERATURE, { "-2.5", "°C" }, "temperature", "-2.5" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct told t = tell(says_done, cases[i].act, cases[i].words);
        json_t *o;
        char *got;
        if (t.status != 0)
            fail_msg("case %zu: status %d: %s", i, t.status, t.err);
        o = act_of(&t);
        got = json_dumps(json_object_get(o, cases[i].key), JSON_COMPACT | JSON_ENCODE_ANY);
        if (got == NULL || strcmp(got, cases[i].want) != 0)
            fail_msg("case %zu: got %s, want %s", i, got, cases[i].want);
        free(got);
        json_decref(o);
        forget(&t);
    }
}

static void a_refused_act_says_why_and_exits_1(void **state)
{
    static const struct fake_rule rules[] = { { "\"k\":\"status\"", STATUS, false },
                                              { "\"k\":\"act\"", REFUSED, false },
                                              { NULL, NULL, false } };
    struct told t = tell(rules, SM_ACT_NEXT, NO_WORDS);

    (void)state;
    expect(&t, 1, "Refused: something is new since entry 41: entry 44; look, then say it again.\n",
           "");
    forget(&t);
    t = tell(rules, SM_ACT_NEXT, WORDS("--json", "--id", "a1"));
    expect(&t, 1,
           "{\"n\":43,\"k\":\"answer\",\"act\":42,\"id\":\"a1\",\"done\":false,\"why\":"
           "\"something is new since entry 41: entry 44; look, then say it again\"}\n",
           "");
    forget(&t);
}

static void answers_to_others_are_not_taken_for_ours(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\"", STATUS, false },
        { "\"k\":\"act\"",
          "{\"n\":1,\"k\":\"moved\",\"by\":\"mark\"}\n"
          "{\"n\":43,\"k\":\"answer\",\"act\":42,\"id\":\"other\",\"done\":false,\"why\":\"no\"}\n"
          "{\"k\":\"error\",\"id\":\"other\",\"why\":\"no\"}\n"
          "{\"k\":\"answer\",\"done\":false,\"why\":\"no\"}\n" DONE,
          false },
        { NULL, NULL, false }
    };
    struct told t = tell(rules, SM_ACT_RESUME, NO_WORDS);

    (void)state;
    expect(&t, 0, "Done: resume.\nbench-2: Waiting for the first reading.\n", "");
    forget(&t);
}

static void several_meters_and_none_named_exit_2_with_their_names(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\"",
          "{\"k\":\"status\",\"meter\":\"bench-1\",\"meters\":2}\n"
          "{\"k\":\"status\",\"meter\":\"bench-2\",\"meters\":2}\n",
          false },
        { NULL, NULL, false }
    };
    struct told t = tell(rules, SM_ACT_NEXT, NO_WORDS);

    (void)state;
    expect(&t, 2, "",
           "stillmark next: there are several meters; name one with --meter: bench-1, bench-2\n");
    assert_null(strstr(fake_daemon_heard(t.daemon), "\"act\""));
    forget(&t);
}

static void a_named_meter_is_the_one_asked_and_told(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\",\"meter\":\"bench-3\"",
          "{\"k\":\"error\",\"why\":\"no meter is called bench-3; there are: bench-1, bench-2\"}\n",
          false },
        { "\"k\":\"status\",\"meter\":\"bench-2\"", STATUS, false },
        { "\"k\":\"act\",\"meter\":\"bench-2\"", DONE, false },
        { NULL, NULL, false }
    };
    struct told t = tell(rules, SM_ACT_NEXT, WORDS("--meter", "bench-2"));

    (void)state;
    assert_int_equal(t.status, 0);
    forget(&t);
    t = tell(rules, SM_ACT_NEXT, WORDS("--meter=bench-3"));
    expect(&t, 2, "", "stillmark next: no meter is called bench-3; there are: bench-1, bench-2\n");
    forget(&t);
}

static void what_cannot_be_done_exits_2_in_one_line(void **state)
{
    static const struct {
        const char *name;
        struct fake_rule rules[3];
        const char *want; /* stands in standard error */
    } cases[] = {
        { "the log cannot be written",
          { { "\"k\":\"status\"", "{\"k\":\"status\",\"meter\":\"m\"}\n", false },
            { "\"k\":\"act\"",
              "{\"k\":\"error\",\"id\":\"$ID\",\"why\":\"the log of m cannot be "
              "written now\"}\n",
              false } },
          "stillmark next: the log of m cannot be written now\n" },
        { "closed instead of an answer",
          { { "\"k\":\"status\"", STATUS, false }, { "\"k\":\"act\"", NULL, true } },
          "whether it was done is not known: look at stillmark status\n" },
        { "closed at once", { { "\"k\":\"status\"", NULL, true } }, "closed the connection\n" },
        { "no JSON",
          { { "\"k\":\"status\"", "HTTP/1.1 400\x1b[2J Bad\n", false } },
          "what answers there is no stillmarkd: " },
        { "a list",
          { { "\"k\":\"status\"", "[1]\n", false } },
          "what answers there is no stillmarkd: " },
        { "the same key twice",
          { { "\"k\":\"status\"", "{\"k\":\"status\",\"k\":\"status\"}\n", false } },
          "what answers there is no stillmarkd: " },
        { "too deep",
          { { "\"k\":\"status\"", "{\"a\":[[[[[[[[[[[[[[[[[[[[]]]]]]]]]]]]]]]]]]]]}\n", false } },
          "what answers there is no stillmarkd: " },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct told t = tell(cases[i].rules, SM_ACT_NEXT, NO_WORDS);
        if (t.status != 2 || t.out[0] != '\0' || strstr(t.err, cases[i].want) == NULL ||
            strchr(t.err, '\x1b') != NULL || strchr(t.err, '\n') != t.err + strlen(t.err) - 1)
            fail_msg("%s: got %d, out \"%s\", err \"%s\", want \"%s\"", cases[i].name, t.status,
                     t.out, t.err, cases[i].want);
        forget(&t);
    }
}

static void a_line_without_end_is_not_waited_for(void **state)
{
    const size_t n = (size_t)3 * 1024 * 1024;
    char *endless = malloc(n + 1);
    struct fake_rule rules[] = { { "\"k\":\"status\"", endless, false }, { NULL, NULL, false } };
    const int64_t from = sm_talk_clock_ns();
    struct told t;

    (void)state;
    assert_non_null(endless);
    memset(endless, 'x', n);
    endless[n] = '\0';
    t = tell(rules, SM_ACT_NEXT, NO_WORDS);
    assert_int_equal(t.status, 2);
    assert_non_null(strstr(t.err, "sends a line without end"));
    assert_true(sm_talk_clock_ns() - from < SM_TALK_WAIT_NS);
    forget(&t);
    free(endless);
}

static void without_a_daemon_it_says_where_it_looked(void **state)
{
    struct told t = tell(NULL, SM_ACT_NEXT, NO_WORDS);

    (void)state;
    expect(&t, 2, "",
           "stillmark next: no daemon answers at /tmp/stillmark-none/socket: is stillmarkd "
           "running?\n");
    forget(&t);
    t = tell(NULL, SM_ACT_NEXT, WORDS("--socket", "/tmp/stillmark-other/socket"));
    expect(&t, 2, "",
           "stillmark next: no daemon answers at /tmp/stillmark-other/socket: is stillmarkd "
           "running?\n");
    forget(&t);
}

static void the_session_s_socket_is_found_where_no_other_is_named(void **state)
{
    struct fake_daemon *d = fake_daemon_start(says_done);
    char folder[96], link_path[112], why[SM_TALK_WHY_SIZE] = "";
    struct scratch s;
    struct sm_talk *talk = NULL;

    (void)state;
    scratch_make(&s);
    snprintf(folder, sizeof folder, "%s/stillmark", s.path);
    snprintf(link_path, sizeof link_path, "%.95s/socket", folder);
    assert_int_equal(mkdir(folder, 0700), 0);
    assert_int_equal(symlink(fake_daemon_path(d), link_path), 0);
    unsetenv("STILLMARK_SOCKET");
    setenv("XDG_RUNTIME_DIR", s.path, 1);
    if (sm_talk_open(NULL, sm_talk_clock_ns() + SM_TALK_WAIT_NS, &talk, why) != SM_OK)
        fail_msg("%s", why);
    sm_talk_close(talk);
    unsetenv("XDG_RUNTIME_DIR");
    scratch_remove(&s);
    fake_daemon_stop(d);
    fake_daemon_destroy(d);
}

static void an_answer_that_does_not_come_is_waited_for_no_longer_than_stated(void **state)
{
    static const struct fake_rule rules[] = { { "\"k\":\"status\"", NULL, false },
                                              { NULL, NULL, false } };
    struct fake_daemon *d = fake_daemon_start(rules);
    char why[SM_TALK_WHY_SIZE] = "";
    const int64_t from = sm_talk_clock_ns(), until = from + 200000000;
    struct sm_talk *talk = NULL;
    json_t *list = NULL;
    int64_t took;

    (void)state;
    assert_int_equal(sm_talk_open(fake_daemon_path(d), until, &talk, why), SM_OK);
    assert_int_equal(sm_talk_status(talk, NULL, false, until, &list, why), SM_ESHORT);
    took = sm_talk_clock_ns() - from;
    assert_null(list);
    assert_non_null(strstr(why, "does not answer"));
    if (took < 200000000 || took > 5000000000)
        fail_msg("waited %.3f s, want 0.2 s", 1e-9 * (double)took);
    sm_talk_close(talk);
    fake_daemon_stop(d);
    fake_daemon_destroy(d);
}

static void hostile_text_of_an_answer_does_not_reach_the_terminal(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\"", STATUS, false },
        { "\"k\":\"act\"",
          "{\"k\":\"answer\",\t\"id\":\"$ID\",\"done\":false,\"why\":\"a\\u001b[2J\\u0000b\xc2\x9b"
          "c\xe2\x80\xae\"}\n",
          false },
        { NULL, NULL, false }
    };
    struct told t = tell(rules, SM_ACT_NEXT, NO_WORDS);

    (void)state;
    expect(&t, 1, "Refused: a\\x1b[2J\\x00b\\xc2\\x9bc\\xe2\\x80\\xae.\n", "");
    forget(&t);
    t = tell(rules, SM_ACT_NEXT, WORDS("--json", "--id=i"));
    expect(&t, 1,
           "{\"k\":\"answer\", \"id\":\"i\",\"done\":false,\"why\":\"a\\u001b[2J\\u0000b\\u009b"
           "c\\u202e\"}\n",
           "");
    forget(&t);
}

static void what_is_typed_wrong_exits_2_before_anything_is_told(void **state)
{
    static const struct {
        enum sm_act_kind act;
        const char *words[8];
        const char *want;
    } cases[] = {
        { SM_ACT_TEMPERATURE, { "10.8" }, "expected a temperature with its unit" },
        { SM_ACT_TEMPERATURE, { NULL }, "expected a temperature with its unit" },
        { SM_ACT_TEMPERATURE, { "10.8 mV" }, "expected a temperature with its unit" },
        { SM_ACT_NOTE, { NULL }, "expected TEXT" },
        { SM_ACT_NOTE, { "\xff" }, "the text is not UTF-8 text" },
        { SM_ACT_NEXT, { "final" }, "\"final\" is not understood" },
        { SM_ACT_NEXT, { "--wy", "x" }, "\"--wy\" is not understood" },
        { SM_ACT_NEXT, { "--why" }, "--why needs a value" },
        { SM_ACT_NEXT, { "--who", "a", "--who", "b" }, "--who is given twice" },
        { SM_ACT_NEXT, { "--seen", "-1" }, "--seen: expected the number of an entry" },
        { SM_ACT_NEXT, { "--seen", "1e3" }, "--seen: expected the number of an entry" },
        { SM_ACT_NEXT, { "--id", "" }, "--id: expected 1 to 64 characters" },
        { SM_ACT_VOID, { "x" }, "expected the number of an entry" },
        { SM_ACT_SHEET,
          { "/tmp/stillmark-none.yaml" },
          "/tmp/stillmark-none.yaml: cannot be read" },
        { SM_ACT_SHEET, { "/tmp" }, "/tmp: cannot be read" },
        { SM_ACT_SHEET, { NULL }, "expected one file" },
        { SM_ACT_SHEET, { "--held" }, "--held: not possible yet" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct told t = tell(says_done, cases[i].act, cases[i].words);
        if (t.status != 2 || strstr(t.err, cases[i].want) == NULL ||
            fake_daemon_heard(t.daemon)[0] != '\0')
            fail_msg("case %zu: got %d \"%s\", want 2 and \"%s\"", i, t.status, t.err,
                     cases[i].want);
        forget(&t);
    }
}

static void a_sheet_is_handed_over_whole_under_its_name(void **state)
{
    static const char text[] = "method: ph\nitems:\n  - { sample: \"Abwasser µ\" }\n";
    struct scratch s;
    char path[96];
    struct told t;
    json_t *o;

    (void)state;
    scratch_make(&s);
    snprintf(path, sizeof path, "%s/morning.yaml", s.path);
    scratch_write(path, text);
    t = tell(says_done, SM_ACT_SHEET, WORDS(path));
    o = act_of(&t);
    assert_int_equal(t.status, 0);
    assert_string_equal(word(o, "text"), text);
    assert_string_equal(word(o, "file"), path);
    json_decref(o);
    forget(&t);
    scratch_remove(&s);
}

static void a_sheet_that_is_too_long_is_not_told(void **state)
{
    const size_t n = SM_SHEET_TEXT_MAX + 1;
    char *text = malloc(n + 1);
    struct scratch s;
    char path[96];
    struct told t;

    (void)state;
    assert_non_null(text);
    memset(text, '#', n);
    text[n] = '\0';
    scratch_make(&s);
    snprintf(path, sizeof path, "%s/long.yaml", s.path);
    scratch_write(path, text);
    t = tell(says_done, SM_ACT_SHEET, WORDS(path));
    assert_int_equal(t.status, 2);
    assert_non_null(strstr(t.err, "has 131073 bytes, a bench sheet has at most 131072"));
    forget(&t);
    text[n - 1] = '\0'; /* the longest that is possible arrives whole */
    scratch_write(path, text);
    t = tell(says_done, SM_ACT_SHEET, WORDS(path));
    assert_int_equal(t.status, 0);
    forget(&t);
    memset(text, '\x01', n - 1); /* six bytes each when told */
    scratch_write(path, text);
    t = tell(says_done, SM_ACT_SHEET, WORDS(path));
    assert_int_equal(t.status, 2);
    assert_non_null(strstr(t.err, "at most 262144 are possible"));
    forget(&t);
    scratch_remove(&s);
    free(text);
}

static void help_of_an_act_needs_no_daemon(void **state)
{
    (void)state;
    for (int a = 0; a < SM_ACT_COUNT; a++) {
        struct told t = tell(NULL, (enum sm_act_kind)a, WORDS("--help"));
        if (t.status != 0 || strstr(t.out, sm_act_name((enum sm_act_kind)a)) == NULL ||
            (strstr(t.out, "not possible yet") != NULL) == sm_act_built((enum sm_act_kind)a))
            fail_msg("%s --help: %d, %s", sm_act_name((enum sm_act_kind)a), t.status, t.out);
        forget(&t);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(an_act_is_told_with_what_its_sender_has_seen),
        cmocka_unit_test(every_act_has_an_id_of_its_own),
        cmocka_unit_test(what_is_typed_arrives_in_the_words_of_the_log),
        cmocka_unit_test(a_refused_act_says_why_and_exits_1),
        cmocka_unit_test(answers_to_others_are_not_taken_for_ours),
        cmocka_unit_test(several_meters_and_none_named_exit_2_with_their_names),
        cmocka_unit_test(a_named_meter_is_the_one_asked_and_told),
        cmocka_unit_test(what_cannot_be_done_exits_2_in_one_line),
        cmocka_unit_test(a_line_without_end_is_not_waited_for),
        cmocka_unit_test(without_a_daemon_it_says_where_it_looked),
        cmocka_unit_test(the_session_s_socket_is_found_where_no_other_is_named),
        cmocka_unit_test(an_answer_that_does_not_come_is_waited_for_no_longer_than_stated),
        cmocka_unit_test(hostile_text_of_an_answer_does_not_reach_the_terminal),
        cmocka_unit_test(what_is_typed_wrong_exits_2_before_anything_is_told),
        cmocka_unit_test(a_sheet_is_handed_over_whole_under_its_name),
        cmocka_unit_test(a_sheet_that_is_too_long_is_not_told),
        cmocka_unit_test(help_of_an_act_needs_no_daemon),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
