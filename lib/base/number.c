/* SPDX-License-Identifier: GPL-3.0-or-later */
/* number.c: numbers read and written. The form is checked here, so that nothing but decimal digits
 * reaches strtod; strtod and snprintf use the point because no part of the program ever leaves the
 * locale "C" it starts in. */
#include "base/number.h"

#include <assert.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define LONGEST 63

/* The parts of a number's text. */
struct form {
    size_t len;      /* bytes in all */
    size_t decimals; /* digits after the point */
    long exponent;   /* kept within ±9999 */
    bool real;       /* has a point or an exponent */
};

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

static size_t digits_at(const char *s, size_t n, size_t at)
{
    size_t k = 0;

    while (at + k < n && is_digit(s[at + k]))
        k++;
    return k;
}

/* The exponent at s[f->len], if a whole one is there. */
static void read_exponent(const char *s, size_t n, struct form *f)
{
    size_t at = f->len, k;
    bool minus = false;

    if (at >= n || (s[at] != 'e' && s[at] != 'E'))
        return;
    at++;
    if (at < n && (s[at] == '+' || s[at] == '-'))
        minus = s[at++] == '-';
    k = digits_at(s, n, at);
    if (k == 0)
        return;
    for (size_t i = 0; i < k; i++)
        if (f->exponent < 1000)
            f->exponent = 10 * f->exponent + (s[at + i] - '0');
    if (minus)
        f->exponent = -f->exponent;
    f->len = at + k;
    f->real = true;
}

/* The longest number at the head of s[n]; false where there is none. */
static bool read_form(const char *s, size_t n, struct form *ret_form)
{
    struct form f = { 0 };
    size_t whole;

    if (n > 0 && (s[0] == '+' || s[0] == '-'))
        f.len = 1;
    whole = digits_at(s, n, f.len);
    f.len += whole;
    if (f.len < n && s[f.len] == '.') {
        f.decimals = digits_at(s, n, f.len + 1);
        if (whole + f.decimals > 0) {
            f.len += 1 + f.decimals;
            f.real = true;
        }
    }
    if (whole + f.decimals == 0)
        return false;
    read_exponent(s, n, &f);
    *ret_form = f;
    return true;
}

size_t sm_number_span(const char *s, size_t n)
{
    struct form f;

    return read_form(s, n, &f) ? f.len : 0;
}

enum sm_status sm_number_parse(const char *s, size_t n, double *ret_value)
{
    char text[LONGEST + 1];
    double v;

    if (n == 0 || n > LONGEST || sm_number_span(s, n) != n)
        return SM_ESYNTAX;
    memcpy(text, s, n);
    text[n] = '\0';
    v = strtod(text, NULL);
    if (!isfinite(v))
        return SM_EVALUE;
    *ret_value = v;
    return SM_OK;
}

enum sm_status sm_integer_parse(const char *s, size_t n, int64_t *ret_value)
{
    struct form f;
    const bool minus = n > 0 && s[0] == '-';
    int64_t v = 0; /* counted downwards: -2^63 has no positive twin */

    if (n == 0 || n > LONGEST || !read_form(s, n, &f) || f.len != n || f.real)
        return SM_ESYNTAX;
    for (size_t i = 0; i < n; i++) {
        if (!is_digit(s[i]))
            continue; /* the sign */
        const int d = s[i] - '0';
        if (v < (INT64_MIN + d) / 10)
            return SM_EVALUE;
        v = 10 * v - d;
    }
    if (!minus && v == INT64_MIN)
        return SM_EVALUE;
    *ret_value = minus ? v : -v;
    return SM_OK;
}

size_t sm_number_write(char out[SM_NUMBER_SIZE], double v)
{
    int len = 0;

    assert(isfinite(v));
    for (int digits = 15; digits <= 17; digits++) {
        len = snprintf(out, SM_NUMBER_SIZE, "%.*g", digits, v);
        if (strtod(out, NULL) == v)
            break;
    }
    return (size_t)len;
}

double sm_number_step(const char *s, size_t n)
{
    char text[32];
    struct form f;
    double step;

    if (n > LONGEST || !read_form(s, n, &f) || f.len != n)
        return 0;
    snprintf(text, sizeof text, "1e%ld", f.exponent - (long)f.decimals);
    step = strtod(text, NULL); /* rather than pow(): the nearest double to the power of ten */
    return isfinite(step) ? step : 0;
}
