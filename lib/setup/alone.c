/* SPDX-License-Identifier: GPL-3.0-or-later */
/* alone.c: one text alone to its struct: a sheet against a setup, a profile, a method. */
#include <stdlib.h>
#include <string.h>

#include "setup/parts.h"

enum sm_status sm_sheet_load(const struct sm_setup *setup, const char *name, const char *text,
                             size_t n, struct sm_sheet *ret_sheet, struct sm_blames *blames)
{
    const size_t start = blames->n, before = sm_blames_total(blames);
    const struct sm_reader r = { name, blames };
    struct sm_sheet *sheet;
    struct sm_tree *tree;
    enum sm_status st = sm_tree_parse(name, text, n, &tree, blames);

    if (st != SM_OK)
        return st;
    sheet = calloc(1, sizeof *sheet);
    if (sheet == NULL) {
        sm_tree_destroy(tree);
        return SM_ENOMEM;
    }
    sm_text_copy(sheet->file, sizeof sheet->file, name);
    sm_sheet_fill(setup, &r, sm_tree_root(tree), sheet);
    sm_tree_destroy(tree);
    sm_blames_sort(blames, start);
    st = sm_blames_total(blames) == before ? SM_OK : SM_ESYNTAX;
    if (st == SM_OK)
        *ret_sheet = *sheet;
    free(sheet);
    return st;
}

/* One file whose name is what it is called by; `fill` blames what is wrong in it. */
static enum sm_status load(const char *name, const char *text, size_t n,
                           void (*fill)(const struct sm_reader *r, const struct sm_node *root,
                                        const char *stem, void *out),
                           void *out, struct sm_blames *blames)
{
    const size_t start = blames->n, before = sm_blames_total(blames);
    const struct sm_reader r = { name, blames };
    char stem[SM_NAME_SIZE];
    struct sm_tree *tree;
    const enum sm_status st = sm_tree_parse(name, text, n, &tree, blames);

    if (st != SM_OK)
        return st;
    sm_path_stem(stem, name);
    fill(&r, sm_tree_root(tree), stem, out);
    sm_tree_destroy(tree);
    sm_blames_sort(blames, start);
    return sm_blames_total(blames) == before ? SM_OK : SM_ESYNTAX;
}

static void fill_profile(const struct sm_reader *r, const struct sm_node *root, const char *stem,
                         void *out)
{
    sm_profile_fill(r, root, stem, out);
}

static void fill_method(const struct sm_reader *r, const struct sm_node *root, const char *stem,
                        void *out)
{
    sm_method_fill(r, root, stem, out);
}

enum sm_status sm_profile_load(const char *name, const char *text, size_t n,
                               struct sm_profile *ret_profile, struct sm_blames *blames)
{
    struct sm_profile p = { 0 };
    const enum sm_status st = load(name, text, n, fill_profile, &p, blames);

    if (st == SM_OK)
        *ret_profile = p;
    return st;
}

enum sm_status sm_method_load(const char *name, const char *text, size_t n,
                              struct sm_method *ret_method, struct sm_blames *blames)
{
    struct sm_method m = { 0 };
    const enum sm_status st = load(name, text, n, fill_method, &m, blames);

    if (st == SM_OK)
        *ret_method = m;
    return st;
}
