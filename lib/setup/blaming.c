/* SPDX-License-Identifier: GPL-3.0-or-later */
/* blaming.c: the keys of a map, and what is said of those that are wrong. */
#include "setup/value.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include "base/number.h"
#include "base/time.h"

#define SHOWN_BYTES 48 /* of a wrong value, in its blame */

size_t sm_blames_total(const struct sm_blames *b)
{
    return b->n + b->left_out;
}

/* "items[3].standard" */
static void add_path(struct sm_text *t, const struct sm_node *node)
{
    const struct sm_node *way[SM_TREE_DEPTH_MAX + 2];
    size_t n = 0;

    for (; node != NULL && node->parent != NULL && n < sizeof way / sizeof way[0];
         node = node->parent)
        way[n++] = node;
    while (n-- > 0) {
        if (way[n]->key != NULL)
            sm_text_addf(t, "%s%s", t->len > 0 ? "." : "", way[n]->key);
        else
            sm_text_addf(t, "[%zu]", way[n]->at);
    }
}

static void add_got(struct sm_text *t, const struct sm_node *node)
{
    if (node->kind == SM_NODE_LIST) {
        sm_text_add(t, ", got a list");
    } else if (node->kind == SM_NODE_MAP) {
        sm_text_add(t, ", got a map of keys");
    } else if (node->n == 0) {
        sm_text_add(t, ", got nothing");
    } else {
        char shown[SHOWN_BYTES];
        struct sm_text s;

        sm_text_init(&s, shown, sizeof shown);
        sm_text_add_safe(&s, node->text, node->n);
        sm_text_addf(t, ", got \"%s%s\"", shown, s.cut ? "…" : "");
    }
}

__attribute__((format(printf, 4, 0))) static void blame(const struct sm_reader *r,
                                                        const struct sm_node *node, bool got,
                                                        const char *fmt, va_list args)
{
    char text[SM_BLAME_SIZE];
    struct sm_text t;

    sm_text_init(&t, text, sizeof text);
    add_path(&t, node);
    if (t.len > 0)
        sm_text_add(&t, ": ");
    sm_text_addv(&t, fmt, args);
    if (got)
        add_got(&t, node);
    sm_blames_add(r->blames, r->file, node->line, node->column, "%s", text);
}

void sm_blame(const struct sm_reader *r, const struct sm_node *node, const char *fmt, ...)
{
    va_list args;

    va_start(args, fmt);
    blame(r, node, false, fmt, args);
    va_end(args);
}

void sm_blame_got(const struct sm_reader *r, const struct sm_node *node, const char *fmt, ...)
{
    va_list args;

    va_start(args, fmt);
    blame(r, node, true, fmt, args);
    va_end(args);
}

const char *sm_nearest(const char *written, const char *const *names, size_t n)
{
    const size_t near = strlen(written) <= 3 ? 1 : strlen(written) / 3 > 3 ? 3 : 2;
    const char *best = NULL;
    size_t best_distance = near + 1;

    for (size_t i = 0; i < n; i++) {
        const size_t d = sm_text_distance(written, names[i]);
        if (d < best_distance) {
            best_distance = d;
            best = names[i];
        }
    }
    return best;
}

/* ---- maps and lists ---- */

static void blame_unknown_key(const struct sm_reader *r, const struct sm_node *value,
                              const char *const *keys, size_t n)
{
    const char *near = sm_nearest(value->key, keys, n);
    struct sm_node at_key = *value; /* the place of the key, not of its value */
    char list[SM_BLAME_SIZE / 2];
    struct sm_text t;

    at_key.line = value->key_line;
    at_key.column = value->key_column;
    if (near != NULL) {
        sm_blame(r, &at_key, "no such key; did you mean \"%s\"?", near);
        return;
    }
    sm_text_init(&t, list, sizeof list);
    for (size_t i = 0; i < n; i++)
        sm_text_addf(&t, "%s%s", i > 0 ? ", " : "", keys[i]);
    sm_blame(r, &at_key, "no such key; there are: %s%s", list, t.cut ? "…" : "");
}

bool sm_keys_known(const struct sm_reader *r, const struct sm_node *node, const char *const *keys)
{
    size_t n = 0;

    if (node == NULL)
        return false;
    if (node->kind != SM_NODE_MAP) {
        sm_blame_got(r, node, "expected keys (\"key: value\")");
        return false;
    }
    while (keys[n] != NULL)
        n++;
    for (const struct sm_node *c = node->child; c != NULL; c = c->next) {
        size_t i = 0;
        while (i < n && strcmp(c->key, keys[i]) != 0)
            i++;
        if (i == n)
            blame_unknown_key(r, c, keys, n);
    }
    return true;
}

const struct sm_node *sm_key(const struct sm_node *map, const char *key)
{
    if (map == NULL || map->kind != SM_NODE_MAP)
        return NULL;
    for (const struct sm_node *c = map->child; c != NULL; c = c->next)
        if (strcmp(c->key, key) == 0)
            return c;
    return NULL;
}

const struct sm_node *sm_need(const struct sm_reader *r, const struct sm_node *map, const char *key,
                              const char *expected)
{
    const struct sm_node *node = sm_key(map, key);

    if (node == NULL && map != NULL && map->kind == SM_NODE_MAP) {
        char path[SM_BLAME_SIZE];
        struct sm_text t;

        sm_text_init(&t, path, sizeof path);
        add_path(&t, map);
        sm_blames_add(r->blames, r->file, map->line, map->column, "%s%s%s: missing: expected %s",
                      path, t.len > 0 ? "." : "", key, expected);
    }
    return node;
}

bool sm_is_list(const struct sm_reader *r, const struct sm_node *node, size_t least, size_t most,
                const char *of_what)
{
    if (node == NULL)
        return false;
    if (node->kind != SM_NODE_LIST) {
        sm_blame_got(r, node, "expected a list of %s", of_what);
        return false;
    }
    if (node->n_children < least || node->n_children > most) {
        sm_blame(r, node, "expected %zu to %zu %s, got %zu", least, most, of_what,
                 node->n_children);
        return false;
    }
    return true;
}

bool sm_is_word(const struct sm_node *node, const char *word)
{
    return node != NULL && node->kind == SM_NODE_TEXT && node->n == strlen(word) &&
           memcmp(node->text, word, node->n) == 0;
}

/* ---- names and text ---- */
