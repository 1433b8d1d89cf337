/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/unit: units, values with a unit, times, and turning like into like. */
#include "check.h"

#include <math.h>
#include <string.h>

#include "base/time.h"
#include "base/unit.h"

static void every_unit_is_read_back_from_its_name(void **state)
{
    (void)state;
    for (int u = 0; u < SM_UNIT_COUNT; u++) {
        const char *name = sm_unit_name((enum sm_unit)u);
        enum sm_unit got = SM_UNIT_COUNT;

        if (name == NULL || (u != SM_UNIT_NONE && *name == '\0'))
            fail_msg("unit %d has no name", u);
        if (sm_unit_parse(name, strlen(name), &got) != SM_OK || (int)got != u)
            fail_msg("\"%s\": got unit %d, want %d", name, got, u);
    }
    assert_string_equal(sm_unit_name(SM_UNIT_COUNT), "");
    assert_string_equal(sm_unit_name((enum sm_unit) - 1), "");
}

static void units_have_the_names_of_the_trade(void **state)
{
    static const struct {
        enum sm_unit u;
        const char *want;
    } cases[] = {
        { SM_UNIT_NONE, "" },
        { SM_UNIT_MV, "mV" },
        { SM_UNIT_PH, "pH" },
        { SM_UNIT_CELSIUS, "\xC2\xB0"
                           "C" },
        { SM_UNIT_US_CM, "\xC2\xB5"
                         "S/cm" }, /* U+00B5, not U+03BC */
        { SM_UNIT_UG_L, "\xC2\xB5"
                        "g/L" },
        { SM_UNIT_PERCENT, "%" },
        { SM_UNIT_MIN, "min" },
        { SM_UNIT_PH_MIN, "pH/min" },
        { SM_UNIT_PERCENT_MIN, "%/min" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        assert_string_equal(sm_unit_name(cases[i].u), cases[i].want);
}

static void micro_may_be_written_in_three_ways(void **state)
{
    static const struct {
        const char *s;
        enum sm_unit want;
    } cases[] = {
        { "uS/cm", SM_UNIT_US_CM },
        { "\xCE\xBC"
          "S/cm",
          SM_UNIT_US_CM },
        { "ug/L", SM_UNIT_UG_L },
        { "\xCE\xBC"
          "g/L",
          SM_UNIT_UG_L },
        { "uS/cm/min", SM_UNIT_US_CM_MIN },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        enum sm_unit got = SM_UNIT_COUNT;
        if (sm_unit_parse(cases[i].s, strlen(cases[i].s), &got) != SM_OK || got != cases[i].want)
            fail_msg("\"%s\": got unit %d, want %d", cases[i].s, got, cases[i].want);
    }
}

static void what_is_none_of_our_units_is_unknown(void **state)
{
    static const char *const bad[] = { "C",    "mv",  "MV",  "Mv",       "ph",       "PH",
                                       "v",    "S",   "sec", "Min",      "us/cm",    "US/CM",
                                       "S/cm", "uS",  "u",   "\xC2\xB5", "\xCE\xBC", "mg/l",
                                       "ppm",  "mVx", "mV ", " mV",      "\xC2\xB0", "K",
                                       "a",    "m",   "%%",  "mV/s" };
    (void)state;
    for (size_t i = 0; i < COUNT(bad); i++) {
        enum sm_unit got = SM_UNIT_COUNT;
        if (sm_unit_parse(bad[i], strlen(bad[i]), &got) != SM_EUNKNOWN || got != SM_UNIT_COUNT)
            fail_msg("\"%s\" was read as unit %d", bad[i], got);
    }
    enum sm_unit got = SM_UNIT_COUNT;
    assert_int_equal(sm_unit_parse("mV\0", 3, &got), SM_EUNKNOWN);
}

static void values_with_a_unit_are_read(void **state)
{
    static const struct {
        const char *s;
        double value;
        enum sm_unit unit;
    } cases[] = {
        { "0.6 mV", 0.6, SM_UNIT_MV },
        { "98 %", 98, SM_UNIT_PERCENT },
        { "98%", 98, SM_UNIT_PERCENT },
        { "15 s", 15, SM_UNIT_S },
        { "7", 7, SM_UNIT_NONE },
        { "7 ", 7, SM_UNIT_NONE },
        { "-30 \t mV", -30, SM_UNIT_MV },
        { "1e3 mg/L", 1000, SM_UNIT_MG_L },
        { "0.005 pH/min", 0.005, SM_UNIT_PH_MIN },
        { "25 \xC2\xB0"
          "C",
          25, SM_UNIT_CELSIUS },
        { "0.002 A", 0.002, SM_UNIT_A },
        { "+2 h", 2, SM_UNIT_H },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_quantity q = { 0 };
        const enum sm_status st = sm_quantity_parse(cases[i].s, strlen(cases[i].s), &q);
        if (st != SM_OK || q.value != cases[i].value || q.unit != cases[i].unit)
            fail_msg("\"%s\": status %d, got %g unit %d", cases[i].s, st, q.value, q.unit);
    }
}

static void values_that_cannot_be_read_say_why(void **state)
{
    static const struct {
        const char *s;
        enum sm_status want;
    } cases[] = {
        { "", SM_ESYNTAX },        { "mV", SM_ESYNTAX },        { " 1 mV", SM_ESYNTAX },
        { "nan mV", SM_ESYNTAX },  { "inf", SM_ESYNTAX },       { "- 1 mV", SM_ESYNTAX },
        { "1,5 mV", SM_EUNKNOWN }, { "1 C", SM_EUNKNOWN },      { "1 mV 2", SM_EUNKNOWN },
        { "1 mV ", SM_EUNKNOWN },  { "1e999 mV", SM_EVALUE },   { "0x10 mV", SM_EUNKNOWN },
        { "12e", SM_EUNKNOWN },    { "1.2.3 mV", SM_EUNKNOWN },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_quantity q = { .value = 42 };
        const enum sm_status st = sm_quantity_parse(cases[i].s, strlen(cases[i].s), &q);
        if (st != cases[i].want || q.value != 42)
            fail_msg("\"%s\": status %d, want %d, value %g", cases[i].s, st, cases[i].want,
                     q.value);
    }
}

static void times_become_nanoseconds(void **state)
{
    static const struct {
        struct sm_quantity q;
        int64_t want;
    } cases[] = {
        { { 15, SM_UNIT_S }, 15 * SM_NS_PER_S },
        { { 0, SM_UNIT_H }, 0 },
        { { 0.1, SM_UNIT_S }, 100000000 },
        { { 1.1, SM_UNIT_S }, 1100000000 },
        { { 250, SM_UNIT_MS }, 250 * SM_NS_PER_MS },
        { { 0.0000005, SM_UNIT_MS }, 1 }, /* half a ns: rounded to the nearest */
        { { 2, SM_UNIT_MIN }, 120 * SM_NS_PER_S },
        { { 8, SM_UNIT_H }, 28800 * SM_NS_PER_S },
        { { 28, SM_UNIT_D }, 28 * 86400 * SM_NS_PER_S },
        { { 36525, SM_UNIT_D }, INT64_C(36525) * 86400 * SM_NS_PER_S },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        int64_t got = -42;
        const enum sm_status st = sm_quantity_ns(cases[i].q, &got);
        if (st != SM_OK || got != cases[i].want)
            fail_msg("%g %s: status %d, got %lld, want %lld", cases[i].q.value,
                     sm_unit_name(cases[i].q.unit), st, (long long)got, (long long)cases[i].want);
    }
}

static void what_is_no_time_or_too_long_is_refused(void **state)
{
    static const struct {
        struct sm_quantity q;
        enum sm_status want;
    } cases[] = {
        { { 15, SM_UNIT_NONE }, SM_EINVAL },  { { 15, SM_UNIT_MV }, SM_EINVAL },
        { { 1, SM_UNIT_MV_MIN }, SM_EINVAL }, { { 1, SM_UNIT_COUNT }, SM_EINVAL },
        { { -1, SM_UNIT_S }, SM_EVALUE },     { { 36526, SM_UNIT_D }, SM_EVALUE },
        { { NAN, SM_UNIT_S }, SM_EVALUE },    { { INFINITY, SM_UNIT_S }, SM_EVALUE },
        { { 1e300, SM_UNIT_MS }, SM_EVALUE },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        int64_t got = -42;
        const enum sm_status st = sm_quantity_ns(cases[i].q, &got);
        if (st != cases[i].want || got != -42)
            fail_msg("case %zu: status %d, want %d, output %lld", i, st, cases[i].want,
                     (long long)got);
    }
}

static void like_units_turn_into_one_another_exactly(void **state)
{
    static const struct {
        struct sm_quantity q;
        enum sm_unit want_unit;
        double want; /* written in decimal: one rounding only, so equal to the last bit */
    } cases[] = {
        { { 0.4123, SM_UNIT_V }, SM_UNIT_MV, 412.3 },
        { { 412.3, SM_UNIT_MV }, SM_UNIT_V, 0.4123 },
        { { 1.413, SM_UNIT_MS_CM }, SM_UNIT_US_CM, 1413 },
        { { 1413, SM_UNIT_US_CM }, SM_UNIT_MS_CM, 1.413 },
        { { 50, SM_UNIT_UG_L }, SM_UNIT_MG_L, 0.05 },
        { { 0.05, SM_UNIT_MG_L }, SM_UNIT_UG_L, 50 },
        { { 2, SM_UNIT_MIN }, SM_UNIT_S, 120 },
        { { 7, SM_UNIT_PH }, SM_UNIT_PH, 7 },
        { { 0.3, SM_UNIT_PERCENT }, SM_UNIT_PERCENT, 0.3 },
        { { 5, SM_UNIT_NONE }, SM_UNIT_NONE, 5 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        double got = -42;
        const enum sm_status st = sm_quantity_in(cases[i].q, cases[i].want_unit, &got);
        if (st != SM_OK || got != cases[i].want)
            fail_msg("%g %s: status %d, got %.17g, want %.17g", cases[i].q.value,
                     sm_unit_name(cases[i].q.unit), st, got, cases[i].want);
    }
}

static void unlike_units_never_turn_into_one_another(void **state)
{
    static const struct {
        struct sm_quantity q;
        enum sm_unit want;
        enum sm_status st;
    } cases[] = {
        { { 1, SM_UNIT_MV }, SM_UNIT_PH, SM_EINVAL },
        { { 1, SM_UNIT_NONE }, SM_UNIT_PERCENT, SM_EINVAL },
        { { 1, SM_UNIT_NONE }, SM_UNIT_MV, SM_EINVAL },
        { { 1, SM_UNIT_MV }, SM_UNIT_MV_MIN, SM_EINVAL },
        { { 1, SM_UNIT_MS }, SM_UNIT_MS_CM, SM_EINVAL },
        { { 1, SM_UNIT_COUNT }, SM_UNIT_MV, SM_EINVAL },
        { { 1, SM_UNIT_MV }, SM_UNIT_COUNT, SM_EINVAL },
        { { 1e306, SM_UNIT_V }, SM_UNIT_MV, SM_EVALUE },
        { { NAN, SM_UNIT_V }, SM_UNIT_MV, SM_EVALUE },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        double got = -42;
        const enum sm_status st = sm_quantity_in(cases[i].q, cases[i].want, &got);
        if (st != cases[i].st || got != -42)
            fail_msg("case %zu: status %d, want %d, output %g", i, st, cases[i].st, got);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_unit_is_read_back_from_its_name),
        cmocka_unit_test(units_have_the_names_of_the_trade),
        cmocka_unit_test(micro_may_be_written_in_three_ways),
        cmocka_unit_test(what_is_none_of_our_units_is_unknown),
        cmocka_unit_test(values_with_a_unit_are_read),
        cmocka_unit_test(values_that_cannot_be_read_say_why),
        cmocka_unit_test(times_become_nanoseconds),
        cmocka_unit_test(what_is_no_time_or_too_long_is_refused),
        cmocka_unit_test(like_units_turn_into_one_another_exactly),
        cmocka_unit_test(unlike_units_never_turn_into_one_another),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
