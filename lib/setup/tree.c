/* SPDX-License-Identifier: GPL-3.0-or-later */
/* tree.c: libyaml's events to the tree. Events, because libyaml's own documents take a key twice
 * and do not come back from deep nesting. */
#include "setup/tree.h"

#include <assert.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <yaml.h>

#include "base/text.h"

#define BLOCK_NODES 256

struct block {
    struct block *next;
    size_t used;
    struct sm_node node[BLOCK_NODES];
};

struct sm_tree {
    struct block *blocks;
    size_t n_nodes;
    struct sm_node *root;
};

/* What is being built: the open list or map, and the key whose value comes next. */
struct builder {
    const char *file;
    struct sm_blames *blames;
    struct sm_tree *tree;
    struct sm_node *open;
    size_t depth;
    char *key;
    unsigned key_line, key_column;
    bool documents_over;
};

/* ---- the text before libyaml sees it ---- */

struct place {
    unsigned line, column;
};

static struct place place_of(const char *text, size_t at)
{
    struct place p = { 1, 1 };

    for (size_t i = 0; i < at; i++) {
        if (text[i] == '\n')
            p = (struct place){ p.line + 1, 1 };
        else if (((unsigned char)text[i] & 0xC0) != 0x80)
            p.column++;
    }
    return p;
}

/* The characters that YAML allows in a file. */
static bool is_readable(uint32_t c)
{
    if (c < 0x20)
        return c == '\t' || c == '\n' || c == '\r';
    return c != 0x7F && !(c >= 0x80 && c < 0xA0 && c != 0x85) && c != 0xFEFF && c != 0xFFFE &&
           c != 0xFFFF;
}

static bool text_is_readable(const char *file, const char *text, size_t n, struct sm_blames *blames)
{
    size_t at = 0;

    if (n > SM_TREE_TEXT_MAX) {
        sm_blames_add(blames, file, 0, 0, "the file has %zu bytes; at most %u are read", n,
                      SM_TREE_TEXT_MAX);
        return false;
    }
    while (at < n) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(text + at, n - at, &code);
        const struct place p =
            len == 0 || !is_readable(code) ? place_of(text, at) : (struct place){ 0, 0 };

        if (len == 0) {
            sm_blames_add(blames, file, p.line, p.column,
                          "expected text in UTF-8, got the byte 0x%02X",
                          (unsigned)(unsigned char)text[at]);
            return false;
        }
        if (!is_readable(code)) {
            sm_blames_add(blames, file, p.line, p.column,
                          "a character that a setup file may not hold: U+%04X", (unsigned)code);
            return false;
        }
        at += len;
    }
    return true;
}

/* ---- nodes ---- */

static struct sm_node *new_node(struct sm_tree *t)
{
    struct block *b = t->blocks;

    if (b == NULL || b->used == BLOCK_NODES) {
        b = calloc(1, sizeof *b);
        if (b == NULL)
            return NULL;
        b->next = t->blocks;
        t->blocks = b;
    }
    t->n_nodes++;
    return &b->node[b->used++];
}

static char *copy(const void *bytes, size_t n)
{
    char *c = malloc(n + 1);

    if (c != NULL) {
        memcpy(c, bytes, n);
        c[n] = '\0';
    }
    return c;
}

void sm_tree_destroy(struct sm_tree *t)
{
    if (t == NULL)
        return;
    while (t->blocks != NULL) {
        struct block *b = t->blocks;
        t->blocks = b->next;
        for (size_t i = 0; i < b->used; i++) {
            free(b->node[i].text);
            free(b->node[i].key);
        }
        free(b);
    }
    free(t);
}

const struct sm_node *sm_tree_root(const struct sm_tree *t)
{
    return t->root;
}

/* ---- events ---- */

static void blame_at(struct builder *b, const yaml_mark_t *mark, const char *what)
{
    sm_blames_add(b->blames, b->file, (unsigned)mark->line + 1, (unsigned)mark->column + 1, "%s",
                  what);
}

/* A new node in its place. SM_EFULL: blamed. */
static enum sm_status add_node(struct builder *b, enum sm_node_kind kind, const yaml_mark_t *mark,
                               struct sm_node **ret_node)
{
    struct sm_node *node;

    if (b->tree->n_nodes == SM_TREE_NODES_MAX) {
        blame_at(b, mark, "too many values: at most 20000 are read");
        return SM_EFULL;
    }
    node = new_node(b->tree);
    if (node == NULL)
        return SM_ENOMEM;
    node->kind = kind;
    node->line = (unsigned)mark->line + 1;
    node->column = (unsigned)mark->column + 1;
    node->parent = b->open;
    node->key = b->key;
    node->key_line = b->key_line;
    node->key_column = b->key_column;
    b->key = NULL;
    if (b->open == NULL) {
        b->tree->root = node;
    } else {
        struct sm_node *p = b->open;
        if (p->child == NULL)
            p->child = node;
        else
            p->last->next = node;
        p->last = node;
        node->at = ++p->n_children;
    }
    *ret_node = node;
    return SM_OK;
}

/* A scalar where a key is due. */
static enum sm_status take_key(struct builder *b, const yaml_event_t *e)
{
    const char *s = (const char *)e->data.scalar.value;
    const size_t n = e->data.scalar.length;
    const struct sm_node *c;

    if (!sm_name_ok(s, n)) {
        blame_at(b, &e->start_mark, "expected a key of 1 to 64 printable characters");
        return SM_ESYNTAX;
    }
    if (b->open->n_children == SM_TREE_KEYS_MAX) {
        blame_at(b, &e->start_mark, "more than 256 keys in one place");
        return SM_EFULL;
    }
    for (c = b->open->child; c != NULL && strcmp(c->key, s) != 0; c = c->next)
        ;
    if (c != NULL)
        sm_blames_add(b->blames, b->file, (unsigned)e->start_mark.line + 1,
                      (unsigned)e->start_mark.column + 1, "%s: said twice; the first is on line %u",
                      s, c->key_line);
    b->key = copy(s, n);
    b->key_line = (unsigned)e->start_mark.line + 1;
    b->key_column = (unsigned)e->start_mark.column + 1;
    return b->key == NULL ? SM_ENOMEM : SM_OK;
}

static bool key_is_due(const struct builder *b)
{
    return b->open != NULL && b->open->kind == SM_NODE_MAP && b->key == NULL;
}

static void refuse_extras(struct builder *b, const yaml_event_t *e, const yaml_char_t *anchor,
                          const yaml_char_t *tag)
{
    if (anchor != NULL)
        blame_at(b, &e->start_mark, "anchors (&name) are not used in setup files: write it out");
    if (tag != NULL)
        blame_at(b, &e->start_mark, "tags (!name) are not used in setup files");
}

static enum sm_status take_scalar(struct builder *b, const yaml_event_t *e)
{
    struct sm_node *node;
    enum sm_status st;

    refuse_extras(b, e, e->data.scalar.anchor, e->data.scalar.tag);
    if (key_is_due(b))
        return take_key(b, e);
    st = add_node(b, SM_NODE_TEXT, &e->start_mark, &node);
    if (st != SM_OK)
        return st;
    node->n = e->data.scalar.length;
    node->text = copy(e->data.scalar.value, node->n);
    return node->text == NULL ? SM_ENOMEM : SM_OK;
}

static enum sm_status open_node(struct builder *b, const yaml_event_t *e, enum sm_node_kind kind)
{
    struct sm_node *node;
    enum sm_status st;

    if (kind == SM_NODE_LIST)
        refuse_extras(b, e, e->data.sequence_start.anchor, e->data.sequence_start.tag);
    else
        refuse_extras(b, e, e->data.mapping_start.anchor, e->data.mapping_start.tag);
    if (key_is_due(b)) {
        blame_at(b, &e->start_mark, "expected a key, got a list or map");
        return SM_ESYNTAX;
    }
    if (b->depth == SM_TREE_DEPTH_MAX) {
        blame_at(b, &e->start_mark, "nested too deeply: at most 16 lists and maps in one another");
        return SM_EFULL;
    }
    st = add_node(b, kind, &e->start_mark, &node);
    if (st != SM_OK)
        return st;
    b->open = node;
    b->depth++;
    return SM_OK;
}

static enum sm_status start_document(struct builder *b, const yaml_event_t *e)
{
    if (b->documents_over) {
        blame_at(b, &e->start_mark, "a second document (---): a setup file holds one");
        return SM_ESYNTAX;
    }
    return SM_OK;
}

/* An alias stands for a value: refused, and something is put in its place so that reading goes on.
 */
static enum sm_status take_alias(struct builder *b, const yaml_event_t *e)
{
    struct sm_node *node;
    enum sm_status st;

    blame_at(b, &e->start_mark, "aliases (*name) are not used in setup files: write it out");
    if (key_is_due(b))
        return SM_ESYNTAX;
    st = add_node(b, SM_NODE_TEXT, &e->start_mark, &node);
    if (st != SM_OK)
        return st;
    node->text = copy("", 0);
    return node->text == NULL ? SM_ENOMEM : SM_OK;
}

static enum sm_status take(struct builder *b, const yaml_event_t *e)
{
    switch (e->type) {
    case YAML_DOCUMENT_START_EVENT:
        return start_document(b, e);
    case YAML_DOCUMENT_END_EVENT:
        b->documents_over = true;
        return SM_OK;
    case YAML_ALIAS_EVENT:
        return take_alias(b, e);
    case YAML_SCALAR_EVENT:
        return take_scalar(b, e);
    case YAML_SEQUENCE_START_EVENT:
        return open_node(b, e, SM_NODE_LIST);
    case YAML_MAPPING_START_EVENT:
        return open_node(b, e, SM_NODE_MAP);
    case YAML_SEQUENCE_END_EVENT:
    case YAML_MAPPING_END_EVENT:
        assert(b->open != NULL); /* libyaml ends only what it began */
        b->open = b->open->parent;
        b->depth--;
        return SM_OK;
    default:
        return SM_OK;
    }
}

/* ---- the whole ---- */

static const char *line_start(const char *text, size_t n, size_t line)
{
    const char *at = text, *end = text + n;

    while (line > 0 && at < end) {
        const char *eol = memchr(at, '\n', (size_t)(end - at));
        if (eol == NULL)
            return end;
        at = eol + 1;
        line--;
    }
    return at;
}

/* The line is indented with a tab: the commonest slip, about which libyaml speaks in riddles. */
static bool tab_indents(const char *text, size_t n, size_t line)
{
    const char *at = line_start(text, n, line), *end = text + n;

    while (at < end && *at == ' ')
        at++;
    return at < end && *at == '\t';
}

static enum sm_status blame_syntax(struct builder *b, const yaml_parser_t *p, const char *text,
                                   size_t n)
{
    const unsigned line = (unsigned)p->problem_mark.line + 1;
    const unsigned column = (unsigned)p->problem_mark.column + 1;

    if (p->error == YAML_MEMORY_ERROR)
        return SM_ENOMEM;
    if (p->error == YAML_READER_ERROR) {
        const struct place at = place_of(text, p->problem_offset < n ? p->problem_offset : n);
        sm_blames_add(b->blames, b->file, at.line, at.column, "cannot be read: %s", p->problem);
    } else if (tab_indents(text, n, p->problem_mark.line)) {
        sm_blames_add(b->blames, b->file, line, column,
                      "a tab at the head of the line: indent with spaces");
    } else {
        sm_blames_add(b->blames, b->file, line, column, "not YAML: %s%s%s",
                      p->context != NULL ? p->context : "", p->context != NULL ? ", " : "",
                      p->problem != NULL ? p->problem : "unreadable");
    }
    return SM_ESYNTAX;
}

static enum sm_status build(struct builder *b, yaml_parser_t *p, const char *text, size_t n)
{
    enum sm_status st = SM_OK;
    bool more = true;

    while (st == SM_OK && more) {
        yaml_event_t e;

        if (!yaml_parser_parse(p, &e))
            return blame_syntax(b, p, text, n);
        more = e.type != YAML_STREAM_END_EVENT;
        st = take(b, &e);
        yaml_event_delete(&e);
    }
    return st;
}

static enum sm_status parse(struct builder *b, const char *text, size_t n)
{
    yaml_parser_t p;
    enum sm_status st;

    if (!yaml_parser_initialize(&p))
        return SM_ENOMEM;
    yaml_parser_set_encoding(&p, YAML_UTF8_ENCODING);
    yaml_parser_set_input_string(&p, (const unsigned char *)text, n);
    st = build(b, &p, text, n);
    yaml_parser_delete(&p);
    free(b->key);
    if (st != SM_OK)
        return st == SM_ENOMEM ? SM_ENOMEM : SM_ESYNTAX;
    if (b->tree->root == NULL) {
        sm_blames_add(b->blames, b->file, 0, 0, "the file is empty: expected keys");
        return SM_ESYNTAX;
    }
    if (b->tree->root->kind != SM_NODE_MAP) {
        sm_blames_add(b->blames, b->file, b->tree->root->line, b->tree->root->column,
                      "expected keys (\"key: value\"), got %s",
                      b->tree->root->kind == SM_NODE_LIST ? "a list" : "plain text");
        return SM_ESYNTAX;
    }
    return SM_OK;
}

enum sm_status sm_tree_parse(const char *file, const char *text, size_t n,
                             struct sm_tree **ret_tree, struct sm_blames *blames)
{
    static const char bom[] = "\xEF\xBB\xBF";
    struct builder b = { .file = file, .blames = blames };
    enum sm_status st;

    if (n >= 3 && memcmp(text, bom, 3) == 0) {
        text += 3;
        n -= 3;
    }
    if (!text_is_readable(file, text, n, blames))
        return SM_ESYNTAX;
    b.tree = calloc(1, sizeof *b.tree);
    if (b.tree == NULL)
        return SM_ENOMEM;
    st = parse(&b, text, n);
    if (st != SM_OK) {
        sm_tree_destroy(b.tree);
        return st;
    }
    *ret_tree = b.tree;
    return SM_OK;
}
