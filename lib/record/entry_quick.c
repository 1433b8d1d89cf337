/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_quick.c: the inputs that a log is full of, read without making JSON objects of them. */
#include <string.h>

#include "base/time.h"
#include "record/entry.h"
#include "record/head.h"

/* What is still to be read of a line. */
struct rest {
    const char *s, *end;
};

static bool pass(struct rest *r, const char *text)
{
    const size_t n = strlen(text);

    if ((size_t)(r->end - r->s) < n || memcmp(r->s, text, n) != 0)
        return false;
    r->s += n;
    return true;
}

static int hex(char c)
{
    if (c >= '0' && c <= '9')
        return c - '0';
    return c >= 'a' && c <= 'f' ? c - 'a' + 10 : -1;
}

/* Behind a backslash. */
static bool take_escape(struct rest *r, unsigned char *ret_byte)
{
    int high, low;

    if (r->s < r->end && (*r->s == '"' || *r->s == '\\')) {
        *ret_byte = (unsigned char)*r->s++;
        return true;
    }
    if (!pass(r, "u00") || r->end - r->s < 2)
        return false;
    high = hex(r->s[0]);
    low = hex(r->s[1]);
    if (high < 0 || low < 0)
        return false;
    *ret_byte = (unsigned char)(high << 4 | low);
    r->s += 2;
    return true;
}

/* Up to the closing quote, as sm_bytes_write writes. */
static bool take_raw(struct rest *r, unsigned char *bytes, size_t *ret_n)
{
    size_t n = 0;

    while (r->s < r->end && *r->s != '"') {
        const char c = *r->s++;
        if (n == SM_BYTES_MAX || c < 0x20 || c >= 0x7f)
            return false;
        if (c != '\\')
            bytes[n++] = (unsigned char)c;
        else if (!take_escape(r, &bytes[n++]))
            return false;
    }
    *ret_n = n;
    return pass(r, "\"");
}

static bool take_bytes(struct rest *r, struct sm_entry_store *store, struct sm_chunk *c)
{
    if (!pass(r, ",\"b\":\"") || !take_raw(r, store->bytes, &c->n))
        return false;
    c->bytes = store->bytes;
    c->bad = NULL;
    c->n_bad = 0;
    return true;
}

bool sm_entry_read_quick(const char *line, size_t n, struct sm_entry_store *store,
                         struct sm_entry *ret_entry)
{
    struct sm_entry *e = ret_entry;
    struct sm_head h;
    struct rest r;

    if (n >= SM_ENTRY_MAX || !sm_head_read(line, n, &h) || h.n < 1)
        return false;
    r = (struct rest){ line + h.rest, line + n };
    if (sm_head_is(&h, "bytes")) {
        if (!take_bytes(&r, store, &e->input.chunk))
            return false;
        e->input.chunk.t_ns = h.t_ns;
        e->input.kind = SM_INPUT_BYTES;
    } else if (sm_head_is(&h, "tick")) {
        e->input.kind = SM_INPUT_TICK;
    } else {
        return false;
    }
    if (!pass(&r, "}") || r.s != r.end ||
        sm_utc_parse(h.when + h.when_n - (SM_UTC_SIZE - 1), SM_UTC_SIZE - 1, &e->utc_us) != SM_OK)
        return false;
    memcpy(e->k, h.k, h.k_n);
    e->k[h.k_n] = '\0';
    e->kind = SM_ENTRY_INPUT;
    e->n = e->input.n = h.n;
    e->t_ns = e->input.t_ns = h.t_ns;
    e->input.utc_us = e->utc_us;
    e->passed_over = 0;
    e->json = NULL;
    return true;
}
