/* SPDX-License-Identifier: GPL-3.0-or-later */
/* value.c: checked values out of nodes, and the sentences for those that are wrong. */
#include "setup/value.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "base/number.h"
#include "base/time.h"

/* ---- blames ---- */

static bool is_text(const struct sm_node *node)
{
    return node->kind == SM_NODE_TEXT;
}

bool sm_get_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                 char ret_name[SM_NAME_SIZE])
{
    if (node == NULL)
        return false;
    if (!is_text(node) || !sm_name_ok(node->text, node->n)) {
        sm_blame_got(r, node, "expected %s (1 to 64 printable characters)", what);
        return false;
    }
    sm_text_copy(ret_name, SM_NAME_SIZE, node->text);
    return true;
}

bool sm_get_file_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                      char ret_name[SM_NAME_SIZE])
{
    if (node == NULL)
        return false;
    if (!is_text(node) || !sm_name_ok(node->text, node->n) || node->text[0] == '.' ||
        strpbrk(node->text, "/\\") != NULL) {
        sm_blame_got(r, node, "expected %s (a file's name without folder and .yaml)", what);
        return false;
    }
    sm_text_copy(ret_name, SM_NAME_SIZE, node->text);
    return true;
}

bool sm_get_short_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                       char ret_name[SM_METER_SIZE])
{
    if (node == NULL)
        return false;
    if (!is_text(node) || !sm_meter_name_ok(node->text, node->n)) {
        sm_blame_got(r, node, "expected %s (1 to 32 of a-z, 0-9 and -)", what);
        return false;
    }
    sm_text_copy(ret_name, SM_METER_SIZE, node->text);
    return true;
}

static bool is_printable(const char *s, size_t n)
{
    size_t at = 0;

    while (at < n) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(s + at, n - at, &code);

        if (len == 0 || code < 0x20 || (code >= 0x7F && code <= 0x9F))
            return false;
        at += len;
    }
    return true;
}

bool sm_get_text(const struct sm_reader *r, const struct sm_node *node, const char *what,
                 char *ret_text, size_t cap)
{
    if (node == NULL)
        return false;
    if (!is_text(node) || node->n == 0 || node->n >= cap || !is_printable(node->text, node->n)) {
        sm_blame_got(r, node, "expected %s (one line, 1 to %zu bytes)", what, cap - 1);
        return false;
    }
    sm_text_copy(ret_text, cap, node->text);
    return true;
}

bool sm_get_choice(const struct sm_reader *r, const struct sm_node *node, const char *const *names,
                   size_t n, size_t *ret_at)
{
    char list[SM_BLAME_SIZE / 2];
    const char *near;
    struct sm_text t;

    if (node == NULL)
        return false;
    for (size_t i = 0; i < n; i++)
        if (sm_is_word(node, names[i])) {
            *ret_at = i;
            return true;
        }
    sm_text_init(&t, list, sizeof list);
    for (size_t i = 0; i < n; i++)
        sm_text_addf(&t, "%s%s", i == 0 ? "" : i + 1 == n ? " or " : ", ", names[i]);
    near = is_text(node) ? sm_nearest(node->text, names, n) : NULL;
    if (near != NULL)
        sm_blame(r, node, "expected %s, got \"%s\"; did you mean \"%s\"?", list, node->text, near);
    else
        sm_blame_got(r, node, "expected %s", list);
    return false;
}

bool sm_get_yes(const struct sm_reader *r, const struct sm_node *node, bool *ret_yes)
{
    static const char *const words[] = { "no", "yes", "off", "on", "false", "true" };

    if (node == NULL)
        return false;
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++)
        if (sm_is_word(node, words[i])) {
            *ret_yes = i % 2 == 1;
            return true;
        }
    sm_blame_got(r, node, "expected yes or no");
    return false;
}

/* ---- numbers ---- */

bool sm_get_count(const struct sm_reader *r, const struct sm_node *node, unsigned from, unsigned to,
                  unsigned *ret_count)
{
    int64_t v;

    if (node == NULL)
        return false;
    if (!is_text(node) || sm_integer_parse(node->text, node->n, &v) != SM_OK || v < from ||
        v > to) {
        sm_blame_got(r, node, "expected a whole number between %u and %u", from, to);
        return false;
    }
    *ret_count = (unsigned)v;
    return true;
}

bool sm_get_number(const struct sm_reader *r, const struct sm_node *node, double from, double to,
                   double *ret_number)
{
    char range[SM_REASON_SIZE];
    struct sm_text t;
    double v;

    if (node == NULL)
        return false;
    if (is_text(node) && sm_number_parse(node->text, node->n, &v) == SM_OK && v >= from &&
        v <= to) {
        *ret_number = v;
        return true;
    }
    sm_text_init(&t, range, sizeof range);
    sm_range_text(&t, SM_UNIT_NONE, from, to);
    sm_blame_got(r, node, "expected %s", range);
    return false;
}

/* A time as a person would write it. */
static void add_time(struct sm_text *t, int64_t ns)
{
    static const struct {
        int64_t ns;
        const char *name;
    } units[] = { { 24 * 3600 * SM_NS_PER_S, "d" },
                  { 3600 * SM_NS_PER_S, "h" },
                  { 60 * SM_NS_PER_S, "min" },
                  { SM_NS_PER_S, "s" },
                  { SM_NS_PER_MS, "ms" } };

    for (size_t i = 0; i < sizeof units / sizeof units[0]; i++)
        if (i + 1 == sizeof units / sizeof units[0] || (ns > 0 && ns % units[i].ns == 0)) {
            sm_text_addf(t, "%lld %s", (long long)(ns / units[i].ns), units[i].name);
            return;
        }
}

bool sm_get_time(const struct sm_reader *r, const struct sm_node *node, int64_t from_ns,
                 int64_t to_ns, int64_t *ret_ns)
{
    char range[SM_REASON_SIZE];
    struct sm_quantity q;
    struct sm_text t;
    int64_t ns;

    if (node == NULL)
        return false;
    if (sm_get_any_quantity(node, &q) && sm_quantity_ns(q, &ns) == SM_OK && ns >= from_ns &&
        ns <= to_ns) {
        *ret_ns = ns;
        return true;
    }
    sm_text_init(&t, range, sizeof range);
    add_time(&t, from_ns);
    sm_text_add(&t, " and ");
    add_time(&t, to_ns);
    sm_blame_got(r, node, "expected a time between %s", range);
    return false;
}

bool sm_get_any_quantity(const struct sm_node *node, struct sm_quantity *ret_q)
{
    return node != NULL && is_text(node) && sm_quantity_parse(node->text, node->n, ret_q) == SM_OK;
}

const char *sm_unit_kind(enum sm_unit unit)
{
    switch (unit) {
    case SM_UNIT_NONE:
    case SM_UNIT_COUNT:
        return "a number";
    case SM_UNIT_MV:
    case SM_UNIT_V:
        return "a potential";
    case SM_UNIT_PH:
        return "a pH value";
    case SM_UNIT_CELSIUS:
        return "a temperature";
    case SM_UNIT_A:
        return "an absorbance";
    case SM_UNIT_US_CM:
    case SM_UNIT_MS_CM:
        return "a conductivity";
    case SM_UNIT_MG_L:
    case SM_UNIT_UG_L:
        return "a concentration";
    case SM_UNIT_PERCENT:
        return "a percentage";
    case SM_UNIT_MS:
    case SM_UNIT_S:
    case SM_UNIT_MIN:
    case SM_UNIT_H:
    case SM_UNIT_D:
        return "a time";
    case SM_UNIT_MV_MIN:
    case SM_UNIT_PH_MIN:
    case SM_UNIT_PERCENT_MIN:
    case SM_UNIT_US_CM_MIN:
    case SM_UNIT_A_MIN:
        return "a change per minute";
    }
    return "a number";
}

static void add_quantity(struct sm_text *t, double v, enum sm_unit unit)
{
    char number[SM_NUMBER_SIZE];

    sm_number_write(number, v);
    sm_text_addf(t, "%s%s%s", number, unit == SM_UNIT_NONE ? "" : " ", sm_unit_name(unit));
}

void sm_range_text(struct sm_text *t, enum sm_unit unit, double from, double to)
{
    if (from <= -SM_ANY_VALUE && unit != SM_UNIT_NONE) {
        sm_text_addf(t, "a value in %s", sm_unit_name(unit));
        return;
    }
    sm_text_add(t, sm_unit_kind(unit));
    if (to >= SM_ANY_VALUE) {
        sm_text_add(t, " of at least ");
        add_quantity(t, from, unit);
    } else {
        sm_text_add(t, " between ");
        add_quantity(t, from, unit);
        sm_text_add(t, " and ");
        add_quantity(t, to, unit);
    }
}

bool sm_get_quantity(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                     double from, double to, double *ret_value)
{
    char range[SM_REASON_SIZE];
    struct sm_quantity q;
    struct sm_text t;
    double v;

    if (node == NULL)
        return false;
    if (sm_get_any_quantity(node, &q) && sm_quantity_in(q, unit, &v) == SM_OK && v >= from &&
        v <= to) {
        *ret_value = v;
        return true;
    }
    sm_text_init(&t, range, sizeof range);
    sm_range_text(&t, unit, from, to);
    sm_blame_got(r, node, "expected %s", range);
    return false;
}

/* ---- dates ---- */

bool sm_get_date(const struct sm_reader *r, const struct sm_node *node, int64_t *ret_day)
{
    if (node == NULL)
        return false;
    if (!is_text(node) || sm_date_parse(node->text, node->n, ret_day) != SM_OK) {
        sm_blame_got(r, node, "expected a date such as 2027-03-31");
        return false;
    }
    return true;
}

bool sm_get_utc(const struct sm_reader *r, const struct sm_node *node, int64_t *ret_utc_us)
{
    if (node == NULL)
        return false;
    if (!is_text(node) || sm_utc_parse(node->text, node->n, ret_utc_us) != SM_OK) {
        sm_blame_got(r, node, "expected a time such as 2026-12-01T07:05:00Z");
        return false;
    }
    return true;
}
