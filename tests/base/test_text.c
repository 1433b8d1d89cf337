/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/text: bounded text, UTF-8, names, escaping, distance. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"

/* ---- UTF-8 ---- */

/* Source: RFC 3629 section 7, its examples with their code points. */
static void the_examples_of_rfc_3629_are_read(void **state)
{
    static const struct {
        const char *bytes;
        uint32_t codes[4];
    } cases[] = {
        { "\x41\xE2\x89\xA2\xCE\x91\x2E", { 0x41, 0x2262, 0x391, 0x2E } },
        { "\xED\x95\x9C\xEA\xB5\xAD\xEC\x96\xB4", { 0xD55C, 0xAD6D, 0xC5B4 } },
        { "\xE6\x97\xA5\xE6\x9C\xAC\xE8\xAA\x9E", { 0x65E5, 0x672C, 0x8A9E } },
        { "\xEF\xBB\xBF\xF0\xA3\x8E\xB4", { 0xFEFF, 0x233B4 } },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const char *s = cases[i].bytes;
        size_t at = 0, k = 0;
        while (at < strlen(s)) {
            uint32_t code = 0;
            const size_t len = sm_utf8_next(s + at, strlen(s) - at, &code);
            if (len == 0 || k == 4 || code != cases[i].codes[k])
                fail_msg("example %zu, character %zu: length %zu, got U+%04X", i, k, len, code);
            at += len;
            k++;
        }
        assert_int_equal(sm_utf8_span(s, strlen(s)), strlen(s));
    }
}

static bool in(unsigned char c, unsigned from, unsigned to)
{
    return c >= from && c <= to;
}

/* The grammar of RFC 3629 section 4 written down row by row: the slow twin. */
static size_t by_the_grammar(const unsigned char *u, size_t n)
{
    static const unsigned char rows[][9] = {
        { 1, 0x00, 0x7F },
        { 2, 0xC2, 0xDF, 0x80, 0xBF },
        { 3, 0xE0, 0xE0, 0xA0, 0xBF, 0x80, 0xBF },
        { 3, 0xE1, 0xEC, 0x80, 0xBF, 0x80, 0xBF },
        { 3, 0xED, 0xED, 0x80, 0x9F, 0x80, 0xBF },
        { 3, 0xEE, 0xEF, 0x80, 0xBF, 0x80, 0xBF },
        { 4, 0xF0, 0xF0, 0x90, 0xBF, 0x80, 0xBF, 0x80, 0xBF },
        { 4, 0xF1, 0xF3, 0x80, 0xBF, 0x80, 0xBF, 0x80, 0xBF },
        { 4, 0xF4, 0xF4, 0x80, 0x8F, 0x80, 0xBF, 0x80, 0xBF },
    };
    for (size_t r = 0; r < COUNT(rows); r++) {
        bool fits = rows[r][0] <= n;
        for (size_t i = 0; fits && i < rows[r][0]; i++)
            fits = in(u[i], rows[r][1 + 2 * i], rows[r][2 + 2 * i]);
        if (fits)
            return rows[r][0];
    }
    return 0;
}

static void utf8_agrees_with_the_grammar_of_rfc_3629_at_every_edge(void **state)
{
    static const unsigned char edges[] = { 0x00, 0x41, 0x7F, 0x80, 0x8F, 0x90, 0x9F, 0xA0, 0xBF,
                                           0xC0, 0xC1, 0xC2, 0xDF, 0xE0, 0xE1, 0xEC, 0xED, 0xEE,
                                           0xEF, 0xF0, 0xF1, 0xF3, 0xF4, 0xF5, 0xFF };
    const size_t k = COUNT(edges);

    (void)state;
    for (size_t i = 0; i < k * k * k * k; i++) {
        const unsigned char u[4] = { edges[i % k], edges[i / k % k], edges[i / k / k % k],
                                     edges[i / k / k / k] };
        for (size_t n = 0; n <= 4; n++) {
            const size_t got = sm_utf8_next((const char *)u, n, NULL), want = by_the_grammar(u, n);
            if (got != want)
                fail_msg("%02x %02x %02x %02x, first %zu: got %zu, want %zu", u[0], u[1], u[2],
                         u[3], n, got, want);
        }
    }
}

static void span_ends_at_the_first_byte_that_is_not_utf8(void **state)
{
    static const struct {
        const char *s;
        size_t n, want;
    } cases[] = {
        { "", 0, 0 },          { "abc", 3, 3 },       { "ab\xFF", 3, 2 },
        { "a\xC2\xB5", 3, 3 }, { "a\xC2\xB5", 2, 1 }, { "\xED\xA0\x80", 3, 0 },
        { "\xC0\xAF", 2, 0 },  { "a\0b", 3, 3 },      { "\xF4\x90\x80\x80", 4, 0 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        if (sm_utf8_span(cases[i].s, cases[i].n) != cases[i].want)
            fail_msg("case %zu: got %zu, want %zu", i, sm_utf8_span(cases[i].s, cases[i].n),
                     cases[i].want);
}

/* ---- bounded text ---- */

/* Each call below adds the same text by another way. */
static void add_by(int way, struct sm_text *t, const char *s)
{
    if (way == 0)
        sm_text_add(t, s);
    else if (way == 1)
        sm_text_addn(t, s, strlen(s));
    else if (way == 2)
        sm_text_addf(t, "%s", s);
    else
        sm_text_add_safe(t, s, strlen(s));
}

static void text_of_any_capacity_holds_whole_characters_and_says_when_cut(void **state)
{
    static const char s[] = "a\xC2\xB5"
                            "b\xE2\x89\xA2"
                            "c\xF0\xA3\x8E\xB4"
                            "d";
    (void)state;
    for (int way = 0; way < 4; way++)
        for (size_t cap = 1; cap <= sizeof s + 1; cap++) {
            char *buf = malloc(cap); /* exact, so that a sanitizer sees one byte too many */
            struct sm_text t;
            size_t want = cap - 1 < strlen(s) ? cap - 1 : strlen(s);

            while (sm_utf8_span(s, want) != want)
                want--;
            assert_non_null(buf);
            sm_text_init(&t, buf, cap);
            add_by(way, &t, s);
            if (t.len != want || strlen(buf) != want || memcmp(buf, s, want) != 0)
                fail_msg("way %d, cap %zu: got %zu bytes \"%s\", want %zu", way, cap, t.len, buf,
                         want);
            if (t.cut != (cap <= strlen(s)))
                fail_msg("way %d, cap %zu: cut is %d", way, cap, t.cut);
            free(buf);
        }
}

static void nothing_is_added_after_a_cut(void **state)
{
    char buf[6];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, buf, sizeof buf);
    sm_text_add(&t, "abc");
    sm_text_add(&t, "\xE2\x89\xA2"); /* three bytes, room for two */
    assert_true(t.cut);
    for (int way = 0; way < 4; way++)
        add_by(way, &t, "x");
    assert_string_equal(buf, "abc");
    assert_int_equal(t.len, 3);
}

static void bytes_that_are_no_utf8_are_still_bounded(void **state)
{
    char buf[8];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, buf, sizeof buf);
    sm_text_add(&t, "\x80\x80\x80\x80\x80\x80\x80\x80\x80\x80\x80");
    assert_int_equal(t.len, 7);
    assert_true(t.cut);
    sm_text_init(&t, buf, sizeof buf);
    sm_text_addn(&t, "a\0b", 3);
    assert_int_equal(t.len, 3);
    assert_memory_equal(buf, "a\0b", 4);
}

static void formatted_text_grows_piece_by_piece(void **state)
{
    char buf[32];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, buf, sizeof buf);
    assert_string_equal(buf, "");
    sm_text_addf(&t, "%d/%s", 7, "x");
    sm_text_addf(&t, "%s", "");
    sm_text_addf(&t, "+%u", 1U);
    assert_string_equal(buf, "7/x+1");
    assert_int_equal(t.len, 5);
    assert_false(t.cut);
}

static void copy_is_whole_or_cut_at_a_character(void **state)
{
    char out[5];

    (void)state;
    sm_text_copy(out, sizeof out, "abcd");
    assert_string_equal(out, "abcd");
    sm_text_copy(out, sizeof out, "abcde");
    assert_string_equal(out, "abcd");
    sm_text_copy(out, sizeof out, "abc\xC2\xB5");
    assert_string_equal(out, "abc");
    sm_text_copy(out, 1, "abc");
    assert_string_equal(out, "");
}

static void what_could_act_on_a_terminal_is_shown_as_hex(void **state)
{
    static const struct {
        const char *s;
        size_t n;
        const char *want;
    } cases[] = {
        { "plain ~\\\"", 9, "plain ~\\\"" },
        { "\0\t\r\n\033", 5, "\\x00\\x09\\x0d\\x0a\\x1b" },
        { "\x7F", 1, "\\x7f" },
        { "\xC2\xB5S \xC2\xA0", 6, "\xC2\xB5S \xC2\xA0" },
        { "\xC2\x80\xC2\x9F", 4, "\\xc2\\x80\\xc2\\x9f" },                   /* C1 */
        { "\xE2\x80\xAE", 3, "\\xe2\\x80\\xae" },                            /* U+202E override */
        { "\xE2\x81\xA6\xE2\x80\x8F", 6, "\\xe2\\x81\\xa6\\xe2\\x80\\x8f" }, /* U+2066, U+200F */
        { "\xD8\x9C", 2, "\\xd8\\x9c" },                                     /* U+061C */
        { "a\xFF\xC2", 3, "a\\xff\\xc2" },
        { "\xED\xA0\x80", 3, "\\xed\\xa0\\x80" }, /* half of a surrogate pair */
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char buf[64];
        struct sm_text t;

        sm_text_init(&t, buf, sizeof buf);
        sm_text_add_safe(&t, cases[i].s, cases[i].n);
        if (strcmp(buf, cases[i].want) != 0)
            fail_msg("case %zu: got %s, want %s", i, buf, cases[i].want);
    }
}

static void a_hex_escape_is_never_cut_in_two(void **state)
{
    (void)state;
    for (size_t cap = 1; cap <= 12; cap++) {
        char buf[12];
        struct sm_text t;

        sm_text_init(&t, buf, cap);
        sm_text_add_safe(&t, "a\xFF\x01", 3);
        if (t.len != (cap > 9 ? 9 : cap > 5 ? 5 : cap > 1 ? 1 : 0) || t.cut != (cap < 10))
            fail_msg("cap %zu: got \"%s\", cut %d", cap, buf, t.cut);
    }
}

/* ---- names ---- */

static void names_are_bounded_and_harmless(void **state)
{
    static const struct {
        const char *s;
        bool want;
    } cases[] = {
        { "final", true },
        { "a", true },
        { "clear well 2", true },
        { "K\xC3\xBChlwasser \xC2\xB5", true },
        { "\xED\x95\x9C\xEA\xB5\xAD\xEC\x96\xB4", true },
        { "<b>&\"'", true }, /* harmless once escaped where it goes out */
        { "", false },
        { " a", false },
        { "a ", false },
        { " ", false },
        { "\xC2\xA0"
          "a",
          false },                  /* U+00A0, a space too */
        { "a\xE2\x80\xA8", false }, /* U+2028, a space too */
        { "a\xE3\x80\x80", false }, /* U+3000, a space too */
        { "a\tb", false },
        { "a\nb", false },
        { "a\x7F", false },
        { "a\xC2\x85", false },     /* C1 */
        { "a\xE2\x80\xAA", false }, /* U+202A */
        { "a\xE2\x80\xAE", false }, /* U+202E */
        { "a\xE2\x81\xA6", false }, /* U+2066 */
        { "a\xE2\x81\xA9", false }, /* U+2069 */
        { "a\xE2\x80\x8E", false }, /* U+200E */
        { "a\xE2\x80\x8F", false }, /* U+200F */
        { "a\xFF", false },
        { "a\xC2", false },
        { "\xC0\x81", false },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        if (sm_name_ok(cases[i].s, strlen(cases[i].s)) != cases[i].want)
            fail_msg("case %zu \"%s\": want %d", i, cases[i].s, cases[i].want);
    assert_false(sm_name_ok("a\0b", 3));
}

static void names_have_at_most_64_characters_however_many_bytes_each(void **state)
{
    static const char *const chars[] = { "a", "\xC2\xB5", "\xE2\x89\xA2", "\xF0\xA3\x8E\xB4" };
    (void)state;
    for (size_t c = 0; c < COUNT(chars); c++)
        for (size_t n = 63; n <= 65; n++) {
            char buf[65 * 4 + 1];
            struct sm_text t;

            sm_text_init(&t, buf, sizeof buf);
            for (size_t i = 0; i < n; i++)
                sm_text_add(&t, chars[c]);
            if (sm_name_ok(buf, t.len) != (n <= SM_NAME_CHARS))
                fail_msg("%zu characters of %zu bytes", n, strlen(chars[c]));
            if (n == SM_NAME_CHARS && t.len + 1 > SM_NAME_SIZE)
                fail_msg("SM_NAME_SIZE is too small for %zu bytes", t.len);
        }
}

static void meter_names_are_lower_case_letters_digits_and_hyphens(void **state)
{
    static const char *const good[] = { "bench-2", "a", "0", "-",
                                        "abcdefghijklmnopqrstuvwxyz012345" };
    static const char *const bad[] = { "",    "Bench",    "a_b",
                                       "a b", "a/b",      "..",
                                       "a.",  "\xC2\xB5", "abcdefghijklmnopqrstuvwxyz0123456" };
    (void)state;
    for (size_t i = 0; i < COUNT(good); i++)
        if (!sm_meter_name_ok(good[i], strlen(good[i])))
            fail_msg("\"%s\" refused", good[i]);
    for (size_t i = 0; i < COUNT(bad); i++)
        if (sm_meter_name_ok(bad[i], strlen(bad[i])))
            fail_msg("\"%s\" accepted", bad[i]);
    assert_false(sm_meter_name_ok("a\0b", 3));
}

/* ---- distance ---- */

static void distance_counts_single_slips(void **state)
{
    static const struct {
        const char *a, *b;
        size_t want;
    } cases[] = {
        { "", "", 0 },
        { "abc", "abc", 0 },
        { "", "abc", 3 },
        { "dwell", "dwel", 1 },  /* one left out */
        { "dwel", "dwell", 1 },  /* one too many */
        { "dwell", "dwall", 1 }, /* one replaced */
        { "dwell", "dewll", 1 }, /* two swapped */
        { "ab", "ba", 1 },
        { "tolerance", "toleranze", 1 },
        { "kitten", "sitting", 3 }, /* worked by hand: k-s, e-i, +g */
        { "abcd", "badc", 2 },
        { "abc", "xyz", 3 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const size_t got = sm_text_distance(cases[i].a, cases[i].b);
        const size_t back = sm_text_distance(cases[i].b, cases[i].a);
        if (got != cases[i].want || back != got)
            fail_msg("%s, %s: got %zu and back %zu, want %zu", cases[i].a, cases[i].b, got, back,
                     cases[i].want);
    }
}

static void distance_of_long_strings_is_bounded(void **state)
{
    char a[80], b[80];

    (void)state;
    memset(a, 'a', sizeof a);
    memset(b, 'b', sizeof b);
    a[64] = b[64] = '\0';
    assert_int_equal(sm_text_distance(a, a), 0);
    assert_int_equal(sm_text_distance(a, b), 64);
    a[64] = 'a', a[65] = '\0';
    assert_int_equal(sm_text_distance(a, a), 64);
    assert_int_equal(sm_text_distance(a, ""), 64);
    assert_int_equal(sm_text_distance("", a), 64);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_examples_of_rfc_3629_are_read),
        cmocka_unit_test(utf8_agrees_with_the_grammar_of_rfc_3629_at_every_edge),
        cmocka_unit_test(span_ends_at_the_first_byte_that_is_not_utf8),
        cmocka_unit_test(text_of_any_capacity_holds_whole_characters_and_says_when_cut),
        cmocka_unit_test(nothing_is_added_after_a_cut),
        cmocka_unit_test(bytes_that_are_no_utf8_are_still_bounded),
        cmocka_unit_test(formatted_text_grows_piece_by_piece),
        cmocka_unit_test(copy_is_whole_or_cut_at_a_character),
        cmocka_unit_test(what_could_act_on_a_terminal_is_shown_as_hex),
        cmocka_unit_test(a_hex_escape_is_never_cut_in_two),
        cmocka_unit_test(names_are_bounded_and_harmless),
        cmocka_unit_test(names_have_at_most_64_characters_however_many_bytes_each),
        cmocka_unit_test(meter_names_are_lower_case_letters_digits_and_hyphens),
        cmocka_unit_test(distance_counts_single_slips),
        cmocka_unit_test(distance_of_long_strings_is_bounded),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
