/* SPDX-License-Identifier: GPL-3.0-or-later */
/* logged.c: setup files out of a bench log. */
#include "setup/logged.h"

#include <stdlib.h>
#include <string.h>

static int find(const struct sm_logged *l, const char *name)
{
    for (size_t i = 0; i < l->n; i++) {
        if (strcmp(l->file[i].name, name) == 0)
            return (int)i;
    }
    return -1;
}

enum sm_status sm_logged_add(struct sm_logged *l, const char *name, const char *text, size_t n)
{
    int at = find(l, name);
    char *copy;

    if (n > SM_SETUP_FILE_MAX || strlen(name) >= SM_SETUP_PATH_SIZE ||
        (at < 0 && l->n == SM_SETUP_FILES_MAX))
        return SM_EFULL;
    copy = malloc(n + 1);
    if (copy == NULL)
        return SM_ENOMEM;
    memcpy(copy, text, n);
    copy[n] = '\0';
    if (at < 0)
        at = (int)l->n++;
    else
        free(l->file[at].text);
    sm_text_copy(l->file[at].name, sizeof l->file[at].name, name);
    l->file[at].text = copy;
    l->file[at].n = n;
    return SM_OK;
}

void sm_logged_finish(struct sm_logged *l)
{
    for (size_t i = 0; i < l->n; i++)
        free(l->file[i].text);
    memset(l, 0, sizeof *l);
}

static enum sm_status get(void *ctx, const char *name, size_t limit, char **ret_text, size_t *ret_n,
                          char ret_why[SM_REASON_SIZE])
{
    const struct sm_logged *l = ctx;
    const int at = find(l, name);
    char *copy;

    if (at < 0) {
        sm_text_copy(ret_why, SM_REASON_SIZE, "the log carries no file of this name");
        return SM_EIO;
    }
    if (l->file[at].n > limit) {
        sm_text_copy(ret_why, SM_REASON_SIZE, "the file is too large");
        return SM_EFULL;
    }
    copy = malloc(l->file[at].n + 1);
    if (copy == NULL) {
        sm_text_copy(ret_why, SM_REASON_SIZE, "no memory");
        return SM_ENOMEM;
    }
    memcpy(copy, l->file[at].text, l->file[at].n + 1);
    *ret_text = copy;
    *ret_n = l->file[at].n;
    return SM_OK;
}

static int by_name(const void *a, const void *b)
{
    return strcmp(*(const char *const *)a, *(const char *const *)b);
}

/* The files directly in a folder, sorted as a folder on disk is. */
static enum sm_status list(void *ctx, const char *folder, void (*each)(void *arg, const char *name),
                           void *arg)
{
    const struct sm_logged *l = ctx;
    const char *names[SM_SETUP_FILES_MAX] = { NULL };
    const size_t f = strlen(folder);
    size_t n = 0;

    for (size_t i = 0; i < l->n; i++) {
        const char *name = l->file[i].name;

        if (strncmp(name, folder, f) == 0 && name[f] == '/' && strchr(name + f + 1, '/') == NULL)
            names[n++] = name;
    }
    qsort(names, n, sizeof names[0], by_name);
    for (size_t i = 0; i < n; i++)
        each(arg, names[i]);
    return SM_OK;
}

void sm_logged_source(struct sm_logged *l, struct sm_source *ret_source)
{
    ret_source->ctx = l;
    ret_source->get = get;
    ret_source->list = list;
}
