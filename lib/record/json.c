/* SPDX-License-Identifier: GPL-3.0-or-later */
/* json.c: one thing, one spelling: keys as given, reals with the fewest digits that come back. */
#include "record/json.h"

#include <math.h>
#include <string.h>

#include "base/number.h"
#include "base/time.h"
#include "record/entry.h"

static void add_unsigned(struct sm_text *t, uint64_t v)
{
    char digits[20];
    size_t at = sizeof digits;

    do {
        digits[--at] = (char)('0' + v % 10);
        v /= 10;
    } while (v > 0);
    sm_text_addn(t, digits + at, sizeof digits - at);
}

static void add_int(struct sm_text *t, int64_t v)
{
    if (v < 0)
        sm_text_addn(t, "-", 1);
    add_unsigned(t, v < 0 ? 0 - (uint64_t)v : (uint64_t)v);
}

/* A comma where something stands before, then the key. */
static void begin(struct sm_text *t, const char *key)
{
    const char last = t->len > 0 ? t->buf[t->len - 1] : '{';

    if (last != '{' && last != '[' && last != '\n')
        sm_text_addn(t, ",", 1);
    if (key == NULL)
        return;
    sm_text_addn(t, "\"", 1);
    sm_text_add(t, key);
    sm_text_addn(t, "\":", 2);
}

void sm_json_head(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, const char *k)
{
    char utc[SM_UTC_SIZE];

    sm_text_addn(t, "{", 1);
    if (n != 0)
        sm_json_int(t, "n", n);
    sm_json_int(t, "t", t_ns);
    sm_text_add(t, ",\"utc\":\"");
    sm_text_addn(t, utc, sm_utc_write(utc, utc_us));
    sm_text_add(t, "\",\"k\":\"");
    sm_text_add(t, k);
    sm_text_addn(t, "\"", 1);
}

void sm_json_end(struct sm_text *t)
{
    sm_text_addn(t, "}\n", 2);
}

void sm_json_object(struct sm_text *t, const char *key)
{
    begin(t, key);
    sm_text_addn(t, "{", 1);
}

void sm_json_list(struct sm_text *t, const char *key)
{
    begin(t, key);
    sm_text_addn(t, "[", 1);
}

void sm_json_close_object(struct sm_text *t)
{
    sm_text_addn(t, "}", 1);
}

void sm_json_close_list(struct sm_text *t)
{
    sm_text_addn(t, "]", 1);
}

void sm_json_int(struct sm_text *t, const char *key, int64_t v)
{
    begin(t, key);
    add_int(t, v);
}

void sm_json_size(struct sm_text *t, const char *key, size_t v)
{
    begin(t, key);
    add_unsigned(t, v);
}

void sm_json_some(struct sm_text *t, const char *key, int64_t v)
{
    if (v != 0)
        sm_json_int(t, key, v);
}

void sm_json_bool(struct sm_text *t, const char *key, bool v)
{
    begin(t, key);
    sm_text_add(t, v ? "true" : "false");
}

void sm_json_real(struct sm_text *t, const char *key, double v)
{
    char digits[SM_NUMBER_SIZE];

    if (!isfinite(v)) {
        if (key == NULL) {
            begin(t, NULL);
            sm_text_add(t, "null");
        }
        return;
    }
    begin(t, key);
    if (v == 0) /* "-0" would be read back as a whole number, which has no sign */
        sm_text_add(t, signbit(v) ? "-0.0" : "0");
    else
        sm_text_addn(t, digits, sm_number_write(digits, v));
}

/* \u0000 … of a code below U+10000. */
static void add_escape(struct sm_text *t, uint32_t code)
{
    static const char hex[] = "0123456789abcdef";
    const char out[6] = {
        '\\', 'u', hex[code >> 12 & 15], hex[code >> 8 & 15], hex[code >> 4 & 15], hex[code & 15]
    };

    sm_text_addn(t, out, sizeof out);
}

static bool is_plain(unsigned char c)
{
    return c >= 0x20 && c < 0x7f && c != '"' && c != '\\';
}

/* Controls, and what would turn a line of text round on a screen (Unicode's Bidi_Control). */
static bool is_escaped(uint32_t code)
{
    return code < 0x20 || (code >= 0x7f && code < 0xa0) || code == 0x061c || code == 0x200e ||
           code == 0x200f || (code >= 0x202a && code <= 0x202e) ||
           (code >= 0x2066 && code <= 0x2069);
}

/* Bytes at the head of s[n] that stand for themselves in every string. */
static size_t plain_span(const unsigned char *s, size_t n)
{
    size_t at = 0;

    while (at < n && is_plain(s[at]))
        at++;
    return at;
}

void sm_json_textn(struct sm_text *t, const char *key, const char *s, size_t n)
{
    size_t at = 0;

    begin(t, key);
    sm_text_addn(t, "\"", 1);
    while (at < n && !t->cut) {
        const size_t plain = plain_span((const unsigned char *)s + at, n - at);
        uint32_t code = 0;
        size_t len;

        sm_text_addn(t, s + at, plain);
        at += plain;
        if (at == n)
            break;
        len = sm_utf8_next(s + at, n - at, &code);
        if (len == 0)
            sm_text_addn(t, "?", 1);
        else if (s[at] == '"' || s[at] == '\\')
            sm_text_addn(t, s[at] == '"' ? "\\\"" : "\\\\", 2);
        else if (is_escaped(code))
            add_escape(t, code);
        else
            sm_text_addn(t, s + at, len);
        at += len > 0 ? len : 1;
    }
    sm_text_addn(t, "\"", 1);
}

void sm_json_text(struct sm_text *t, const char *key, const char *s)
{
    sm_json_textn(t, key, s, strlen(s));
}

void sm_json_words(struct sm_text *t, const char *key, const char *s)
{
    if (s[0] != '\0')
        sm_json_text(t, key, s);
}

void sm_bytes_write(struct sm_text *t, const unsigned char *bytes, size_t n)
{
    size_t at = 0;

    sm_text_addn(t, "\"", 1);
    while (at < n && !t->cut) {
        const size_t plain = plain_span(bytes + at, n - at);

        sm_text_addn(t, (const char *)bytes + at, plain);
        at += plain;
        if (at == n)
            break;
        if (bytes[at] == '"' || bytes[at] == '\\')
            sm_text_addn(t, bytes[at] == '"' ? "\\\"" : "\\\\", 2);
        else
            add_escape(t, bytes[at]);
        at++;
    }
    sm_text_addn(t, "\"", 1);
}

void sm_json_bytes(struct sm_text *t, const char *key, const void *bytes, size_t n)
{
    begin(t, key);
    sm_bytes_write(t, bytes, n);
}
