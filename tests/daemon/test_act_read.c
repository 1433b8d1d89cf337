/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_act_read.c: acts from outside, read key by key; what is wrong is said. */
#include "check.h"

#include <stdio.h>
#include <string.h>

#include "act_read.h"

static enum sm_status read_act(const char *text, struct sm_act *act, char why[SM_ACT_WHY_SIZE])
{
    json_error_t error;
    json_t *o = json_loads(text, JSON_ALLOW_NUL, &error);
    enum sm_status s;

    if (o == NULL)
        fail_msg("the test's own JSON: %s: %s", text, error.text);
    why[0] = '\0';
    s = sm_act_read(o, act, why);
    if (s == SM_OK) { /* texts are lent: seen here, gone with the object */
        if (act->sheet_text != NULL)
            assert_int_equal(strlen(act->sheet_text), act->sheet_text_n);
        act->sheet_text = NULL;
    }
    json_decref(o);
    return s;
}

static void a_whole_act_is_read(void **state)
{
    struct sm_act a;
    char why[SM_ACT_WHY_SIZE];

    (void)state;
    assert_int_equal(
        read_act("{\"k\":\"act\",\"meter\":\"m1\",\"act\":\"skip\",\"id\":\"7f2c-19\","
                 "\"seen\":61879,\"who\":\"bench-a\",\"why\":\"cracked beaker\",\"of\":5}",
                 &a, why),
        SM_OK);
    assert_int_equal(a.act, SM_ACT_SKIP);
    assert_string_equal(a.id, "7f2c-19");
    assert_true(a.has_seen);
    assert_int_equal(a.seen, 61879);
    assert_string_equal(a.who, "bench-a");
    assert_string_equal(a.why, "cracked beaker");
    assert_true(a.has_subject);
    assert_int_equal(a.subject, 5);
    assert_false(a.has_temperature);
    assert_false(a.has_uid);
    assert_string_equal(a.door, "");
    assert_int_equal(
        read_act("{\"act\":\"temperature\",\"id\":\"t\",\"temperature\":24.8}", &a, why), SM_OK);
    assert_true(a.has_temperature);
    check_close("temperature", a.temperature_c, 24.8, 0);
    assert_int_equal(
        read_act("{\"act\":\"sheet\",\"id\":\"s\",\"file\":\"conf/sheets/morning.yaml\","
                 "\"text\":\"items:\\n\"}",
                 &a, why),
        SM_OK);
    assert_string_equal(a.sheet_file, "morning.yaml");
    assert_int_equal(a.sheet_text_n, 7);
}

static void what_is_wrong_is_refused_with_its_key(void **state)
{
    static const struct {
        const char *text, *why;
    } cases[] = { { "{\"id\":\"1\"}", "act:" },
                  { "{\"act\":7,\"id\":\"1\"}", "act:" },
                  { "{\"act\":\"sneeze\",\"id\":\"1\"}", "sneeze" },
                  { "{\"act\":\"next\"}", "id:" },
                  { "{\"act\":\"next\",\"id\":\"\"}", "id:" },
                  { "{\"act\":\"next\",\"id\":7}", "id:" },
                  { "{\"act\":\"next\",\"id\":\"a b\"}", "id:" },
                  { "{\"act\":\"next\",\"id\":\"\\u00e9\"}", "id:" },
                  { "{\"act\":\"next\",\"id\":\"0123456789012345678901234567890123456789"
                    "01234567890123456789012345\"}",
                    "id:" },
                  { "{\"act\":\"next\",\"id\":\"1\",\"seen\":-1}", "seen:" },
                  { "{\"act\":\"next\",\"id\":\"1\",\"seen\":1.5}", "seen:" },
                  { "{\"act\":\"next\",\"id\":\"1\",\"seen\":9223372036854775807}", "seen:" },
                  { "{\"act\":\"next\",\"id\":\"1\",\"who\":\"a\\u202eb\"}", "who:" },
                  { "{\"act\":\"next\",\"id\":\"1\",\"who\":\"a\\u0000b\"}", "who:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"text\":\"a\\u001b[2Jb\"}", "text:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"text\":[]}", "text:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"door\":\"page\"}", "door:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"peer\":{\"uid\":0}}", "peer:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"sene\":1}", "sene:" },
                  { "{\"act\":\"note\",\"id\":\"1\",\"file\":\"x\"}", "file:" },
                  { "{\"act\":\"temperature\",\"id\":\"1\",\"temperature\":\"24\"}",
                    "temperature:" },
                  { "{\"act\":\"sheet\",\"id\":\"1\",\"text\":\"\"}", "file" },
                  { "{\"act\":\"sheet\",\"id\":\"1\",\"file\":\"a/\",\"text\":\"\"}", "file:" },
                  { "{\"act\":\"sheet\",\"id\":\"1\",\"file\":\"a\"}", "text" } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_act a;
        char why[SM_ACT_WHY_SIZE];

        memset(&a, 0x55, sizeof a);
        const struct sm_act before = a;
        if (read_act(cases[i].text, &a, why) != SM_ESYNTAX || strstr(why, cases[i].why) == NULL)
            fail_msg("%s: why \"%s\", want it to name %s", cases[i].text, why, cases[i].why);
        assert_memory_equal(&a, &before, sizeof a); /* untouched on failure */
    }
}

static void texts_are_bounded(void **state)
{
    static char text[SM_SHEET_TEXT_MAX + 64], body[SM_SHEET_TEXT_MAX + 8];
    static const struct {
        const char *form;
        size_t n;
        enum sm_status want;
    } cases[] = { { "{\"act\":\"note\",\"id\":\"1\",\"text\":\"%s\"}", SM_NOTE_SIZE - 1, SM_OK },
                  { "{\"act\":\"note\",\"id\":\"1\",\"text\":\"%s\"}", SM_NOTE_SIZE, SM_ESYNTAX },
                  { "{\"act\":\"note\",\"id\":\"1\",\"who\":\"%s\"}", 64, SM_OK },
                  { "{\"act\":\"note\",\"id\":\"1\",\"who\":\"%s\"}", 65, SM_ESYNTAX },
                  { "{\"act\":\"sheet\",\"id\":\"1\",\"file\":\"f\",\"text\":\"%s\"}",
                    SM_SHEET_TEXT_MAX, SM_OK },
                  { "{\"act\":\"sheet\",\"id\":\"1\",\"file\":\"f\",\"text\":\"%s\"}",
                    SM_SHEET_TEXT_MAX + 1, SM_ESYNTAX } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_act a;
        char why[SM_ACT_WHY_SIZE];
        const char *hole = strstr(cases[i].form, "%s");
        enum sm_status got;

        memset(body, 'a', cases[i].n);
        body[cases[i].n] = '\0';
        snprintf(text, sizeof text, "%.*s%s%s", (int)(hole - cases[i].form), cases[i].form, body,
                 hole + 2);
        got = read_act(text, &a, why);
        if (got != cases[i].want)
            fail_msg("%s with %zu bytes: status %d, want %d (%s)", cases[i].form, cases[i].n, got,
                     cases[i].want, why);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_whole_act_is_read),
        cmocka_unit_test(what_is_wrong_is_refused_with_its_key),
        cmocka_unit_test(texts_are_bounded),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
