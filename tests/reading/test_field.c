/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_field.c: a line split into fields, and a meter's bytes against a person's word. */
#include "check.h"

#include <string.h>

#include "reading/field.h"

static struct sm_span span(const char *s)
{
    return (struct sm_span){ s, strlen(s) };
}

/* The fields joined by "|". */
static void check_split(enum sm_split split, char c, const char *line, const char *want)
{
    struct sm_span field[SM_FIELDS_MAX];
    char got[200];
    struct sm_text t;
    const size_t n = sm_fields_split(split, c, span(line), field);

    sm_text_init(&t, got, sizeof got);
    for (size_t i = 0; i < n; i++) {
        sm_text_add(&t, i > 0 ? "|" : "");
        sm_text_addn(&t, field[i].s, field[i].n);
    }
    if (strcmp(got, want) != 0)
        fail_msg("\"%s\": got %s, want %s", line, got, want);
}

static void fields_by_blanks_and_by_a_character(void **state)
{
    (void)state;
    check_split(SM_SPLIT_SPACES, 0, "", "");
    check_split(SM_SPLIT_SPACES, 0, "  ", "");
    check_split(SM_SPLIT_SPACES, 0, " a \t b", "a|b");
    check_split(SM_SPLIT_CHAR, ';', "", "");
    check_split(SM_SPLIT_CHAR, ';', "a;b", "a|b");
    check_split(SM_SPLIT_CHAR, ';', ";a;;b c; d ;", "|a||b c|d|");
    check_split(SM_SPLIT_CHAR, '\t', "a\tb", "a|b");
}

static void no_more_fields_than_are_looked_at(void **state)
{
    char line[3 * SM_FIELDS_MAX];
    struct sm_span field[SM_FIELDS_MAX];
    (void)state;
    for (size_t i = 0; i + 1 < sizeof line; i++)
        line[i] = i % 2 == 0 ? 'x' : ' ';
    line[sizeof line - 1] = '\0';
    assert_int_equal(sm_fields_split(SM_SPLIT_SPACES, 0, span(line), field), SM_FIELDS_MAX);
    assert_int_equal(sm_fields_split(SM_SPLIT_CHAR, ' ', span(line), field), SM_FIELDS_MAX);
}

static void a_word_in_utf8_or_in_single_bytes(void **state)
{
    static const struct {
        const char *sent, *word;
        bool want;
    } cases[] = {
        { "OVR", "OVR", true },
        { "ovr", "OVR", false },
        { "OVRX", "OVR", false },
        { "OV", "OVR", false },
        { "", "OVR", false },
        { "\xc2\xb0"
          "C",
          "°C", true },
        { "\xb0"
          "C",
          "°C", true },
        { "\xb0", "°C", false },
        { "C", "°C", false },
        { "\xb5S/cm", "µS/cm", true },
        { "\xfc"
          "ber",
          "über", true },
        { "\xbc"
          "ber",
          "über", false },
        { "\xce\xa9", "Ω", true },
        { "\xa9", "Ω", false },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        if (sm_span_is(span(cases[i].sent), cases[i].word) != cases[i].want)
            fail_msg("case %zu, word %s: want %d", i, cases[i].word, cases[i].want);
}

static void a_word_of_a_list_is_given_as_the_list_has_it(void **state)
{
    static const char words[SM_WORDS_MAX][SM_WORD_SIZE] = { "one", "°two" };
    static const char full[SM_WORDS_MAX][SM_WORD_SIZE] = { "1", "2", "3", "4", "5", "6", "7", "8" };
    (void)state;
    assert_ptr_equal(sm_span_in(span("\xb0two"), words), words[1]);
    assert_null(sm_span_in(span("three"), words));
    assert_null(sm_span_in(span(""), words)); /* the list's end is no word */
    assert_null(sm_span_in((struct sm_span){ NULL, 0 }, words));
    assert_ptr_equal(sm_span_in(span("8"), full), full[7]);
    assert_null(sm_span_in(span("9"), full));
}

static void a_quote_is_harmless_and_short(void **state)
{
    char got[200];
    struct sm_text t;
    (void)state;
    sm_text_init(&t, got, sizeof got);
    sm_span_quote(&t, span("\x1b[2J"));
    sm_span_quote(&t, span("123456789012345678901234"));
    sm_span_quote(&t, span("1234567890123456789012345"));
    sm_span_quote(&t, (struct sm_span){ NULL, 0 });
    assert_string_equal(got, "\"\\x1b[2J\"\"123456789012345678901234\""
                             "\"123456789012345678901234…\"\"\"");
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(fields_by_blanks_and_by_a_character),
                                        cmocka_unit_test(no_more_fields_than_are_looked_at),
                                        cmocka_unit_test(a_word_in_utf8_or_in_single_bytes),
                                        cmocka_unit_test(
                                            a_word_of_a_list_is_given_as_the_list_has_it),
                                        cmocka_unit_test(a_quote_is_harmless_and_short) };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
