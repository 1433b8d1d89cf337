/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_list.c: files by name, verified and sorted. */
#include "log_list.h"

#include <dirent.h>
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "folder.h"

void sm_log_list_init(struct sm_log_list *l)
{
    memset(l, 0, sizeof *l);
}

void sm_log_list_finish(struct sm_log_list *l)
{
    for (size_t i = 0; i < l->n; i++)
        free(l->file[i].path);
    free(l->file);
    sm_log_list_init(l);
}

static const char *base_name(const char *path)
{
    const char *slash = strrchr(path, '/');

    return slash != NULL ? slash + 1 : path;
}

static enum sm_status no_memory(struct sm_log_list *l)
{
    snprintf(l->why, sizeof l->why, "no memory");
    return SM_ENOMEM;
}

/* Takes the path over. */
static enum sm_status append(struct sm_log_list *l, char *path)
{
    const int64_t ordinal = path != NULL ? sm_file_ordinal(base_name(path)) : 0;

    if (path != NULL && l->n == l->cap) {
        const size_t cap = l->cap > 0 ? 2 * l->cap : 16;
        struct sm_log_file *more = realloc(l->file, cap * sizeof *more);

        if (more != NULL) {
            l->file = more;
            l->cap = cap;
        }
    }
    if (path == NULL || l->n == l->cap) {
        free(path);
        return no_memory(l);
    }
    l->file[l->n] = (struct sm_log_file){ .path = path, .ordinal = ordinal > 0 ? ordinal : 0 };
    l->n++;
    return SM_OK;
}

static char *join(const char *folder, size_t n, const char *name)
{
    const size_t size = n + strlen(name) + 2;
    char *path = malloc(size);

    if (path != NULL)
        snprintf(path, size, "%.*s/%s", (int)n, folder, name);
    return path;
}

/* All log files of a folder (n 0: the root) whose ordinal is above `above`. */
static enum sm_status add_folder(struct sm_log_list *l, const char *path, size_t n, int64_t above)
{
    enum sm_status st = SM_OK;
    char *folder = strndup(path, n);
    DIR *d = folder != NULL ? opendir(n > 0 ? folder : "/") : NULL;
    const struct dirent *e;

    if (d == NULL) {
        snprintf(l->why, sizeof l->why, "%.*s: %s", (int)(n < 400 ? n : 400), path,
                 strerror(errno));
        free(folder);
        return SM_EIO;
    }
    while (st == SM_OK && (e = readdir(d)) != NULL)
        if (sm_file_ordinal(e->d_name) > above)
            st = append(l, join(folder, n, e->d_name));
    closedir(d);
    free(folder);
    return st;
}

enum sm_status sm_log_list_add(struct sm_log_list *l, const char *path)
{
    struct stat st;
    const size_t before = l->n;
    enum sm_status s;

    if (stat(path, &st) != 0) {
        snprintf(l->why, sizeof l->why, "%.400s: %s", path, strerror(errno));
        return SM_EIO;
    }
    if (!S_ISDIR(st.st_mode))
        return append(l, strdup(path));
    s = add_folder(l, path, strlen(path), -1);
    if (s == SM_OK && l->n == before) {
        snprintf(l->why, sizeof l->why, "%.400s: no log file in this folder", path);
        return SM_EIO;
    }
    return s;
}

/* Length of a path's folder; 0: the path names none. */
static size_t folder_length(const char *path)
{
    const char *slash = strrchr(path, '/');

    return slash != NULL ? (size_t)(slash - path) : 0;
}

/* Is f the newest one given of its folder (the last, of several alike)? */
static bool is_newest(const struct sm_log_file *list, size_t n, const struct sm_log_file *f)
{
    const size_t len = folder_length(f->path);

    for (const struct sm_log_file *g = list; g < list + n; g++)
        if (folder_length(g->path) == len && memcmp(g->path, f->path, len) == 0 &&
            (g->ordinal > f->ordinal || (g->ordinal == f->ordinal && g > f)))
            return false;
    return true;
}

enum sm_status sm_log_list_add_later(struct sm_log_list *l)
{
    const size_t given = l->n;
    enum sm_status st = SM_OK;

    for (size_t i = 0; i < given && st == SM_OK; i++) {
        const char *path = l->file[i].path;

        if (sm_file_ordinal(base_name(path)) < 0 || !is_newest(l->file, given, &l->file[i]))
            continue;
        if (strchr(path, '/') != NULL)
            st = add_folder(l, path, folder_length(path), l->file[i].ordinal);
        else
            st = add_folder(l, ".", 1, l->file[i].ordinal);
    }
    return st;
}

/* By meter, then by ordinal; those without one stay in front as they were given. */
static int compare(const void *a, const void *b)
{
    const struct sm_log_file *x = a, *y = b;
    const int meter = strcmp(x->verify.meter, y->verify.meter);

    if (meter != 0)
        return meter;
    if (x->ordinal != y->ordinal)
        return x->ordinal < y->ordinal ? -1 : 1;
    return strcmp(x->path, y->path);
}

enum sm_status sm_log_list_verify(struct sm_log_list *l, const char *key_hex)
{
    for (size_t i = 0; i < l->n; i++) {
        struct sm_log_file *f = &l->file[i];
        struct sm_whole_file whole;
        const int err = sm_whole_file_open(f->path, &whole);

        if (err != 0) {
            snprintf(l->why, sizeof l->why, "%.400s: %s", f->path, strerror(-err));
            return SM_EIO;
        }
        sm_verify(whole.text, whole.n, key_hex, &f->verify);
        sm_whole_file_close(&whole);
        if (f->verify.ordinal > 0)
            f->ordinal = f->verify.ordinal;
        else
            f->verify.ordinal = f->ordinal; /* for the chain */
    }
    if (l->n > 1)
        qsort(l->file, l->n, sizeof *l->file, compare);
    return SM_OK;
}
