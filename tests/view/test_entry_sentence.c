/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_entry_sentence.c: what an analyst reads of each entry, and what hostile ones do not do. */
#include "view/entry_sentence.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "check.h"
#include "record/entry.h"

static char said[4096];

/* The sentence of one entry; NULL: nothing worth a line. */
static const char *sentence(const char *entry)
{
    json_error_t e;
    json_t *o = json_loads(entry, JSON_REJECT_DUPLICATES | JSON_ALLOW_NUL, &e);
    struct sm_text t;
    bool worth;

    if (o == NULL)
        fail_msg("the test's own entry is no JSON: %s: %s", e.text, entry);
    sm_text_init(&t, said, sizeof said);
    worth = sm_entry_sentence(o, &t);
    json_decref(o);
    return worth ? said : NULL;
}

static void expect(const char *entry, const char *want)
{
    const char *got = sentence(entry);

    if (got == NULL || strcmp(got, want) != 0)
        fail_msg("%s\n  got:  %s\n  want: %s", entry, got != NULL ? got : "(nothing)", want);
}

static void each_kind_is_said_in_a_sentence(void **state)
{
    static const struct {
        const char *entry, *want;
    } cases[] = {
        { "{\"k\":\"capture\",\"item\":12,\"name\":\"final\",\"kind\":\"sample\",\"value\":-58.31,"
          "\"unit\":\"mV\",\"expanded_uncertainty\":1.1,\"since_moved\":63000000000,"
          "\"remarks\":[\"one lift survived\"]}",
          "Settled: sample final, -58.3 ± 1.1 mV after 63 s (one lift survived)" },
        { "{\"k\":\"capture\",\"name\":\"capture 17\",\"value\":0.51234,\"unit\":\"A\","
          "\"expanded_uncertainty\":0.0021,\"since_moved\":7800000000000,\"remarks\":[]}",
          "Settled: capture 17, 0.5123 ± 0.0021 A after 2 h 10 min" },
        { "{\"k\":\"result\",\"name\":\"final\",\"kind\":\"duplicate\",\"title\":\"duplicate of "
          "final\",\"value\":8.12,\"unit\":\"pH\",\"expanded_uncertainty\":0.1,\"state\":"
          "\"provisional\",\"why\":\"waits for the check that closes its bracket\"}",
          "duplicate of final: 8.12 ± 0.10 pH, provisional: waits for the check that closes its "
          "bracket" },
        { "{\"k\":\"result\",\"name\":\"raw\",\"kind\":\"sample\",\"shown\":\"< 1.68\",\"unit\":"
          "\"pH\",\"state\":\"held\",\"why\":\"below the lowest standard\"}",
          "sample raw: < 1.68 pH, held: below the lowest standard" },
        { "{\"k\":\"result\",\"name\":\"raw\",\"kind\":\"sample\"}",
          "sample raw: no value, state unknown" },
        { "{\"k\":\"curve\",\"accepted\":true,\"unit_y\":\"mV\",\"fit\":{\"residual_sd\":0.41,"
          "\"r_squared\":0.99987,\"slope\":0.981,\"offset\":-3.2}}",
          "Curve accepted: slope 98.1 %, offset -3.2 mV, residual SD 0.41 mV, R² 0.99987" },
        { "{\"k\":\"curve\",\"accepted\":false,\"fit\":{},\"judged\":[{\"quantity\":\"levels\","
          "\"pass\":true,\"text\":\"5 levels\"},{\"quantity\":\"slope\",\"pass\":false,\"text\":"
          "\"slope 88.0 %, at least 90 %\"},{\"quantity\":\"offset\",\"pass\":false}]}",
          "Curve refused: slope 88.0 %, at least 90 %. offset" },
        { "{\"k\":\"curve\",\"accepted\":false}",
          "Curve refused: no curve goes through these standards" },
        { "{\"k\":\"check\",\"pass\":false,\"name\":\"C7\",\"kind\":\"check\",\"found\":7.3,"
          "\"why\":"
          "\"reads 7.3 pH\"}",
          "Check failed: C7 reads 7.3 pH" },
        { "{\"k\":\"check\",\"pass\":false,\"name\":\"C7\",\"kind\":\"check\",\"why\":\"there is "
          "no "
          "curve\"}",
          "Check failed: C7: there is no curve" },
        { "{\"k\":\"release\",\"results\":[1,2,3],\"why\":\"the check passed\"}",
          "3 results released: the check passed" },
        { "{\"k\":\"hold\",\"results\":[1],\"why\":\"the check failed\"}",
          "1 result held: the check failed" },
        { "{\"k\":\"question\",\"text\":\"Reads like final. A new beaker?\"}",
          "Question: Reads like final. A new beaker?" },
        { "{\"k\":\"answer\",\"done\":true}", "Done" },
        { "{\"k\":\"answer\",\"done\":false,\"why\":\"not possible yet\"}",
          "Refused: not possible yet" },
        { "{\"k\":\"moved\",\"by\":\"mark\",\"name\":\"B4\",\"kind\":\"standard\"}",
          "The probe was moved: now in standard B4" },
        { "{\"k\":\"moved\",\"by\":\"transit\",\"name\":\"final\",\"kind\":\"sample\",\"why\":"
          "\"air\"}",
          "The probe was moved (air): what settles next is sample final" },
        { "{\"k\":\"moved\",\"by\":\"value\",\"why\":\"the value changed: same beaker "
          "disturbed?\"}",
          "The value changed: same beaker disturbed?" },
        { "{\"k\":\"not-settled\",\"name\":\"final\",\"kind\":\"sample\",\"why\":\"15 min are "
          "over\"}",
          "Not settled, no value taken: sample final: 15 min are over" },
        { "{\"k\":\"silent\"}", "The meter has fallen silent: check that it is on and sending" },
        { "{\"k\":\"unread\",\"line\":\"no number\",\"why\":\"no number where potential is\"}",
          "A line gave no reading: no number where potential is" },
        { "{\"k\":\"unread\",\"count\":412}", "412 more lines gave no reading" },
        { "{\"k\":\"link\",\"state\":\"up\",\"device\":\"/dev/ttyUSB0\",\"settings\":\"9600 8N1\"}",
          "Listening to the meter on /dev/ttyUSB0, 9600 8N1" },
        { "{\"k\":\"link\",\"state\":\"lost\",\"why\":\"the adapter is gone\"}",
          "The link to the meter is lost: the adapter is gone" },
        { "{\"k\":\"link\",\"state\":\"refused\",\"why\":\"in use\"}",
          "The port cannot be used: in use" },
        { "{\"k\":\"act\",\"act\":\"skip\",\"why\":\"beaker broken\",\"who\":\"bench-a\"}",
          "Told: skip, because: beaker broken, by bench-a" },
        { "{\"k\":\"act\",\"act\":\"sheet\",\"file\":\"morning.yaml\",\"text\":\"method: x\"}",
          "Told: sheet morning.yaml" },
        { "{\"k\":\"act\",\"act\":\"temperature\",\"temperature\":10.8}",
          "Told: temperature 10.8 °C" },
        { "{\"k\":\"clock\",\"what\":\"jump\",\"by_us\":-3600000000}",
          "The wall clock jumped back by 60 min" },
        { "{\"k\":\"clock\",\"what\":\"suspend\",\"by_us\":90000000}",
          "The machine was asleep for 90 s" },
        { "{\"k\":\"open\",\"how\":\"recovery\",\"missed\":\"12 s, disk full\"}",
          "A new log file begins (recovery). Not logged: 12 s, disk full" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        expect(cases[i].entry, cases[i].want);
}

static void what_is_not_worth_a_line_says_nothing(void **state)
{
    static const char *const kinds[] = { "bytes",   "tick",    "sent",     "stamp", "carried",
                                         "transit", "reading", "settling", "file",  "later-kind" };

    (void)state;
    for (size_t i = 0; i < COUNT(kinds); i++) {
        char entry[64];
        snprintf(entry, sizeof entry, "{\"k\":\"%s\"}", kinds[i]);
        if (sentence(entry) != NULL)
            fail_msg("%s: got \"%s\", want nothing", kinds[i], said);
        assert_string_equal(said, "");
    }
    assert_null(sentence("{}"));
    assert_null(sentence("[]"));
}

/* Every key that any sentence takes, once as each of these. */
static void nothing_that_an_entry_holds_reaches_a_terminal_as_a_control(void **state)
{
    static const char *const kinds[] = { "capture", "curve",        "check",    "result",
                                         "hold",    "release",      "question", "answer",
                                         "moved",   "not-settled",  "silent",   "unread",
                                         "act",     "link",         "clock",    "open",
                                         "close",   "open-circuit", "raw" };
    static const char *const keys[] = { "item",
                                        "name",
                                        "title",
                                        "kind",
                                        "value",
                                        "unit",
                                        "expanded_uncertainty",
                                        "since_moved",
                                        "shown",
                                        "state",
                                        "why",
                                        "text",
                                        "by",
                                        "count",
                                        "device",
                                        "settings",
                                        "file",
                                        "act",
                                        "who",
                                        "what",
                                        "by_us",
                                        "how",
                                        "missed",
                                        "key_note",
                                        "temperature",
                                        "accepted",
                                        "pass",
                                        "done",
                                        "unit_y",
                                        "results",
                                        "remarks",
                                        "judged",
                                        "fit" };
    static const char *const values[] = {
        "\"\\u001b[2J\\u0007\\u009b1m\\u202e\\u0000x\"",
        "-1e308",
        "9223372036854775807",
        "true",
        "[\"\\u001b]0;x\\u0007\",[],{\"pass\":false,\"text\":\"\\u001b[31m\"},1]",
        "{}",
        "null"
    };

    (void)state;
    for (size_t k = 0; k < COUNT(kinds); k++) {
        for (size_t v = 0; v < COUNT(values); v++) {
            char entry[8192];
            struct sm_text t;
            sm_text_init(&t, entry, sizeof entry);
            sm_text_addf(&t, "{\"k\":\"%s\"", kinds[k]);
            for (size_t i = 0; i < COUNT(keys); i++)
                sm_text_addf(&t, ",\"%s\":%s", keys[i], values[v]);
            sm_text_add(&t, "}");
            assert_false(t.cut);
            assert_non_null(sentence(entry));
            for (const char *c = said; *c != '\0'; c++)
                if ((unsigned char)*c < 0x20 || *c == 0x7f || strstr(said, "\xc2\x9b") != NULL ||
                    strstr(said, "\xe2\x80\xae") != NULL)
                    fail_msg("%s with %s: got a control: %s", kinds[k], values[v], said);
        }
    }
}

static void a_sentence_longer_than_its_storage_is_cut_and_says_so(void **state)
{
    json_t *o = json_pack("{s:s, s:s}", "k", "question", "text", "Reads like final. A new beaker?");
    char buf[24];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, buf, sizeof buf);
    assert_true(sm_entry_sentence(o, &t));
    assert_true(t.cut);
    assert_string_equal(buf, "Question: Reads like fi");
    json_decref(o);
}

/* The keys looked for are those the core's events are written with. */
static void an_event_written_as_an_entry_is_said_whole(void **state)
{
    struct sm_event *e = calloc(1, sizeof *e);
    char *line = malloc(SM_ENTRY_MAX);
    struct sm_event_result *r;
    struct sm_text t;

    (void)state;
    assert_true(e != NULL && line != NULL);
    r = &e->u.result;
    e->kind = SM_EVENT_RESULT;
    e->n = 7;
    r->capture = 6;
    r->where.has = true;
    r->where.kind = SM_ITEM_SAMPLE;
    r->where.item = 3;
    strcpy(r->where.name, "final");
    strcpy(r->name, "final");
    r->has_value = r->has_u95 = true;
    r->value = 8.1234;
    r->u95 = 0.052;
    r->unit = SM_UNIT_PH;
    r->state = SM_RESULT_PROVISIONAL;
    strcpy(r->why, "waits for a check");
    sm_text_init(&t, line, SM_ENTRY_MAX);
    sm_entry_event(&t, e);
    expect(line, "sample final: 8.123 ± 0.052 pH, provisional: waits for a check");

    memset(e, 0, sizeof *e);
    e->kind = SM_EVENT_CAPTURE;
    e->n = 8;
    strcpy(e->u.capture.name, "capture 1");
    e->u.capture.value = 177.5;
    e->u.capture.unit = SM_UNIT_MV;
    e->u.capture.s.u95 = 0.3;
    e->u.capture.s.since_moved_ns = 31 * SM_NS_PER_S;
    sm_text_init(&t, line, SM_ENTRY_MAX);
    sm_entry_event(&t, e);
    expect(line, "Settled: capture 1, 177.50 ± 0.30 mV after 31 s");
    free(line);
    free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(each_kind_is_said_in_a_sentence),
        cmocka_unit_test(what_is_not_worth_a_line_says_nothing),
        cmocka_unit_test(nothing_that_an_entry_holds_reaches_a_terminal_as_a_control),
        cmocka_unit_test(a_sentence_longer_than_its_storage_is_cut_and_says_so),
        cmocka_unit_test(an_event_written_as_an_entry_is_said_whole),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
