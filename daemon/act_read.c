/* SPDX-License-Identifier: GPL-3.0-or-later */
/* act_read.c: key by key; an unknown key is refused, so that nothing asked for is silently left
 * out. */
#include "act_read.h"

#include <stdio.h>
#include <string.h>

#define NUMBER_MOST INT64_C(1000000000000000)

struct reader {
    struct sm_act *act;
    char *why;
};

__attribute__((format(printf, 2, 3))) static bool refuse(struct reader *r, const char *fmt, ...)
{
    char text[SM_ACT_WHY_SIZE];
    struct sm_text t;
    va_list args;

    va_start(args, fmt);
    vsnprintf(text, sizeof text, fmt, args);
    va_end(args);
    sm_text_init(&t, r->why, SM_ACT_WHY_SIZE);
    sm_text_add_safe(&t, text, strlen(text));
    return false;
}

/* Text without control characters, in out[cap]. */
static bool text(struct reader *r, const char *key, const json_t *v, char *out, size_t cap)
{
    const char *s = json_string_value(v);
    const size_t n = json_string_length(v);

    if (s == NULL)
        return refuse(r, "%s: expected a text", key);
    if (n >= cap)
        return refuse(r, "%s: %zu bytes, at most %zu are possible", key, n, cap - 1);
    for (size_t i = 0; i < n; i++)
        if ((unsigned char)s[i] < 0x20 || s[i] == 0x7f)
            return refuse(r, "%s: control characters are not possible", key);
    memcpy(out, s, n + 1);
    return true;
}

static bool name(struct reader *r, const char *key, const json_t *v, char out[SM_NAME_SIZE])
{
    if (!text(r, key, v, out, SM_NAME_SIZE))
        return false;
    if (out[0] != '\0' && !sm_name_ok(out, strlen(out)))
        return refuse(r, "%s: expected a name of at most %d characters", key, SM_NAME_CHARS);
    return true;
}

static bool number(struct reader *r, const char *key, const json_t *v, bool *ret_has,
                   int64_t *ret_value)
{
    if (!json_is_integer(v) || json_integer_value(v) < 0 || json_integer_value(v) > NUMBER_MOST)
        return refuse(r, "%s: expected the number of an entry", key);
    *ret_has = true;
    *ret_value = json_integer_value(v);
    return true;
}

static bool id(struct reader *r, const char *key, const json_t *v)
{
    if (!text(r, key, v, r->act->id, sizeof r->act->id))
        return false;
    for (const char *c = r->act->id; *c != '\0'; c++)
        if (*c < 0x21 || *c > 0x7e)
            return refuse(r, "id: expected 1 to %d printable ASCII characters", SM_ID_SIZE - 1);
    return true;
}

/* The last part of a path, as a name. */
static bool file(struct reader *r, const char *key, const json_t *v)
{
    char path[1024];
    const char *last;

    if (!text(r, key, v, path, sizeof path))
        return false;
    last = strrchr(path, '/');
    last = last != NULL ? last + 1 : path;
    if (!sm_name_ok(last, strlen(last)))
        return refuse(r, "file: expected a file's name of at most %d characters", SM_NAME_CHARS);
    sm_text_copy(r->act->sheet_file, sizeof r->act->sheet_file, last);
    return true;
}

static bool sheet_text(struct reader *r, const json_t *v)
{
    if (!json_is_string(v))
        return refuse(r, "text: expected the sheet's text");
    if (json_string_length(v) > SM_SHEET_TEXT_MAX)
        return refuse(r, "text: the sheet has %zu bytes, at most %u are possible",
                      json_string_length(v), SM_SHEET_TEXT_MAX);
    r->act->sheet_text = json_string_value(v);
    r->act->sheet_text_n = json_string_length(v);
    return true;
}

static bool temperature(struct reader *r, const json_t *v)
{
    if (!json_is_number(v))
        return refuse(r, "temperature: expected a number, in °C");
    r->act->has_temperature = true;
    r->act->temperature_c = json_number_value(v);
    return true;
}

static bool take(struct reader *r, const char *key, const json_t *v)
{
    struct sm_act *a = r->act;
    const bool sheet = a->act == SM_ACT_SHEET;

    if (strcmp(key, "k") == 0 || strcmp(key, "act") == 0 || strcmp(key, "meter") == 0)
        return true; /* read before */
    if (strcmp(key, "id") == 0)
        return id(r, key, v);
    if (strcmp(key, "seen") == 0)
        return number(r, key, v, &a->has_seen, &a->seen);
    if (strcmp(key, "of") == 0)
        return number(r, key, v, &a->has_subject, &a->subject);
    if (strcmp(key, "who") == 0)
        return name(r, key, v, a->who);
    if (strcmp(key, "why") == 0)
        return text(r, key, v, a->why, sizeof a->why);
    if (strcmp(key, "temperature") == 0)
        return temperature(r, v);
    if (strcmp(key, "text") == 0)
        return sheet ? sheet_text(r, v) : text(r, key, v, a->text, sizeof a->text);
    if (sheet && strcmp(key, "file") == 0)
        return file(r, key, v);
    return refuse(r, "%.64s: an act has no such key", key);
}

static bool complete(struct reader *r)
{
    const struct sm_act *a = r->act;

    if (a->id[0] == '\0')
        return refuse(r, "id: missing: an act has an id made by its sender");
    if (a->act == SM_ACT_SHEET && (a->sheet_text == NULL || a->sheet_file[0] == '\0'))
        return refuse(r, "a sheet needs its file's name (file) and its text (text)");
    return true;
}

enum sm_status sm_act_read(const json_t *o, struct sm_act *ret_act, char ret_why[SM_ACT_WHY_SIZE])
{
    struct sm_act act;
    struct reader r = { &act, ret_why };
    const char *what = json_string_value(json_object_get(o, "act"));
    const char *key;
    json_t *v;

    memset(&act, 0, sizeof act);
    if (what == NULL || !sm_act_known(what, &act.act)) {
        refuse(&r, "act: expected the name of an act, got \"%.40s\"", what != NULL ? what : "");
        return SM_ESYNTAX;
    }
    /* jansson's iteration is not const, but changes nothing */
    json_object_foreach((json_t *)(uintptr_t)o, key, v)
    {
        if (!take(&r, key, v))
            return SM_ESYNTAX;
    }
    if (!complete(&r))
        return SM_ESYNTAX;
    *ret_act = act;
    return SM_OK;
}
