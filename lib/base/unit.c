/* SPDX-License-Identifier: GPL-3.0-or-later */
/* unit.c: the one table of units, and values with a unit. */
#include "base/unit.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/number.h"
#include "base/time.h"

/* What a unit measures: only units of one kind turn into one another. */
enum kind {
    NUMBER,
    POTENTIAL,
    PH,
    TEMPERATURE,
    ABSORBANCE,
    CONDUCTIVITY,
    CONCENTRATION,
    PERCENT,
    TIME,
    POTENTIAL_RATE,
    PH_RATE,
    PERCENT_RATE,
    CONDUCTIVITY_RATE,
    ABSORBANCE_RATE
};

#define MICRO "\xC2\xB5"    /* U+00B5, the micro sign: how we write it */
#define GREEK_MU "\xCE\xBC" /* U+03BC, the letter: understood */

static const struct {
    const char *name;
    enum kind kind;
    double size; /* in the smallest unit of the kind: a whole number, so that one division rounds
                    once */
} units[SM_UNIT_COUNT] = {
    [SM_UNIT_NONE] = { "", NUMBER, 1 },
    [SM_UNIT_MV] = { "mV", POTENTIAL, 1 },
    [SM_UNIT_V] = { "V", POTENTIAL, 1000 },
    [SM_UNIT_PH] = { "pH", PH, 1 },
    [SM_UNIT_CELSIUS] = { "\xC2\xB0"
                          "C",
                          TEMPERATURE, 1 },
    [SM_UNIT_A] = { "A", ABSORBANCE, 1 },
    [SM_UNIT_US_CM] = { MICRO "S/cm", CONDUCTIVITY, 1 },
    [SM_UNIT_MS_CM] = { "mS/cm", CONDUCTIVITY, 1000 },
    [SM_UNIT_MG_L] = { "mg/L", CONCENTRATION, 1000 },
    [SM_UNIT_UG_L] = { MICRO "g/L", CONCENTRATION, 1 },
    [SM_UNIT_PERCENT] = { "%", PERCENT, 1 },
    [SM_UNIT_MS] = { "ms", TIME, 1 },
    [SM_UNIT_S] = { "s", TIME, 1000 },
    [SM_UNIT_MIN] = { "min", TIME, 60000 },
    [SM_UNIT_H] = { "h", TIME, 3600000 },
    [SM_UNIT_D] = { "d", TIME, 86400000 },
    [SM_UNIT_MV_MIN] = { "mV/min", POTENTIAL_RATE, 1 },
    [SM_UNIT_PH_MIN] = { "pH/min", PH_RATE, 1 },
    [SM_UNIT_PERCENT_MIN] = { "%/min", PERCENT_RATE, 1 },
    [SM_UNIT_US_CM_MIN] = { MICRO "S/cm/min", CONDUCTIVITY_RATE, 1 },
    [SM_UNIT_A_MIN] = { "A/min", ABSORBANCE_RATE, 1 },
};

static bool is_unit(enum sm_unit u)
{
    return (unsigned)u < SM_UNIT_COUNT;
}

const char *sm_unit_name(enum sm_unit u)
{
    return is_unit(u) ? units[u].name : "";
}

static bool starts_with(const char *s, size_t n, const char *head)
{
    const size_t len = strlen(head);

    return n >= len && memcmp(s, head, len) == 0;
}

/* s[n] is `name`, where a micro sign at the head may also be "u" or the letter mu. */
static bool is_called(const char *s, size_t n, const char *name)
{
    static const char *const also[] = { "u", GREEK_MU };
    const size_t len = strlen(name);

    if (n == len && memcmp(s, name, n) == 0)
        return true;
    if (!starts_with(name, len, MICRO))
        return false;
    name += strlen(MICRO);
    for (size_t i = 0; i < sizeof also / sizeof also[0]; i++) {
        const size_t head = strlen(also[i]);
        if (starts_with(s, n, also[i]) && n - head == strlen(name) &&
            memcmp(s + head, name, n - head) == 0)
            return true;
    }
    return false;
}

enum sm_status sm_unit_parse(const char *s, size_t n, enum sm_unit *ret_unit)
{
    for (unsigned u = 0; u < SM_UNIT_COUNT; u++)
        if (is_called(s, n, units[u].name)) {
            *ret_unit = (enum sm_unit)u;
            return SM_OK;
        }
    return SM_EUNKNOWN;
}

static bool is_blank(char c)
{
    return c == ' ' || c == '\t';
}

enum sm_status sm_quantity_parse(const char *s, size_t n, struct sm_quantity *ret_q)
{
    const size_t digits = sm_number_span(s, n);
    struct sm_quantity q = { 0 };
    size_t at = digits;
    enum sm_status st = sm_number_parse(s, digits, &q.value);

    if (st != SM_OK)
        return st;
    while (at < n && is_blank(s[at]))
        at++;
    st = sm_unit_parse(s + at, n - at, &q.unit);
    if (st == SM_OK)
        *ret_q = q;
    return st;
}

enum sm_status sm_quantity_ns(struct sm_quantity q, int64_t *ret_ns)
{
    const double most_ms = 36525.0 * 86400000.0; /* 100 years of 365.25 days */
    double ms;

    if (!is_unit(q.unit) || units[q.unit].kind != TIME)
        return SM_EINVAL;
    ms = q.value * units[q.unit].size;
    if (!(ms >= 0 && ms <= most_ms))
        return SM_EVALUE;
    *ret_ns = llround(ms * (double)SM_NS_PER_MS);
    return SM_OK;
}

enum sm_status sm_quantity_in(struct sm_quantity q, enum sm_unit want, double *ret_value)
{
    if (!is_unit(q.unit) || !is_unit(want) || units[q.unit].kind != units[want].kind)
        return SM_EINVAL;
    const double from = units[q.unit].size, to = units[want].size;
    const double v = from >= to ? q.value * (from / to) : q.value / (to / from);
    if (!isfinite(v))
        return SM_EVALUE;
    *ret_value = v;
    return SM_OK;
}
