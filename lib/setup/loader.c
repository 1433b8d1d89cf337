/* SPDX-License-Identifier: GPL-3.0-or-later */
/* loader.c: names and texts of the files of a setup, each read once and kept for the log. */
#include <string.h>

#include "setup/parts.h"

bool sm_path_beside(char out[SM_SETUP_PATH_SIZE], const char *file, const char *tail)
{
    const char *slash = strrchr(file, '/');
    struct sm_text t;

    sm_text_init(&t, out, SM_SETUP_PATH_SIZE);
    if (tail[0] != '/' && slash != NULL)
        sm_text_addn(&t, file, (size_t)(slash - file) + 1);
    sm_text_add(&t, tail);
    return !t.cut;
}

void sm_path_stem(char out[SM_NAME_SIZE], const char *file)
{
    const char *slash = strrchr(file, '/'), *name = slash != NULL ? slash + 1 : file;
    const size_t n = strlen(name);
    struct sm_text t;

    sm_text_init(&t, out, SM_NAME_SIZE);
    sm_text_addn(&t, name, n > 5 && strcmp(name + n - 5, ".yaml") == 0 ? n - 5 : n);
}

void sm_blames_sort(struct sm_blames *b, size_t from)
{
    for (size_t i = from + 1; i < b->n; i++) {
        const struct sm_blame one = b->list[i];
        size_t k = i;

        while (k > from && (b->list[k - 1].line > one.line || (b->list[k - 1].line == one.line &&
                                                               b->list[k - 1].column > one.column)))
            k--;
        memmove(&b->list[k + 1], &b->list[k], (i - k) * sizeof one);
        b->list[k] = one;
    }
}

static void blame_file(const struct sm_loader *l, const struct sm_reader *r,
                       const struct sm_node *node, const char *name, const char *why)
{
    if (node != NULL)
        sm_blame(r, node, "cannot read %s: %s", name, why);
    else
        sm_blames_add(l->blames, name, 0, 0, "cannot be read: %s", why);
}

const struct sm_setup_file *sm_loader_text(struct sm_loader *l, const struct sm_reader *r,
                                           const struct sm_node *node, const char *name)
{
    struct sm_setup *s = l->setup;
    char why[SM_REASON_SIZE] = "";
    struct sm_setup_file *f;
    enum sm_status st;

    for (size_t i = 0; i < s->n_files; i++)
        if (strcmp(s->files[i].name, name) == 0)
            return &s->files[i];
    if (s->n_files == SM_SETUP_FILES_MAX) {
        blame_file(l, r, node, name, "a setup has at most 128 files");
        return NULL;
    }
    f = &s->files[s->n_files];
    st = l->source->get(l->source->ctx, name, SM_SETUP_FILE_MAX, &f->text, &f->n, why);
    if (st == SM_ENOMEM)
        l->failed = SM_ENOMEM;
    else if (st != SM_OK)
        blame_file(l, r, node, name, why[0] != '\0' ? why : sm_status_text(st));
    if (st != SM_OK) {
        f->text = NULL;
        f->n = 0;
        return NULL;
    }
    sm_text_copy(f->name, sizeof f->name, name);
    s->n_files++;
    return f;
}

struct sm_tree *sm_loader_tree(struct sm_loader *l, const struct sm_reader *r,
                               const struct sm_node *node, const char *name)
{
    const struct sm_setup_file *f = sm_loader_text(l, r, node, name);
    struct sm_tree *tree = NULL;

    if (f != NULL && sm_tree_parse(name, f->text, f->n, &tree, l->blames) == SM_ENOMEM)
        l->failed = SM_ENOMEM;
    return tree;
}
