/* SPDX-License-Identifier: GPL-3.0-or-later */
/* load.c: jansson, behind ceilings that are counted before anything is allocated. */
#include "record/load.h"

#include <string.h>

#include "record/entry.h"

/* A sentence about the line; parts of the line in it are made harmless. */
static enum sm_status refuse(char ret_why[SM_REASON_SIZE], const char *what)
{
    struct sm_text t;

    sm_text_init(&t, ret_why, SM_REASON_SIZE);
    sm_text_add(&t, "not an entry: ");
    sm_text_add_safe(&t, what, strlen(what));
    return SM_ESYNTAX;
}

/* Brackets and commas outside of strings. */
struct shape {
    size_t depth, deepest, parts;
    size_t whole; /* bytes when the depth first came back to 0; 0: it has not */
};

static struct shape look(const char *s, size_t n, bool only_whole)
{
    struct shape h = { 0 };
    bool text = false;

    for (size_t i = 0; i < n && !(only_whole && h.whole > 0); i++) {
        const char c = s[i];

        if (c == '"') {
            text = !text;
        } else if (text) {
            if (c == '\\')
                i++;
        } else if (c == '{' || c == '[') {
            h.parts++;
            if (++h.depth > h.deepest)
                h.deepest = h.depth;
        } else if (c == '}' || c == ']') {
            if (h.depth > 0 && --h.depth == 0 && h.whole == 0)
                h.whole = i + 1;
        } else if (c == ',') {
            h.parts++;
        }
    }
    return h;
}

size_t sm_json_span(const char *s, size_t n)
{
    return look(s, n, true).whole;
}

static bool is_modest(const char *s, size_t n)
{
    const struct shape h = look(s, n, false);

    return h.deepest <= SM_JSON_DEPTH && h.parts <= SM_JSON_PARTS;
}

enum sm_status sm_json_load(const char *line, size_t n, json_t **ret_object,
                            char ret_why[SM_REASON_SIZE])
{
    json_error_t error;
    json_t *o;

    if (n >= SM_ENTRY_MAX)
        return refuse(ret_why, "longer than 1 MiB");
    if (n == 0 || line[0] != '{' || line[n - 1] != '}') /* no blanks around it either */
        return refuse(ret_why, "it does not begin with { and end with }");
    if (!is_modest(line, n))
        return refuse(ret_why, "nested too deep, or too many parts");
    o = json_loadb(line, n, JSON_REJECT_DUPLICATES | JSON_ALLOW_NUL, &error);
    if (o == NULL)
        return refuse(ret_why, error.text);
    *ret_object = o;
    return SM_OK;
}
