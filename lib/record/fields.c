/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fields.c: keys of a JSON object, each with its bounds. */
#include "record/fields.h"

#include <math.h>
#include <stdarg.h>
#include <string.h>

void sm_taking_begin(struct sm_taking *k, char why[SM_REASON_SIZE])
{
    *k = (struct sm_taking){ .why = why };
}

void sm_taking_refuse(struct sm_taking *k, const char *fmt, ...)
{
    struct sm_text t;
    va_list args;

    if (k->bad)
        return;
    k->bad = true;
    sm_text_init(&t, k->why, SM_REASON_SIZE);
    va_start(args, fmt);
    sm_text_addv(&t, fmt, args);
    va_end(args);
}

bool sm_fields_begin(struct sm_fields *f, struct sm_taking *k, const json_t *o, const char *where)
{
    *f = (struct sm_fields){ .taking = k, .where = where, .o = o };
    if (!k->bad && !json_is_object(o))
        sm_taking_refuse(k, "%s: expected an object", where);
    return !k->bad;
}

void sm_fields_end(struct sm_fields *f)
{
    if (!f->taking->bad)
        f->taking->passed_over += (unsigned)(json_object_size(f->o) - f->known);
}

const json_t *sm_fields_get(struct sm_fields *f, const char *key)
{
    const json_t *v;

    if (f->taking->bad)
        return NULL;
    v = json_object_get(f->o, key);
    if (v != NULL)
        f->known++;
    return v;
}

const json_t *sm_fields_need(struct sm_fields *f, const char *key)
{
    const json_t *v = sm_fields_get(f, key);

    if (v == NULL)
        sm_taking_refuse(f->taking, "%s: %s is missing", f->where, key);
    return v;
}

const json_t *sm_fields_list(struct sm_fields *f, const char *key, size_t most)
{
    const json_t *v = sm_fields_get(f, key);

    if (v == NULL)
        return NULL;
    if (!json_is_array(v) || json_array_size(v) > most) {
        sm_taking_refuse(f->taking, "%s: %s: expected a list of at most %zu", f->where, key, most);
        return NULL;
    }
    return v;
}

bool sm_json_is_int(const json_t *v, int64_t *ret)
{
    const double exact = 9007199254740992.0; /* 2^53: above it a real may stand for its neighbour */

    if (json_is_integer(v)) {
        *ret = json_integer_value(v);
        return true;
    }
    if (!json_is_real(v) || !(fabs(json_real_value(v)) <= exact) ||
        json_real_value(v) != floor(json_real_value(v)))
        return false;
    *ret = (int64_t)json_real_value(v);
    return true;
}

bool sm_fields_int(struct sm_fields *f, const char *key, int64_t from, int64_t to, int64_t *ret)
{
    const json_t *v = sm_fields_get(f, key);
    int64_t i = 0;

    if (v == NULL)
        return false;
    if (!sm_json_is_int(v, &i) || i < from || i > to) {
        sm_taking_refuse(f->taking, "%s: %s: expected a whole number %lld to %lld", f->where, key,
                         (long long)from, (long long)to);
        return false;
    }
    *ret = i;
    return true;
}

bool sm_fields_size(struct sm_fields *f, const char *key, size_t most, size_t *ret)
{
    int64_t v;

    if (!sm_fields_int(f, key, 0, (int64_t)most, &v))
        return false;
    *ret = (size_t)v;
    return true;
}

bool sm_fields_unsigned(struct sm_fields *f, const char *key, unsigned *ret)
{
    int64_t v;

    if (!sm_fields_int(f, key, 0, UINT32_MAX, &v))
        return false;
    *ret = (unsigned)v;
    return true;
}

bool sm_fields_real(struct sm_fields *f, const char *key, double *ret)
{
    const json_t *v = sm_fields_get(f, key);

    if (v == NULL)
        return false;
    if (!json_is_number(v) || !isfinite(json_number_value(v))) {
        sm_taking_refuse(f->taking, "%s: %s: expected a number", f->where, key);
        return false;
    }
    *ret = json_number_value(v);
    return true;
}

bool sm_fields_bool(struct sm_fields *f, const char *key, bool *ret)
{
    const json_t *v = sm_fields_get(f, key);

    if (v == NULL)
        return false;
    if (!json_is_boolean(v)) {
        sm_taking_refuse(f->taking, "%s: %s: expected true or false", f->where, key);
        return false;
    }
    *ret = json_is_true(v);
    return true;
}

bool sm_fields_text(struct sm_fields *f, const char *key, char *out, size_t cap)
{
    const json_t *v = sm_fields_get(f, key);
    size_t n;

    if (v == NULL)
        return false;
    n = json_string_length(v);
    if (!json_is_string(v) || n >= cap || memchr(json_string_value(v), '\0', n) != NULL) {
        sm_taking_refuse(f->taking, "%s: %s: expected text of at most %zu bytes", f->where, key,
                         cap - 1);
        return false;
    }
    memcpy(out, json_string_value(v), n + 1);
    return true;
}

/* C0, DEL, C1, and Unicode's Bidi_Control. */
static bool is_hidden(uint32_t code)
{
    return code < 0x20 || (code >= 0x7f && code < 0xa0) || code == 0x061c || code == 0x200e ||
           code == 0x200f || (code >= 0x202a && code <= 0x202e) ||
           (code >= 0x2066 && code <= 0x2069);
}

bool sm_fields_plain(struct sm_fields *f, const char *key, char *out, size_t cap)
{
    size_t at = 0, n;

    if (!sm_fields_text(f, key, out, cap))
        return false;
    n = strlen(out);
    while (at < n) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(out + at, n - at, &code);

        if (len == 0 || is_hidden(code)) {
            sm_taking_refuse(f->taking, "%s: %s: a control character in a name", f->where, key);
            return false;
        }
        at += len;
    }
    return true;
}
