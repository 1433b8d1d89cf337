/* SPDX-License-Identifier: GPL-3.0-or-later */
/* time.c: UTC to and from RFC 3339, in the Gregorian calendar carried back to year 0. */
#include "base/time.h"

#include <assert.h>
#include <stdbool.h>

#define DAYS_TO_1970 INT64_C(719528) /* from 0000-01-01 */
#define US_PER_S INT64_C(1000000)

/* Days before the first of each month in a year that is no leap year; [12] is the year. */
static const int month_start[13] = { 0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334, 365 };

static bool is_leap(int64_t year)
{
    return year % 4 == 0 && (year % 100 != 0 || year % 400 == 0);
}

/* Days from 0000-01-01 to the first of January of `year`, year >= 0. */
static int64_t year_start(int64_t year)
{
    const int64_t before = year - 1;

    return year == 0 ? 0 : 365 * year + before / 4 - before / 100 + before / 400 + 1;
}

/* Days before the first of month m, 1 to 13. */
static int month_day(int64_t year, int m)
{
    return month_start[m - 1] + (m > 2 && is_leap(year) ? 1 : 0);
}

int64_t sm_utc_day(int64_t utc_us)
{
    const int64_t day = utc_us / SM_US_PER_DAY;

    return utc_us % SM_US_PER_DAY < 0 ? day - 1 : day;
}

/* v in so many digits, and what follows them. */
static char *put_digits(char *at, int v, int digits, char then)
{
    for (int i = digits - 1; i >= 0; i--) {
        at[i] = (char)('0' + v % 10);
        v /= 10;
    }
    at[digits] = then;
    return at + digits + 1;
}

size_t sm_utc_write(char out[SM_UTC_SIZE], int64_t utc_us)
{
    const int64_t day = sm_utc_day(utc_us), day0 = day + DAYS_TO_1970;
    const int64_t us = utc_us - day * SM_US_PER_DAY, s = us / US_PER_S;
    int64_t year = day0 / 366;
    int month = 1, in_year;
    char *at;

    assert(day0 >= 0 && day0 < year_start(10000));
    while (year_start(year + 1) <= day0) /* the guess is at most seven years early */
        year++;
    in_year = (int)(day0 - year_start(year));
    while (month < 12 && month_day(year, month + 1) <= in_year)
        month++;
    at = put_digits(out, (int)year, 4, '-');
    at = put_digits(at, month, 2, '-');
    at = put_digits(at, in_year - month_day(year, month) + 1, 2, 'T');
    at = put_digits(at, (int)(s / 3600), 2, ':');
    at = put_digits(at, (int)(s / 60 % 60), 2, ':');
    at = put_digits(at, (int)(s % 60), 2, '.');
    at = put_digits(at, (int)(us % US_PER_S), 6, 'Z');
    *at = '\0';
    return SM_UTC_SIZE - 1;
}

/* Where a text is being read. */
struct cursor {
    const char *s;
    size_t n, at;
    bool bad;
};

static char peek(const struct cursor *c)
{
    return c->at < c->n ? c->s[c->at] : '\0';
}

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

/* Exactly so many digits, at most `most`. */
static int take_number(struct cursor *c, int digits, int most)
{
    int v = 0;

    for (int i = 0; i < digits; i++) {
        const char ch = peek(c);
        if (!is_digit(ch)) {
            c->bad = true;
            return 0;
        }
        v = 10 * v + (ch - '0');
        c->at++;
    }
    if (v > most)
        c->bad = true;
    return v;
}

/* One byte out of a few. */
static char take_one_of(struct cursor *c, const char *few)
{
    const char ch = peek(c);

    for (const char *f = few; *f != '\0'; f++)
        if (*f == ch) {
            c->at++;
            return ch;
        }
    c->bad = true;
    return '\0';
}

/* "2027-03-31" as days since 1970-01-01. */
static int64_t take_date(struct cursor *c)
{
    int year, month, day, days;

    year = take_number(c, 4, 9999);
    take_one_of(c, "-");
    month = take_number(c, 2, 99);
    take_one_of(c, "-");
    day = take_number(c, 2, 31);
    if (c->bad || month < 1 || month > 12) {
        c->bad = true;
        return 0;
    }
    days = month_day(year, month + 1) - month_day(year, month);
    if (day == 0 || day > days)
        c->bad = true;
    return year_start(year) + month_day(year, month) + day - 1 - DAYS_TO_1970;
}

/* ".52" as µs, where a point is there. */
static int64_t take_fraction(struct cursor *c)
{
    int64_t us = 0, worth = US_PER_S / 10;
    int digits = 0;

    if (peek(c) != '.')
        return 0;
    c->at++;
    while (is_digit(peek(c))) {
        us += worth * (peek(c) - '0');
        worth /= 10;
        digits++;
        c->at++;
    }
    if (digits < 1 || digits > 9)
        c->bad = true;
    return us;
}

/* "Z" or "+01:00" as seconds east. */
static int64_t take_offset(struct cursor *c)
{
    const char sign = take_one_of(c, "Zz+-");
    int64_t s;

    if (sign != '+' && sign != '-')
        return 0;
    s = INT64_C(3600) * take_number(c, 2, 23);
    take_one_of(c, ":");
    s += INT64_C(60) * take_number(c, 2, 59);
    return sign == '-' ? -s : s;
}

/* A leap second is the last second of a UTC month; what follows it is the first of a month. */
static bool starts_a_month(int64_t utc_s)
{
    char text[SM_UTC_SIZE];

    if (utc_s % 86400 != 0)
        return false;
    sm_utc_write(text, utc_s * US_PER_S);
    return text[8] == '0' && text[9] == '1';
}

enum sm_status sm_utc_parse(const char *s, size_t n, int64_t *ret_utc_us)
{
    struct cursor c = { .s = s, .n = n };
    const int64_t earliest = -DAYS_TO_1970 * 86400;
    const int64_t end = (year_start(10000) - DAYS_TO_1970) * 86400;
    int64_t utc_s, us;
    int second;

    utc_s = 86400 * take_date(&c);
    take_one_of(&c, "Tt ");
    utc_s += INT64_C(3600) * take_number(&c, 2, 23);
    take_one_of(&c, ":");
    utc_s += INT64_C(60) * take_number(&c, 2, 59);
    take_one_of(&c, ":");
    second = take_number(&c, 2, 60);
    us = take_fraction(&c);
    utc_s += second - take_offset(&c);
    if (c.bad || c.at != n || utc_s < earliest || utc_s >= end)
        return SM_ESYNTAX;
    if (second == 60 && !starts_a_month(utc_s))
        return SM_ESYNTAX;
    *ret_utc_us = utc_s * US_PER_S + us;
    return SM_OK;
}

enum sm_status sm_date_parse(const char *s, size_t n, int64_t *ret_day)
{
    struct cursor c = { .s = s, .n = n };
    const int64_t day = take_date(&c);

    if (c.bad || c.at != n)
        return SM_ESYNTAX;
    *ret_day = day;
    return SM_OK;
}
