/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_stillmark_watch.c: `stillmark status` and `stillmark watch` with output that is no terminal.
 */
#include "stillmark_watch.h"

#include <string.h>

#include "capture_output.h"
#include "fake_daemon.h"
#include "stillmark_status.h"

#define HEAD "{\"t\":1,\"utc\":\"2026-12-01T08:41:09.731205Z\",\"k\":"
#define ONE HEAD "\"status\",\"meter\":\"bench-2\",\"meters\":1,\"seen\":4,"
/* what a watch asks behind following, once it is known that there is this meter */
#define ASKED "{\"k\":\"status\",\"meter\":\"bench-2\"}"
#define FIRST ONE "\"sentence\":\"Waiting for the first reading.\"}\n"

struct said {
    int status;
    char *out, *err;
    struct fake_daemon *daemon; /* ended */
};

static struct said run(const struct fake_rule *rules, int (*command)(int argc, char **argv),
                       const char *const *words)
{
    struct said s = { .daemon = fake_daemon_start(rules) };
    char *argv[16];
    size_t n = 0;

    setenv("TZ", "EST5", 1); /* POSIX: five hours west of Greenwich */
    setenv("STILLMARK_SOCKET", fake_daemon_path(s.daemon), 1);
    for (; words[n] != NULL; n++)
        argv[n] = strdup(words[n]);
    argv[n] = NULL;
    s.status = capture_run(command, argv, &s.out, &s.err);
    while (n > 0)
        free(argv[--n]);
    fake_daemon_stop(s.daemon);
    return s;
}

static void forget(struct said *s)
{
    free(s->out);
    free(s->err);
    fake_daemon_destroy(s->daemon);
}

static void expect(const struct said *s, int status, const char *out, const char *err)
{
    if (s->status != status || strcmp(s->out, out) != 0 || strstr(s->err, err) == NULL)
        fail_msg("got %d\n--out:\n%s--err:\n%swant %d\n--out:\n%s--err:\n%s", s->status, s->out,
                 s->err, status, out, err);
}

#define WORDS(...) ((const char *const[]){ __VA_ARGS__, NULL })
#define NO_WORDS ((const char *const[]){ NULL })

static void status_says_a_sentence_for_each_meter_and_what_else_is_to_be_known(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\"",
          "{\"k\":\"status\",\"meter\":\"bench-1\",\"meters\":2,\"sentence\":\"Starting.\","
          "\"link\":{\"state\":\"lost\",\"why\":\"it is not there\"}}\n"
          "{\"k\":\"status\",\"meter\":\"bench-2\",\"meters\":2,\"sentence\":\"Not logging: see "
          "why.\",\"not_logged\":{\"why\":\"disk full\"},\"caution\":\"Goggles.\",\"method_note\":"
          "\"By a prescribed rule.\"}\n",
          false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_status, NO_WORDS);

    (void)state;
    expect(&s, 0,
           "bench-1: Starting.\n"
           "  Port: it is not there\n"
           "bench-2: Not logging: see why.\n"
           "  Not logged: disk full\n"
           "  Caution: Goggles.\n"
           "  Method: By a prescribed rule.\n",
           "");
    forget(&s);
    s = run(rules, sm_stillmark_status, WORDS("--json"));
    expect(&s, 0, rules[0].reply, "");
    forget(&s);
}

static void status_shows_no_control_characters(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"status\"",
          "{\"k\":\"status\",\"meter\":\"\\u001b[2J\",\"sentence\":\"a\\nb\\u202ec\"}\n", false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_status, NO_WORDS);

    (void)state;
    expect(&s, 0, "\\x1b[2J: a\\x0ab\\xe2\\x80\\xaec\n", "");
    forget(&s);
}

static void status_without_an_answer_exits_2(void **state)
{
    static const struct fake_rule refuses[] = {
        { "bench-9", "{\"k\":\"error\",\"why\":\"no meter is called bench-9\"}\n", false },
        { NULL, NULL, false }
    };
    struct said s = run(refuses, sm_stillmark_status, WORDS("--meter", "bench-9"));

    (void)state;
    expect(&s, 2, "", "stillmark status: no meter is called bench-9\n");
    forget(&s);
    s = run(refuses, sm_stillmark_status, WORDS("--socket", "/tmp/stillmark-none/socket"));
    expect(&s, 2, "", "no daemon answers at /tmp/stillmark-none/socket: is stillmarkd running?\n");
    forget(&s);
    s = run(refuses, sm_stillmark_status, WORDS("bench-9"));
    expect(&s, 2, "", "stillmark status: \"bench-9\" is not understood");
    forget(&s);
}

static void watch_says_what_is_worth_a_line_with_its_local_time(void **state)
{
    static const struct fake_rule rules[] = {
        { ASKED,
          FIRST HEAD
          "\"bytes\",\"b\":\"-58.3 mV\\u000d\"}\n" HEAD "\"reading\",\"values\":[]}\n" HEAD
          "\"act\",\"act\":\"next\",\"who\":\"bench-a\"}\n" HEAD "\"answer\",\"done\":true}\n" HEAD
          "\"act\",\"act\":\"skip\"}\n" HEAD
          "\"answer\",\"done\":false,\"why\":\"there is no item to skip\"}\n" HEAD
          "\"result\",\"name\":\"final\",\"kind\":\"sample\",\"value\":8.12,"
          "\"expanded_uncertainty\":0.1,\"unit\":\"pH\",\"state\":\"provisional\"}\n" HEAD
          "\"result\",\"name\":\"raw\",\"kind\":\"sample\",\"shown\":\"< 1.68\","
          "\"unit\":\"pH\",\"state\":\"held\"}\n"
          "{\"k\":\"silent\"}\n",
          true },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    expect(&s, 2,
           "bench-2: Waiting for the first reading.\n"
           "03:41:09 Told: next, by bench-a\n"
           "03:41:09 Told: skip\n"
           "03:41:09 Refused: there is no item to skip\n"
           "03:41:09 Results are for information. They must not control a dosing pump.\n"
           "03:41:09 sample final: 8.12 ± 0.10 pH, provisional\n"
           "03:41:09 sample raw: < 1.68 pH, held\n"
           "--:--:-- The meter has fallen silent: check that it is on and sending\n",
           "the daemon closed the connection\n");
    forget(&s);
}

static void watch_says_what_comes_next_and_its_caution_once(void **state)
{
#define NEXT(name, caution)                                                                        \
    ONE "\"next\":{\"kind\":\"standard\",\"name\":\"" name "\"},\"caution\":\"" caution "\"}\n"
    static const struct fake_rule rules[] = {
        { ASKED,
          NEXT("B4", "Goggles.") HEAD "\"moved\",\"by\":\"mark\"}\n" NEXT("B4", "Goggles.") HEAD
          "\"moved\",\"by\":\"mark\"}\n" NEXT("B7", "Goggles.") HEAD
          "\"moved\",\"by\":\"mark\"}\n" NEXT("B7", "Acid."),
          true },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    expect(&s, 2,
           "bench-2: \n"
           "  Caution: Goggles.\n"
           "03:41:09 The probe was moved\n" /* so is this: it was moved thrice */
           "03:41:09 Next: standard B7\n"
           "03:41:09 Caution: Acid.\n",
           "the daemon closed the connection\n");
    forget(&s);
}

static void watch_says_what_comes_after_an_item_when_the_item_has_its_value(void **state)
{
#define MOVED_TO_B4 HEAD "\"moved\",\"by\":\"transit\",\"item\":1,\"name\":\"B4\"}\n"
    static const struct fake_rule rules[] = {
        { ASKED,
          NEXT("B4", "") MOVED_TO_B4 NEXT("B7", "Goggles.") MOVED_TO_B4 HEAD
          "\"capture\",\"item\":1,\"name\":\"B4\"}\n" NEXT("B7", "Goggles.") HEAD
          "\"capture\",\"item\":2,\"name\":\"B7\"}\n" ONE "\"sheet_done\":true}\n",
          true },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    expect(&s, 2,
           "bench-2: \n"
           "03:41:09 The probe was moved: what settles next is B4\n"
           "03:41:09 Caution: Goggles.\n"
           "03:41:09 Settled: B4\n"
           "03:41:09 Next: standard B7\n"
           "03:41:09 Settled: B7\n"
           "03:41:09 The sheet is done.\n",
           "the daemon closed the connection\n");
    forget(&s);
}

static void watch_says_once_that_nothing_is_logged_until_it_is_again(void **state)
{
#define RAW HEAD "\"raw\",\"b\":\"7\",\"note\":\"not logged\"}\n"
    static const struct fake_rule rules[] = {
        { ASKED,
          FIRST RAW RAW RAW HEAD "\"open\",\"how\":\"recovery\",\"missed\":\"disk full\"}\n" RAW,
          true },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    expect(&s, 2,
           "bench-2: Waiting for the first reading.\n"
           "03:41:09 Not logged: the meter sends, but its log cannot be written\n"
           "03:41:09 A new log file begins (recovery). Not logged: disk full\n"
           "03:41:09 Not logged: the meter sends, but its log cannot be written\n",
           "");
    forget(&s);
}

static void watch_follows_every_meter_and_names_it(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"follow\",\"meter\":\"bench-1\"", HEAD "\"silent\"}\n", false },
        { "\"k\":\"follow\",\"meter\":\"bench-2\"", NULL, false },
        { "\"k\":\"status\",\"meter\":\"bench-1\"",
          "{\"k\":\"status\",\"meter\":\"bench-1\",\"sentence\":\"One.\"}\n", false },
        { "\"k\":\"status\",\"meter\":\"bench-2\"",
          "{\"k\":\"status\",\"meter\":\"bench-2\",\"sentence\":\"Two.\"}\n", true },
        { "\"k\":\"status\"",
          "{\"k\":\"status\",\"meter\":\"bench-1\",\"meters\":2}\n"
          "{\"k\":\"status\",\"meter\":\"bench-2\",\"meters\":2}\n",
          false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    if (s.status != 2 || strstr(s.out, "bench-2: Two.\n") == NULL)
        fail_msg("got %d: %s%s", s.status, s.out, s.err);
    assert_non_null(strstr(fake_daemon_heard(s.daemon), "\"follow\",\"meter\":\"bench-1\"}"));
    assert_non_null(strstr(fake_daemon_heard(s.daemon), "\"follow\",\"meter\":\"bench-2\"}"));
    forget(&s);
}

static void watch_as_json_passes_everything_on(void **state)
{
    static const struct fake_rule rules[] = {
        { ASKED, "{\"n\":12,\"k\":\"bytes\",\"b\":\"\x7f\"}\n", true },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, WORDS("--json", "--from", "12"));

    (void)state;
    expect(&s, 2, "{\"n\":12,\"k\":\"bytes\",\"b\":\"\\u007f\"}\n", "closed the connection");
    assert_non_null(strstr(fake_daemon_heard(s.daemon),
                           "{\"k\":\"follow\",\"meter\":\"bench-2\",\"from\":12}\n"));
    forget(&s);
}

static void watch_ends_with_the_daemon_s_own_reason(void **state)
{
    static const struct fake_rule rules[] = {
        { "\"k\":\"follow\"", "{\"k\":\"error\",\"why\":\"no memory\\u0007\"}\n", false },
        { "\"k\":\"status\"", FIRST, false },
        { NULL, NULL, false }
    };
    static const struct fake_rule nameless[] = {
        { "\"k\":\"status\"", "{\"k\":\"status\",\"meter\":\"../x\"}\n", false },
        { NULL, NULL, false }
    };
    struct said s = run(rules, sm_stillmark_watch, NO_WORDS);

    (void)state;
    expect(&s, 2, "", "stillmark watch: no memory\\x07\n");
    forget(&s);
    s = run(nameless, sm_stillmark_watch, NO_WORDS);
    expect(&s, 2, "", "what answers is no stillmarkd");
    forget(&s);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(status_says_a_sentence_for_each_meter_and_what_else_is_to_be_known),
        cmocka_unit_test(status_shows_no_control_characters),
        cmocka_unit_test(status_without_an_answer_exits_2),
        cmocka_unit_test(watch_says_what_is_worth_a_line_with_its_local_time),
        cmocka_unit_test(watch_says_what_comes_next_and_its_caution_once),
        cmocka_unit_test(watch_says_what_comes_after_an_item_when_the_item_has_its_value),
        cmocka_unit_test(watch_says_once_that_nothing_is_logged_until_it_is_again),
        cmocka_unit_test(watch_follows_every_meter_and_names_it),
        cmocka_unit_test(watch_as_json_passes_everything_on),
        cmocka_unit_test(watch_ends_with_the_daemon_s_own_reason),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
