/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/time: UTC as RFC 3339, days and dates. */
#include "check.h"

#include <stdio.h>
#include <string.h>
#include <time.h>

#include "base/time.h"

#define EARLIEST INT64_C(-62167219200000000) /* 0000-01-01T00:00:00Z, by GNU date */
#define LATEST INT64_C(253402300799999999)   /* 9999-12-31T23:59:59.999999Z, by GNU date */

/* Source: RFC 3339 section 5.8, its examples and what it says they mean. */
static void the_examples_of_rfc_3339_are_read(void **state)
{
    static const struct {
        const char *s, *utc;
    } cases[] = {
        { "1985-04-12T23:20:50.52Z", "1985-04-12T23:20:50.520000Z" },
        { "1996-12-19T16:39:57-08:00", "1996-12-20T00:39:57.000000Z" },
        { "1990-12-31T23:59:60Z", "1991-01-01T00:00:00.000000Z" },      /* a leap second */
        { "1990-12-31T15:59:60-08:00", "1991-01-01T00:00:00.000000Z" }, /* the same one */
        { "1937-01-01T12:00:27.87+00:20", "1937-01-01T11:40:27.870000Z" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        int64_t us = 0;
        char out[SM_UTC_SIZE];
        const enum sm_status st = sm_utc_parse(cases[i].s, strlen(cases[i].s), &us);
        if (st != SM_OK)
            fail_msg("%s: status %d", cases[i].s, st);
        sm_utc_write(out, us);
        if (strcmp(out, cases[i].utc) != 0)
            fail_msg("%s: got %s, want %s", cases[i].s, out, cases[i].utc);
    }
}

/* Seconds by GNU date ("date -u -d … +%s"). */
static void other_forms_that_are_allowed_are_read(void **state)
{
    static const struct {
        const char *s;
        int64_t us;
    } cases[] = {
        { "1970-01-01T00:00:00Z", 0 },
        { "1985-04-12T23:20:50.52Z", INT64_C(482196050520000) },
        { "1985-04-12t23:20:50.52z", INT64_C(482196050520000) },
        { "1985-04-12 23:20:50.52Z", INT64_C(482196050520000) },
        { "2026-12-01T08:13:24.567890Z", INT64_C(1796112804567890) },
        { "2026-12-01T08:13:24.567890999Z", INT64_C(1796112804567890) }, /* cut, not rounded */
        { "2026-12-01T08:13:24.000000001Z", INT64_C(1796112804000000) },
        { "2026-12-01T08:13:24.5Z", INT64_C(1796112804500000) },
        { "2026-12-01T08:13:24-00:00", INT64_C(1796112804000000) },
        { "2026-12-01T09:13:24+01:00", INT64_C(1796112804000000) },
        { "2026-12-02T08:12:24+23:59", INT64_C(1796112804000000) },
        { "1969-12-31T23:59:59.999999Z", -1 },
        { "2016-12-31T23:59:60.25Z", INT64_C(1483228800250000) },
        { "2017-01-01T05:29:60+05:30", INT64_C(1483228800000000) },
        { "2000-02-29T12:00:00Z", INT64_C(951825600000000) },
        { "2024-02-29T12:00:00Z", INT64_C(1709208000000000) },
        { "0000-01-01T00:00:00Z", EARLIEST },
        { "9999-12-31T23:59:59.999999Z", LATEST },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        int64_t us = 42;
        const enum sm_status st = sm_utc_parse(cases[i].s, strlen(cases[i].s), &us);
        if (st != SM_OK || us != cases[i].us)
            fail_msg("%s: status %d, got %lld, want %lld", cases[i].s, st, (long long)us,
                     (long long)cases[i].us);
    }
}

static void what_is_no_rfc_3339_is_refused_and_leaves_the_output(void **state)
{
    static const char *const bad[] = {
        "",
        "2026-12-01",
        "2026-12-01T08:13:24", /* no zone */
        "2026-12-01T08:13:24 Z",
        "2026-12-01T08:13:24ZZ",
        " 2026-12-01T08:13:24Z",
        "2026-12-01  08:13:24Z",
        "2026-12-01_08:13:24Z",
        "2026-12-01T08:13Z",
        "2026-12-01T8:13:24Z",
        "26-12-01T08:13:24Z",
        "+2026-12-01T08:13:24Z",
        "2026-12-01T08:13:24.Z",
        "2026-12-01T08:13:24,5Z",
        "2026-12-01T08:13:24.0123456789Z", /* ten decimals */
        "2026-12-01T08:13:24+01",
        "2026-12-01T08:13:24+0100",
        "2026-12-01T08:13:24+24:00",
        "2026-12-01T08:13:24+01:60",
        "2026-12-01T24:00:00Z",
        "2026-12-01T08:60:24Z",
        "2026-12-01T08:13:61Z",
        "2026-12-01T08:13:60Z",      /* a leap second in mid-hour */
        "2026-12-01T23:59:60Z",      /* nor at the end of a mere day */
        "2016-12-31T23:59:60+01:00", /* nor at midnight of another zone */
        "2026-00-01T00:00:00Z",
        "2026-13-01T00:00:00Z",
        "2026-12-00T00:00:00Z",
        "2026-12-32T00:00:00Z",
        "2026-11-31T00:00:00Z",
        "2026-02-29T00:00:00Z",
        "1900-02-29T00:00:00Z", /* a century that is no leap year */
        "2026-12-0aT00:00:00Z",
        "0000-01-01T00:00:00+00:01", /* would be a year before 0000 */
        "9999-12-31T23:59:59-00:01", /* a year after 9999 */
        "9999-12-31T23:59:60Z",
    };
    (void)state;
    for (size_t i = 0; i < COUNT(bad); i++) {
        int64_t us = 42;
        const enum sm_status st = sm_utc_parse(bad[i], strlen(bad[i]), &us);
        if (st != SM_ESYNTAX || us != 42)
            fail_msg("\"%s\": status %d, output %lld", bad[i], st, (long long)us);
    }
}

static void every_beginning_of_a_time_is_refused(void **state)
{
    static const char s[] = "2026-12-01T08:13:24.567+01:00";
    int64_t us = 42;

    (void)state;
    for (size_t n = 0; n < strlen(s); n++)
        if (sm_utc_parse(s, n, &us) != SM_ESYNTAX || us != 42)
            fail_msg("\"%.*s\" was read", (int)n, s);
    assert_int_equal(sm_utc_parse(s, strlen(s), &us), SM_OK);
}

/* The C library's calendar is the twin; every 5th day and a time of day that moves along. */
static void the_calendar_agrees_with_the_c_library(void **state)
{
    (void)state;
    for (int64_t day = EARLIEST / SM_US_PER_DAY; day <= LATEST / SM_US_PER_DAY; day += 5) {
        const int64_t in_day = (day * INT64_C(7919) % 86400 + 86400) % 86400;
        const time_t s = (time_t)(day * 86400 + in_day);
        const int64_t us = (int64_t)s * 1000000 + in_day;
        struct tm tm;
        char want[80], got[SM_UTC_SIZE];
        int64_t back = 42, date = 42;

        gmtime_r(&s, &tm);
        snprintf(want, sizeof want, "%04d-%02d-%02dT%02d:%02d:%02d.%06dZ", tm.tm_year + 1900,
                 tm.tm_mon + 1, tm.tm_mday, tm.tm_hour, tm.tm_min, tm.tm_sec, (int)in_day);
        if (sm_utc_write(got, us) != 27 || strcmp(got, want) != 0)
            fail_msg("%lld: got %s, want %s", (long long)us, got, want);
        if (sm_utc_parse(got, 27, &back) != SM_OK || back != us)
            fail_msg("%s: came back as %lld, was %lld", got, (long long)back, (long long)us);
        if (sm_date_parse(got, 10, &date) != SM_OK || date != day || sm_utc_day(us) != day)
            fail_msg("%s: day %lld by date, %lld by time, want %lld", got, (long long)date,
                     (long long)sm_utc_day(us), (long long)day);
    }
}

static void every_day_of_four_centuries_has_its_number(void **state)
{
    static const int days[12] = { 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31 };
    int64_t want = 0;

    (void)state;
    for (int y = 1970; y < 2370; y++)
        for (int m = 1; m <= 12; m++) {
            const bool leap = y % 4 == 0 && (y % 100 != 0 || y % 400 == 0);
            const int last = days[m - 1] + (m == 2 && leap);
            for (int d = 1; d <= 31; d++) {
                char s[40];
                int64_t got = -42;
                snprintf(s, sizeof s, "%04d-%02d-%02d", y, m, d);
                if (sm_date_parse(s, 10, &got) != (d <= last ? SM_OK : SM_ESYNTAX))
                    fail_msg("%s: read or refused wrongly", s);
                if (d <= last && got != want++)
                    fail_msg("%s: got day %lld, want %lld", s, (long long)got, (long long)want - 1);
            }
        }
}

static void the_ends_of_the_calendar_are_written(void **state)
{
    char out[SM_UTC_SIZE];

    (void)state;
    sm_utc_write(out, EARLIEST);
    assert_string_equal(out, "0000-01-01T00:00:00.000000Z");
    sm_utc_write(out, LATEST);
    assert_string_equal(out, "9999-12-31T23:59:59.999999Z");
}

static void days_are_counted_downwards_before_1970(void **state)
{
    (void)state;
    assert_int_equal(sm_utc_day(0), 0);
    assert_int_equal(sm_utc_day(SM_US_PER_DAY - 1), 0);
    assert_int_equal(sm_utc_day(SM_US_PER_DAY), 1);
    assert_int_equal(sm_utc_day(-1), -1);
    assert_int_equal(sm_utc_day(-SM_US_PER_DAY), -1);
    assert_int_equal(sm_utc_day(-SM_US_PER_DAY - 1), -2);
}

static void what_is_no_date_is_refused(void **state)
{
    static const char *const bad[] = { "",           "2027-3-31",  "2027-03-31 ",
                                       "20270331",   "2027/03/31", "2027-03-31T00:00:00Z",
                                       "2027-02-29", "31-03-2027", "2027-03" };
    (void)state;
    for (size_t i = 0; i < COUNT(bad); i++) {
        int64_t day = 42;
        if (sm_date_parse(bad[i], strlen(bad[i]), &day) != SM_ESYNTAX || day != 42)
            fail_msg("\"%s\" was read as day %lld", bad[i], (long long)day);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_examples_of_rfc_3339_are_read),
        cmocka_unit_test(other_forms_that_are_allowed_are_read),
        cmocka_unit_test(what_is_no_rfc_3339_is_refused_and_leaves_the_output),
        cmocka_unit_test(every_beginning_of_a_time_is_refused),
        cmocka_unit_test(the_calendar_agrees_with_the_c_library),
        cmocka_unit_test(every_day_of_four_centuries_has_its_number),
        cmocka_unit_test(the_ends_of_the_calendar_are_written),
        cmocka_unit_test(days_are_counted_downwards_before_1970),
        cmocka_unit_test(what_is_no_date_is_refused),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
