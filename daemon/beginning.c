/* SPDX-License-Identifier: GPL-3.0-or-later */
/* beginning.c: what the next file begins from: the newest file with a stamped `open` says it. */
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "folder.h"

#define N_MOST INT64_C(1000000000000000) /* no meter makes as many entries */

struct names { /* the newest log file older than `below` */
    int64_t below, best;
    char name[SM_FILE_NAME_SIZE];
};

static void see_name(void *arg, const char *name)
{
    struct names *s = arg;
    const int64_t ordinal = sm_file_ordinal(name);

    if (ordinal > s->best && ordinal < s->below && strlen(name) < sizeof s->name) {
        s->best = ordinal;
        snprintf(s->name, sizeof s->name, "%s", name);
    }
}

/* Files of attempts that ended before they were shown: nothing in them was announced. */
static void drop_unshown(void *arg, const char *name)
{
    const struct sm_folder *const *f = arg;
    const char *const ending = strrchr(name, '.');
    char shown[SM_FILE_NAME_SIZE];

    if (ending == NULL || strcmp(ending, ".new") != 0 || (size_t)(ending - name) >= sizeof shown)
        return;
    snprintf(shown, sizeof shown, "%.*s", (int)(ending - name), name);
    if (sm_file_ordinal(shown) >= 0)
        sm_folder_drop_file(*f, shown);
}

/* Into malloc'd storage; -errno. */
static int read_whole(const struct sm_door *door, const char *path, char **ret_text, size_t *ret_n)
{
    struct stat st;
    size_t n = 0, cap;
    ssize_t got;
    char *text;
    const int fd = door->open(door, path, O_RDONLY, 0);

    if (fd < 0)
        return fd;
    got = door->fstat(door, fd, &st);
    cap = got < 0 || st.st_size < 0 ? 0 : (size_t)st.st_size;
    text = got < 0 ? NULL : malloc(cap + 1);
    if (got >= 0 && text == NULL)
        got = -ENOMEM;
    while (got >= 0 && n < cap && (got = door->read(door, fd, text + n, cap - n)) > 0)
        n += (size_t)got;
    (void)door->close(door, fd);
    if (got < 0) {
        free(text);
        return (int)got;
    }
    text[n] = '\0';
    *ret_text = text;
    *ret_n = n;
    return 0;
}

__attribute__((format(printf, 2, 3))) static void add_damage(struct sm_beginning *b,
                                                             const char *fmt, ...)
{
    struct sm_text t = { b->damage, sizeof b->damage, strlen(b->damage), false };
    va_list args;

    if (t.len > 0)
        sm_text_add(&t, "; ");
    va_start(args, fmt);
    sm_text_addv(&t, fmt, args);
    va_end(args);
}

/* One file's word on what comes next; true: its state can be begun from. */
static bool take_file(struct sm_beginning *b, const char *name, int64_t ordinal,
                      struct sm_recovered *r, enum sm_status s, size_t size)
{
    const bool newest = !b->previous.has;
    const bool usable = s == SM_OK || (s == SM_EVALUE && r->verify.stamps > 0);

    if (r->next_n > N_MOST) /* a damaged line's number */
        r->next_n = r->verify.last_n + r->verify.after_lines + 2;
    if (r->next_n > b->next_n)
        b->next_n = r->next_n;
    if (newest) {
        b->previous.has = true;
        b->previous.ordinal = ordinal;
        b->previous.after_lines = usable ? r->verify.after_lines : 0;
        b->previous.after_bytes = usable ? (int64_t)r->verify.after_bytes : (int64_t)size;
        if (usable)
            snprintf(b->previous.stamp, sizeof b->previous.stamp, "%s", r->verify.last_stamp);
    }
    if (s == SM_EVALUE)
        add_damage(b, "%s does not verify from entry %lld to %lld (%s)", name,
                   (long long)r->verify.bad_from, (long long)r->verify.bad_to, r->verify.why);
    else if (s == SM_ESHORT)
        add_damage(b, "%s has no stamped beginning", name);
    return usable;
}

static enum sm_status read_file(const struct sm_folder *f, const struct names *of,
                                struct sm_beginning *b, char ret_why[SM_WHY_SIZE])
{
    char path[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8];
    struct sm_recovered *r = &b->state;
    char *text = NULL;
    size_t n = 0;
    enum sm_status s;
    int got;

    snprintf(path, sizeof path, "%s/%s", f->path, of->name);
    got = read_whole(f->door, path, &text, &n);
    if (got < 0) {
        snprintf(ret_why, SM_WHY_SIZE, "%.400s: cannot be read: %s", path, sm_door_text(got));
        return got == -ENOMEM ? SM_ENOMEM : SM_EIO;
    }
    memset(r, 0, sizeof *r);
    s = sm_recover(text, n, r);
    free(text);
    if (s == SM_ENOMEM) {
        snprintf(ret_why, SM_WHY_SIZE, "%.400s: no memory to read it", path);
        return s;
    }
    b->has_state = take_file(b, of->name, of->best, r, s, n);
    if (!b->has_state)
        sm_recovered_finish(r);
    return SM_OK;
}

enum sm_status sm_folder_recover(const struct sm_folder *f, struct sm_beginning **ret_beginning,
                                 char ret_why[SM_WHY_SIZE])
{
    struct names look = { .below = INT64_MAX, .best = -1 };
    struct sm_beginning *b = calloc(1, sizeof *b);
    enum sm_status s = SM_OK;

    if (b == NULL) {
        snprintf(ret_why, SM_WHY_SIZE, "%.400s: no memory", f->path);
        return SM_ENOMEM;
    }
    b->ordinal = b->next_n = 1;
    (void)f->door->list(f->door, f->path, drop_unshown, &f);
    while (s == SM_OK && !b->has_state) {
        const int r = f->door->list(f->door, f->path, see_name, &look);
        if (r < 0) {
            snprintf(ret_why, SM_WHY_SIZE, "%.400s: cannot be read: %s", f->path, sm_door_text(r));
            s = SM_EIO;
            break;
        }
        if (look.best < 0)
            break;
        if (look.best + 1 > b->ordinal)
            b->ordinal = look.best + 1;
        s = read_file(f, &look, b, ret_why);
        look.below = look.best;
        look.best = -1;
    }
    if (s != SM_OK) {
        sm_beginning_destroy(b);
        return s;
    }
    *ret_beginning = b;
    return SM_OK;
}

void sm_beginning_destroy(struct sm_beginning *b)
{
    if (b == NULL)
        return;
    if (b->has_state)
        sm_recovered_finish(&b->state);
    free(b);
}
