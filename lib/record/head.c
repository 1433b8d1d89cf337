/* SPDX-License-Identifier: GPL-3.0-or-later */
/* head.c: {"n":N,"t":T,"utc":"2026-12-01T08:13:24.567890Z","k":"KIND" */
#include "record/head.h"

#include <string.h>

#include "base/time.h"

/* Where a line is being read; at > n never. */
struct cursor {
    const char *s;
    size_t n, at;
};

static bool pass(struct cursor *c, const char *text, size_t len)
{
    if (c->n - c->at < len || memcmp(c->s + c->at, text, len) != 0)
        return false;
    c->at += len;
    return true;
}

#define DIGITS_MOST 18 /* a longer number is damage: 31 years in ns are shorter */

/* A whole number as our writer writes it: no sign, no zero in front. */
static bool take_number(struct cursor *c, int64_t *ret)
{
    const size_t from = c->at;
    int64_t v = 0;

    while (c->at < c->n && c->s[c->at] >= '0' && c->s[c->at] <= '9') {
        if (c->at - from == DIGITS_MOST)
            return false;
        v = 10 * v + (c->s[c->at++] - '0');
    }
    *ret = v;
    return c->at > from && (c->s[from] != '0' || c->at == from + 1);
}

bool sm_head_read(const char *line, size_t n, struct sm_head *ret_head)
{
    struct cursor c = { line, n, 0 };
    struct sm_head h = { 0 };
    size_t from;

    if (!pass(&c, "{\"n\":", 5) || !take_number(&c, &h.n) || !pass(&c, ",\"t\":", 5))
        return false;
    from = c.at;
    h.when = line + from;
    if (!take_number(&c, &h.t_ns) || !pass(&c, ",\"utc\":\"", 8) || c.n - c.at < SM_UTC_SIZE - 1)
        return false;
    c.at += SM_UTC_SIZE - 1;
    h.when_n = c.at - from;
    if (!pass(&c, "\",\"k\":\"", 7))
        return false;
    from = c.at;
    h.k = line + from;
    while (c.at < n && ((line[c.at] >= 'a' && line[c.at] <= 'z') || line[c.at] == '-'))
        c.at++;
    h.k_n = c.at - from;
    if (h.k_n == 0 || !pass(&c, "\"", 1))
        return false;
    h.rest = c.at;
    *ret_head = h;
    return true;
}

bool sm_head_is(const struct sm_head *h, const char *k)
{
    return strlen(k) == h->k_n && memcmp(h->k, k, h->k_n) == 0;
}

bool sm_head_then(const struct sm_head *h, const char *line, size_t n, const char *text)
{
    const size_t len = strlen(text);

    return n - h->rest >= len && memcmp(line + h->rest, text, len) == 0;
}
