/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "setup/tree.h"
#include "setup/value.h"

static struct sm_blame list[64];
static struct sm_blames blames;

static struct sm_tree *parse(const char *text, size_t n, enum sm_status *ret_status)
{
    struct sm_tree *tree = NULL;

    sm_blames_init(&blames, list, COUNT(list));
    *ret_status = sm_tree_parse("f.yaml", text, n, &tree, &blames);
    return tree;
}

static void a_node_knows_its_place_and_its_key(void **state)
{
    static const char text[] = "# head\nä: { b: [ x, \"y\\0z\" ] }\nc: |\n  long\n  text\n";
    enum sm_status st;
    struct sm_tree *tree = parse(text, strlen(text), &st);
    const struct sm_node *root, *b, *y, *c;

    (void)state;
    assert_int_equal(st, SM_OK);
    root = sm_tree_root(tree);
    assert_int_equal(root->kind, SM_NODE_MAP);
    assert_int_equal(root->n_children, 2);
    b = sm_key(sm_key(root, "ä"), "b");
    assert_int_equal(b->kind, SM_NODE_LIST);
    assert_int_equal(b->line, 2);
    assert_int_equal(b->column, 9); /* columns count characters: ä is one */
    assert_int_equal(b->key_column, 6);
    y = b->child->next;
    assert_int_equal(y->at, 2);
    assert_int_equal(y->n, 3);
    assert_memory_equal(y->text, "y\0z", 4);
    c = sm_key(root, "c");
    assert_string_equal(c->text, "long\ntext\n");
    assert_int_equal(c->line, 3);
    sm_tree_destroy(tree);
}

static void a_byte_order_mark_is_passed_over(void **state)
{
    static const char text[] = "\xEF\xBB\xBF"
                               "a: 1\n";
    enum sm_status st;
    struct sm_tree *tree = parse(text, strlen(text), &st);

    (void)state;
    assert_int_equal(st, SM_OK);
    assert_int_equal(sm_key(sm_tree_root(tree), "a")->column, 4);
    sm_tree_destroy(tree);
}

static void what_is_no_setup_text_is_blamed_at_its_place(void **state)
{
    static const struct {
        const char *name, *text;
        size_t n; /* 0: strlen */
        const char *want;
    } cases[] = {
        { "nothing", "", 0, "f.yaml: the file is empty: expected keys" },
        { "comment only", "# x\n", 0, "f.yaml: the file is empty: expected keys" },
        { "a list", "- a\n- b\n", 0, "f.yaml:1:1: expected keys (\"key: value\"), got a list" },
        { "text", "hello\n", 0, "f.yaml:1:1: expected keys (\"key: value\"), got plain text" },
        { "key twice", "a: 1\nb: 2\na: 3\n", 0,
          "f.yaml:3:1: a: said twice; the first is on line 1" },
        { "inner key twice", "a: { b: 1, b: 2 }\n", 0,
          "f.yaml:1:12: b: said twice; the first is on line 1" },
        { "anchor", "a: &x 1\n", 0,
          "f.yaml:1:4: anchors (&name) are not used in setup files: write it out" },
        { "alias", "a: *x\n", 0,
          "f.yaml:1:4: aliases (*name) are not used in setup files: write it out" },
        { "tag", "a: !!int 1\n", 0, "f.yaml:1:4: tags (!name) are not used in setup files" },
        { "second document", "a: 1\n---\na: 2\n", 0,
          "f.yaml:2:1: a second document (---): a setup file holds one" },
        { "list as key", "? [ a ]\n: b\n", 0, "f.yaml:1:3: expected a key, got a list or map" },
        { "empty key", "\"\": b\n", 0,
          "f.yaml:1:1: expected a key of 1 to 64 printable characters" },
        { "bad UTF-8", "a: 1\nbc: \xff\n", 0,
          "f.yaml:2:5: expected text in UTF-8, got the byte 0xFF" },
        { "overlong UTF-8", "a: \xC0\xAF\n", 0,
          "f.yaml:1:4: expected text in UTF-8, got the byte 0xC0" },
        { "UTF-16", "a\0:\0 \0b\0", 8,
          "f.yaml:1:2: a character that a setup file may not hold: U+0000" },
        { "NUL", "a: 1\n\0b: 2\n", 11,
          "f.yaml:2:1: a character that a setup file may not hold: U+0000" },
        { "escape character", "a: 1\nb: \x1b[2J\n", 0,
          "f.yaml:2:4: a character that a setup file may not hold: U+001B" },
        { "tab", "a:\n\tb: 1\n", 0,
          "f.yaml:2:1: a tab at the head of the line: indent with spaces" },
        { "open bracket", "a: [ 1, 2\n", 0, NULL },
        { "open quote", "a: \"x\n", 0, NULL },
        { "bad indent", "a: 1\n  b: 2\n", 0, NULL },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const size_t n = cases[i].n > 0 ? cases[i].n : strlen(cases[i].text);
        char line[512] = "";
        enum sm_status st;
        struct sm_tree *tree = parse(cases[i].text, n, &st);

        sm_tree_destroy(tree);
        if (blames.n != 1)
            fail_msg("%s: %zu blames, want 1", cases[i].name, blames.n);
        sm_blame_write(&list[0], line, sizeof line);
        if (cases[i].want != NULL && strcmp(line, cases[i].want) != 0)
            fail_msg("%s: got  %s\nwant %s", cases[i].name, line, cases[i].want);
        if (cases[i].want == NULL && (strstr(line, "not YAML: ") == NULL || list[0].line == 0))
            fail_msg("%s: got %s", cases[i].name, line);
    }
}

/* head, then `one` so many times, then tail. To be freed. */
static char *repeat(const char *head, const char *one, size_t times, const char *tail,
                    size_t *ret_n)
{
    const size_t len = strlen(one), n = strlen(head) + times * len + strlen(tail);
    char *text = malloc(n + 1), *at = text;

    assert_non_null(text);
    at += sprintf(at, "%s", head);
    for (size_t i = 0; i < times; i++, at += len)
        memcpy(at, one, len);
    strcpy(at, tail);
    *ret_n = n;
    return text;
}

static void hostile_size_and_depth_are_refused(void **state)
{
    static const struct {
        const char *name, *head, *one;
        size_t times;
        const char *tail, *want; /* in the first blame */
    } cases[] = {
        { "200,000 brackets", "a: ", "[", 200000, "", "the file has 200003 bytes" },
        { "130,000 brackets", "a: ", "[", 130000, "", "nested too deeply" },
        { "130,000 braces", "a: ", "{", 130000, "", "expected a key, got a list or map" },
        { "deep block lists", "a: ", "- ", 60000, "", "" },
        { "maps in maps", "a: ", "{a: ", 30000, "", "nested too deeply" },
        { "question marks", "", "? ", 60000, "", "" },
        { "17 lists", "a: ", "[", 16, "]]]]]]]]]]]]]]]]\n", "nested too deeply" },
        { "huge", "a: ", "x", 140000, "\n", "the file has 140004 bytes; at most 131072 are read" },
        { "many values", "a: [", "1,", 60000, "]\n", "too many values" },
        { "same key 20,000 times", "", "a: 1\n", 20000, "", "said twice" },
        { "many anchors", "a: [", "&x 1,", 19000, "]\n", "anchors" },
        { "quotes", "a: ", "'", 131000, "", NULL },
        { "spaces", "a:", " ", 131000, "", NULL },
        { "newlines", "a: 1", "\n", 131000, "", NULL },
        { "comments", "a: 1", " #", 65000, "", NULL },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        enum sm_status st;
        size_t n;
        char *text = repeat(cases[i].head, cases[i].one, cases[i].times, cases[i].tail, &n);
        struct sm_tree *tree = parse(text, n, &st);

        sm_tree_destroy(tree);
        free(text);
        if (cases[i].want == NULL) {
            if (blames.n > 0)
                fail_msg("%s: blamed: %s", cases[i].name, list[0].text);
        } else if (blames.n == 0 || strstr(list[0].text, cases[i].want) == NULL) {
            fail_msg("%s: got \"%s\", want \"%s\"", cases[i].name,
                     blames.n > 0 ? list[0].text : "no blame", cases[i].want);
        }
    }
}

/* A map of 256 different keys is read, one of 257 is not. */
static void the_number_of_keys_in_one_place_is_bounded(void **state)
{
    (void)state;
    for (unsigned keys = SM_TREE_KEYS_MAX; keys <= SM_TREE_KEYS_MAX + 1; keys++) {
        char text[8192];
        size_t n = 0;
        enum sm_status st;
        struct sm_tree *tree;

        for (unsigned k = 0; k < keys; k++)
            n += (size_t)sprintf(text + n, "k%u: 1\n", k);
        tree = parse(text, n, &st);
        sm_tree_destroy(tree);
        assert_int_equal(blames.n, keys > SM_TREE_KEYS_MAX ? 1 : 0);
    }
}

static void doubling_by_aliases_never_starts(void **state)
{
    static const char text[] = "a: &a [ x, x, x, x, x, x, x, x, x ]\n"
                               "b: &b [ *a, *a, *a, *a, *a, *a, *a ]\n"
                               "c: &c [ *b, *b, *b, *b, *b, *b, *b ]\n"
                               "d: [ *c, *c, *c, *c, *c, *c, *c ]\n";
    enum sm_status st;
    struct sm_tree *tree = parse(text, strlen(text), &st);

    (void)state;
    sm_tree_destroy(tree);
    assert_int_equal(blames.n, 3 + 21);
}

static void a_text_cut_at_any_byte_is_read_or_blamed(void **state)
{
    static const char text[] = "a: { b: [ 1, \"x\\n\", 'y' ], c: |\n }\nd:\n  - e: °C # f\n"
                               "g: >-\n  h\n  i\n? j\n: k\n";

    (void)state;
    for (size_t n = 0; n < sizeof text; n++) {
        char *exact =
            malloc(n > 0 ? n : 1); /* no byte more, so that a sanitizer sees a read past it */
        enum sm_status st;
        struct sm_tree *tree;

        assert_non_null(exact);
        memcpy(exact, text, n);
        tree = parse(exact, n, &st);
        if ((st == SM_OK) != (tree != NULL) || (st != SM_OK && blames.n == 0))
            fail_msg("cut at %zu: status %d, %zu blames", n, st, blames.n);
        sm_tree_destroy(tree);
        free(exact);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_node_knows_its_place_and_its_key),
        cmocka_unit_test(a_byte_order_mark_is_passed_over),
        cmocka_unit_test(what_is_no_setup_text_is_blamed_at_its_place),
        cmocka_unit_test(hostile_size_and_depth_are_refused),
        cmocka_unit_test(the_number_of_keys_in_one_place_is_bounded),
        cmocka_unit_test(doubling_by_aliases_never_starts),
        cmocka_unit_test(a_text_cut_at_any_byte_is_read_or_blamed),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
