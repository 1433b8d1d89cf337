/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/number: what is a number, and numbers that come back the same. */
#include "check.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/number.h"

static void decimal_numbers_are_read(void **state)
{
    static const struct {
        const char *s;
        double want;
    } cases[] = {
        { "0", 0 },
        { "7", 7 },
        { "-12.4", -12.4 },
        { "-0012.40", -12.4 },
        { "+3.5", 3.5 },
        { ".5", 0.5 },
        { "5.", 5 },
        { "1e3", 1000 },
        { "1E+3", 1000 },
        { "1.25e-3", 0.00125 },
        { "-.5e1", -5 },
        { "007", 7 }, /* not octal */
        { "0.1", 0.1 },
        { "1.7976931348623157e308", DBL_MAX },
        { "4.9406564584124654e-324", 4.9406564584124654e-324 },
        { "1e-400", 0 },
        { "0e999", 0 },
        { "123456789012345678901234567890123456789012345678901234567890123",
          1.2345678901234568e62 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        double got = -1;
        const enum sm_status st = sm_number_parse(cases[i].s, strlen(cases[i].s), &got);
        if (st != SM_OK || got != cases[i].want)
            fail_msg("\"%s\": status %d, got %.17g, want %.17g", cases[i].s, st, got,
                     cases[i].want);
    }
}

static void what_is_no_decimal_number_is_refused_and_leaves_the_output(void **state)
{
    static const char *const bad[] = {
        "",       " ",        " 1",   "1 ",    "1\n",   "1,5",   "1.2.3",    "--1",
        "+-1",    "-",        "+",    ".",     "-.",    "e3",    ".e3",      "1e",
        "1e+",    "1e3.5",    "0x10", "0x1p3", "inf",   "-inf",  "nan",      "NAN",
        "NaN(1)", "infinity", "1d3",  "1f",    "1_000", "1'000", "\xC2\xBD", "\xE2\x88\x92\x31"
    };
    (void)state;
    for (size_t i = 0; i < COUNT(bad); i++) {
        double got = 42;
        const enum sm_status st = sm_number_parse(bad[i], strlen(bad[i]), &got);
        if (st != SM_ESYNTAX || got != 42)
            fail_msg("\"%s\": status %d, output %g", bad[i], st, got);
    }
}

static void too_long_a_text_or_too_large_a_number_is_refused(void **state)
{
    char s[65];
    double got = 42;

    (void)state;
    memset(s, '1', sizeof s);
    assert_int_equal(sm_number_parse(s, 63, &got), SM_OK);
    got = 42;
    assert_int_equal(sm_number_parse(s, 64, &got), SM_ESYNTAX);
    assert_int_equal(sm_number_parse("1e309", 5, &got), SM_EVALUE);
    assert_int_equal(sm_number_parse("-1e309", 6, &got), SM_EVALUE);
    assert_int_equal(sm_number_parse("1e99999999999999999999", 22, &got), SM_EVALUE);
    assert_int_equal(sm_number_parse("1\0", 2, &got), SM_ESYNTAX);
    assert_true(got == 42);
}

static void only_the_bytes_given_are_read(void **state)
{
    double got;

    (void)state;
    assert_int_equal(sm_number_parse("12345", 2, &got), SM_OK);
    assert_true(got == 12);
    assert_int_equal(sm_number_parse("1e5", 1, &got), SM_OK);
    assert_true(got == 1);
}

static void span_is_the_longest_number_at_the_head(void **state)
{
    static const struct {
        const char *s;
        size_t want;
    } cases[] = { { "0.6 mV", 3 }, { "12e", 2 },  { "12e+", 2 }, { "12e-3x", 5 }, { "1.2.3", 3 },
                  { "-", 0 },      { "abc", 0 },  { "", 0 },     { "5.", 2 },     { ".", 0 },
                  { "+.5V", 3 },   { "0x10", 1 }, { "1A", 1 },   { "inf", 0 } };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const size_t got = sm_number_span(cases[i].s, strlen(cases[i].s));
        if (got != cases[i].want)
            fail_msg("\"%s\": got %zu, want %zu", cases[i].s, got, cases[i].want);
    }
}

static void whole_numbers_are_read_to_their_limits(void **state)
{
    static const struct {
        const char *s;
        enum sm_status st;
        int64_t want;
    } cases[] = {
        { "0", SM_OK, 0 },
        { "-0", SM_OK, 0 },
        { "+12", SM_OK, 12 },
        { "-0012", SM_OK, -12 },
        { "9223372036854775807", SM_OK, INT64_MAX },
        { "-9223372036854775808", SM_OK, INT64_MIN },
        { "-9223372036854775807", SM_OK, -INT64_MAX },
        { "9223372036854775808", SM_EVALUE, 42 },
        { "-9223372036854775809", SM_EVALUE, 42 },
        { "99999999999999999999999999", SM_EVALUE, 42 },
        { "000000000000000000000000000000000000000000000000000000000000012", SM_OK, 12 },
        { "", SM_ESYNTAX, 42 },
        { "-", SM_ESYNTAX, 42 },
        { "1.0", SM_ESYNTAX, 42 },
        { "1.", SM_ESYNTAX, 42 },
        { "1e3", SM_ESYNTAX, 42 },
        { "0x1", SM_ESYNTAX, 42 },
        { " 1", SM_ESYNTAX, 42 },
        { "1 ", SM_ESYNTAX, 42 },
        { "0000000000000000000000000000000000000000000000000000000000000001", SM_ESYNTAX, 42 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        int64_t got = 42;
        const enum sm_status st = sm_integer_parse(cases[i].s, strlen(cases[i].s), &got);
        if (st != cases[i].st || got != cases[i].want)
            fail_msg("\"%s\": status %d, got %lld, want status %d, %lld", cases[i].s, st,
                     (long long)got, cases[i].st, (long long)cases[i].want);
    }
}

static void numbers_are_written_with_the_fewest_digits_that_come_back(void **state)
{
    static const struct {
        double v;
        const char *want;
    } cases[] = {
        { 0, "0" },
        { -0.0, "-0" },
        { 7, "7" },
        { -12.4, "-12.4" },
        { 0.1, "0.1" },
        { 0.1 + 0.2, "0.30000000000000004" }, /* needs 17 */
        { 1.0 / 3, "0.3333333333333333" },    /* needs 16 */
        { 1e20, "1e+20" },
        { 1e-7, "1e-07" },
        { 123456, "123456" },
        { 9007199254740993.0, "9007199254740992" }, /* 2^53 + 1 is no double */
        { DBL_MAX, "1.7976931348623157e+308" },
        { -DBL_MIN, "-2.2250738585072014e-308" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char out[SM_NUMBER_SIZE];
        const size_t n = sm_number_write(out, cases[i].v);
        if (strcmp(out, cases[i].want) != 0 || n != strlen(out))
            fail_msg("got \"%s\" (length %zu), want \"%s\"", out, n, cases[i].want);
    }
}

/* RFC 8259 section 6: [ minus ] int [ frac ] [ exp ], int without leading zeros. */
static bool is_json_number(const char *s)
{
    const char *digits = "0123456789";

    if (*s == '-')
        s++;
    if (*s == '0')
        s++;
    else if (*s >= '1' && *s <= '9')
        s += strspn(s, digits);
    else
        return false;
    if (*s == '.') {
        if (strspn(s + 1, digits) == 0)
            return false;
        s += 1 + strspn(s + 1, digits);
    }
    if (*s == 'e' || *s == 'E') {
        s += s[1] == '+' || s[1] == '-' ? 2 : 1;
        if (strspn(s, digits) == 0)
            return false;
        s += strspn(s, digits);
    }
    return *s == '\0';
}

static uint64_t next_bits(uint64_t *seed) /* splitmix64, a published generator */
{
    uint64_t z = *seed += UINT64_C(0x9E3779B97F4A7C15);

    z = (z ^ (z >> 30)) * UINT64_C(0xBF58476D1CE4E5B9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94D049BB133111EB);
    return z ^ (z >> 31);
}

static void any_double_comes_back_and_is_json(void **state)
{
    const uint64_t first_seed = 20261201;
    uint64_t seed = first_seed;

    (void)state;
    for (int i = 0; i < 20000; i++) {
        const uint64_t bits = next_bits(&seed);
        char out[SM_NUMBER_SIZE], fewer[400];
        double v, back = 0, other = 0;
        size_t n, digits = 0;

        memcpy(&v, &bits, sizeof v);
        if (!isfinite(v))
            continue;
        n = sm_number_write(out, v);
        if (!is_json_number(out))
            fail_msg("seed %llu, number %d: \"%s\" is not JSON", (unsigned long long)first_seed, i,
                     out);
        if (sm_number_parse(out, n, &back) != SM_OK || memcmp(&back, &v, sizeof v) != 0)
            fail_msg("seed %llu, number %d: \"%s\" came back as %a, was %a",
                     (unsigned long long)first_seed, i, out, back, v);
        for (const char *c = out; *c != '\0' && *c != 'e'; c++)
            digits += *c >= '0' && *c <= '9' && (digits > 0 || *c != '0');
        if (digits > 15) { /* then one digit fewer must not do */
            snprintf(fewer, sizeof fewer, "%.*g", (int)digits - 1, v);
            if (sm_number_parse(fewer, strlen(fewer), &other) == SM_OK && other == v)
                fail_msg("seed %llu, number %d: \"%s\", though \"%s\" does",
                         (unsigned long long)first_seed, i, out, fewer);
        }
    }
}

static void the_step_is_that_of_the_last_digit(void **state)
{
    static const struct {
        const char *s;
        double want;
    } cases[] = {
        { "-0012.40", 0.01 },
        { "7", 1 },
        { "1.2e-3", 0.0001 },
        { "700", 1 },
        { "5.", 1 },
        { ".500", 0.001 },
        { "1e3", 1000 },
        { "1.25E+1", 0.1 },
        { "0.0", 0.1 },
        { "+4", 1 },
        { "abc", 0 },
        { "", 0 },
        { "1.2 ", 0 },
        { "nan", 0 },
        { "0e999", 0 },
        { "1.0e-9", 1e-10 },
        { "12.3456789012", 1e-10 },
        { "0000000000000000000000000000000000000000000000000000000000001.5", 0.1 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const double got = sm_number_step(cases[i].s, strlen(cases[i].s));
        if (got != cases[i].want)
            fail_msg("\"%s\": got %.17g, want %.17g", cases[i].s, got, cases[i].want);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(decimal_numbers_are_read),
        cmocka_unit_test(what_is_no_decimal_number_is_refused_and_leaves_the_output),
        cmocka_unit_test(too_long_a_text_or_too_large_a_number_is_refused),
        cmocka_unit_test(only_the_bytes_given_are_read),
        cmocka_unit_test(span_is_the_longest_number_at_the_head),
        cmocka_unit_test(whole_numbers_are_read_to_their_limits),
        cmocka_unit_test(numbers_are_written_with_the_fewest_digits_that_come_back),
        cmocka_unit_test(any_double_comes_back_and_is_json),
        cmocka_unit_test(the_step_is_that_of_the_last_digit),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
