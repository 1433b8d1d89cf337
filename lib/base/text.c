/* SPDX-License-Identifier: GPL-3.0-or-later */
/* text.c: bounded text that ends at a whole character, UTF-8, names, and escaping for a terminal.
 */
#include "base/text.h"

#include <assert.h>
#include <stdio.h>
#include <string.h>

/* ---- UTF-8 ---- */

/* Bytes that a sequence with this first byte has; 0 for a byte that starts none. */
static size_t lead_length(unsigned char c)
{
    if (c < 0x80)
        return 1;
    if (c >= 0xC2 && c <= 0xDF)
        return 2;
    if (c >= 0xE0 && c <= 0xEF)
        return 3;
    if (c >= 0xF0 && c <= 0xF4)
        return 4;
    return 0;
}

static bool is_continuation(unsigned char c)
{
    return (c & 0xC0) == 0x80;
}

size_t sm_utf8_next(const char *s, size_t n, uint32_t *ret_code)
{
    static const uint32_t lowest[5] = { 0, 0, 0x80, 0x800, 0x10000 };
    const unsigned char *u = (const unsigned char *)s;
    size_t len;
    uint32_t code;

    if (n == 0)
        return 0;
    len = lead_length(u[0]);
    if (len == 0 || len > n)
        return 0;
    code = len == 1 ? u[0] : u[0] & (0x7FU >> len);
    for (size_t i = 1; i < len; i++) {
        if (!is_continuation(u[i]))
            return 0;
        code = code << 6 | (u[i] & 0x3FU);
    }
    if (code < lowest[len] || code > 0x10FFFF || (code >= 0xD800 && code <= 0xDFFF))
        return 0;
    if (ret_code != NULL)
        *ret_code = code;
    return len;
}

size_t sm_utf8_span(const char *s, size_t n)
{
    size_t at = 0, len;

    while ((len = sm_utf8_next(s + at, n - at, NULL)) > 0)
        at += len;
    return at;
}

/* C0, DEL and C1. */
static bool is_control(uint32_t code)
{
    return code < 0x20 || (code >= 0x7F && code <= 0x9F);
}

/* The characters that Unicode gives the property Bidi_Control: they turn the direction of text. */
static bool is_direction(uint32_t code)
{
    return code == 0x061C || code == 0x200E || code == 0x200F ||
           (code >= 0x202A && code <= 0x202E) || (code >= 0x2066 && code <= 0x2069);
}

/* Unicode's White_Space beyond the control characters. */
static bool is_space(uint32_t code)
{
    return code == ' ' || code == 0xA0 || code == 0x1680 || (code >= 0x2000 && code <= 0x200A) ||
           code == 0x2028 || code == 0x2029 || code == 0x202F || code == 0x205F || code == 0x3000;
}

/* ---- bounded text ---- */

/* n, less a character at the end of s[n] that is not whole. Bytes that are no UTF-8 stay. */
static size_t whole_characters(const char *s, size_t n)
{
    for (size_t back = 1; back <= 3 && back <= n; back++) {
        const unsigned char c = (unsigned char)s[n - back];
        if (!is_continuation(c))
            return lead_length(c) > back ? n - back : n;
    }
    return n;
}

static size_t room(const struct sm_text *t)
{
    return t->cap - 1 - t->len;
}

static void end_at(struct sm_text *t, size_t len)
{
    t->len = len;
    t->buf[len] = '\0';
}

void sm_text_init(struct sm_text *t, char *buf, size_t cap)
{
    assert(cap >= 1);
    *t = (struct sm_text){ .buf = buf, .cap = cap };
    buf[0] = '\0';
}

void sm_text_addn(struct sm_text *t, const char *s, size_t n)
{
    if (t->cut || n == 0)
        return;
    if (n > room(t)) {
        t->cut = true;
        n = whole_characters(s, room(t));
    }
    memcpy(t->buf + t->len, s, n);
    end_at(t, t->len + n);
}

void sm_text_add(struct sm_text *t, const char *s)
{
    sm_text_addn(t, s, strlen(s));
}

void sm_text_addv(struct sm_text *t, const char *fmt, va_list args)
{
    char *end = t->buf + t->len;
    int want;

    if (t->cut)
        return;
    want = vsnprintf(end, room(t) + 1, fmt, args);
    if (want < 0) { /* a wide character that has no bytes: nothing was added that can be trusted */
        t->cut = true;
        end_at(t, t->len);
    } else if ((size_t)want > room(t)) {
        t->cut = true;
        end_at(t, t->len + whole_characters(end, room(t)));
    } else {
        t->len += (size_t)want;
    }
}

void sm_text_addf(struct sm_text *t, const char *fmt, ...)
{
    va_list args;

    va_start(args, fmt);
    sm_text_addv(t, fmt, args);
    va_end(args);
}

/* One byte as \xNN, whole or not at all. */
static void add_hex(struct sm_text *t, unsigned char c)
{
    static const char digits[] = "0123456789abcdef";
    const char hex[4] = { '\\', 'x', digits[c >> 4], digits[c & 15] };

    if (room(t) < sizeof hex)
        t->cut = true;
    sm_text_addn(t, hex, sizeof hex);
}

void sm_text_add_safe(struct sm_text *t, const char *bytes, size_t n)
{
    size_t at = 0;

    while (at < n && !t->cut) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(bytes + at, n - at, &code);

        if (len > 0 && !is_control(code) && !is_direction(code)) {
            sm_text_addn(t, bytes + at, len);
            at += len;
        } else {
            add_hex(t, (unsigned char)bytes[at++]);
        }
    }
}

void sm_text_copy(char *out, size_t cap, const char *s)
{
    struct sm_text t;

    sm_text_init(&t, out, cap);
    sm_text_add(&t, s);
}

/* ---- names ---- */

bool sm_name_ok(const char *s, size_t n)
{
    size_t at = 0, chars = 0;
    bool space = false;

    while (at < n) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(s + at, n - at, &code);

        if (len == 0 || is_control(code) || is_direction(code))
            return false;
        space = is_space(code);
        if (space && at == 0)
            return false;
        if (++chars > SM_NAME_CHARS)
            return false;
        at += len;
    }
    return chars > 0 && !space;
}

bool sm_meter_name_ok(const char *s, size_t n)
{
    if (n < 1 || n >= SM_METER_SIZE)
        return false;
    for (size_t i = 0; i < n; i++) {
        const char c = s[i];
        if (!((c >= 'a' && c <= 'z') || (c >= '0' && c <= '9') || c == '-'))
            return false;
    }
    return true;
}

/* ---- distance ---- */

#define DISTANCE_MOST 64

static size_t least(size_t a, size_t b)
{
    return a < b ? a : b;
}

/* Edit distance by rows of the usual table, three of them kept for the swap. */
size_t sm_text_distance(const char *a, const char *b)
{
    size_t rows[3][DISTANCE_MOST + 1];
    const size_t na = strlen(a), nb = strlen(b);

    if (na > DISTANCE_MOST || nb > DISTANCE_MOST)
        return DISTANCE_MOST;
    for (size_t j = 0; j <= nb; j++)
        rows[0][j] = j;
    for (size_t i = 1; i <= na; i++) {
        size_t *row = rows[i % 3];
        const size_t *above = rows[(i + 2) % 3], *above2 = rows[(i + 1) % 3];

        row[0] = i;
        for (size_t j = 1; j <= nb; j++) {
            const bool same = a[i - 1] == b[j - 1];
            row[j] = least(above[j - 1] + (same ? 0 : 1), least(above[j], row[j - 1]) + 1);
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                row[j] = least(row[j], above2[j - 2] + 1);
        }
    }
    return rows[na % 3][nb];
}
