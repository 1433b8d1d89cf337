/* SPDX-License-Identifier: GPL-3.0-or-later */
/* folder.c: one meter's log folder: the lock, the names, the making of files. */
#include "folder.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/file.h>

#include "base/number.h"
#include "base/time.h"
#include "keys.h"

#define ORDINAL_MOST INT64_C(100000000000) /* no meter begins as many files */

void sm_folder_init(struct sm_folder *f, const struct sm_door *door, const char *logs,
                    const char *meter)
{
    *f = (struct sm_folder){ .door = door, .lock_fd = -1 };
    snprintf(f->path, sizeof f->path, "%.400s/%s", logs, meter);
}

static bool still_the_same(const struct sm_folder *f, const char *lock)
{
    struct stat st;

    return f->lock_fd >= 0 && f->door->stat(f->door, lock, &st) >= 0 && st.st_dev == f->lock_dev &&
           st.st_ino == f->lock_ino;
}

static enum sm_status find_or_make(const struct sm_folder *f, char ret_why[SM_WHY_SIZE])
{
    struct stat st;
    int r;

    if (f->lock_fd < 0)
        return sm_make_folder(f->door, f->path, 0750, ret_why);
    r = f->door->stat(f->door, f->path, &st);
    if (r >= 0)
        return SM_OK;
    snprintf(ret_why, SM_WHY_SIZE,
             "%.300s is gone (%s); put it back, or make an empty folder in its place", f->path,
             sm_door_text(r));
    return SM_EIO;
}

enum sm_status sm_folder_hold(struct sm_folder *f, char ret_why[SM_WHY_SIZE])
{
    char lock[SM_FOLDER_SIZE + 8];
    struct stat st;
    enum sm_status s;
    int fd, r;

    snprintf(lock, sizeof lock, "%s/lock", f->path);
    if (still_the_same(f, lock))
        return SM_OK;
    s = find_or_make(f, ret_why);
    if (s != SM_OK)
        return s;
    fd = f->door->open(f->door, lock, O_RDWR | O_CREAT, 0640);
    if (fd < 0) {
        snprintf(ret_why, SM_WHY_SIZE, "%.400s: %s", lock, sm_door_text(fd));
        return SM_EIO;
    }
    r = f->door->flock(f->door, fd, LOCK_EX | LOCK_NB);
    if (r >= 0)
        r = f->door->fstat(f->door, fd, &st);
    if (r < 0) {
        (void)f->door->close(f->door, fd);
        if (r == -EWOULDBLOCK) {
            snprintf(ret_why, SM_WHY_SIZE,
                     "%.300s: another stillmarkd writes this log; stop it, or give this one a "
                     "folder of its own (logs:)",
                     f->path);
            return SM_EBUSY;
        }
        snprintf(ret_why, SM_WHY_SIZE, "%.400s: cannot be locked: %s", lock, sm_door_text(r));
        return SM_EIO;
    }
    sm_folder_let_go(f);
    f->lock_fd = fd;
    f->lock_dev = st.st_dev;
    f->lock_ino = st.st_ino;
    return SM_OK;
}

void sm_folder_let_go(struct sm_folder *f)
{
    if (f->lock_fd >= 0)
        (void)f->door->close(f->door, f->lock_fd);
    f->lock_fd = -1;
}

void sm_file_name(char out[SM_FILE_NAME_SIZE], int64_t ordinal, int64_t utc_us)
{
    char utc[SM_UTC_SIZE];

    sm_utc_write(utc, utc_us); /* 2026-12-01T08:12:03.000000Z */
    snprintf(out, SM_FILE_NAME_SIZE, "%06lld_%.13s%.2s%.2sZ.jsonl", (long long)ordinal, utc,
             utc + 14, utc + 17);
}

int64_t sm_file_ordinal(const char *name)
{
    const size_t digits = strspn(name, "0123456789");
    const size_t n = strlen(name);
    int64_t ordinal;

    if (digits < 6 || digits > 18 || name[digits] != '_' || n < digits + 8 ||
        strcmp(name + n - 6, ".jsonl") != 0 || strchr(name, '/') != NULL ||
        sm_integer_parse(name, digits, &ordinal) != SM_OK || ordinal > ORDINAL_MOST)
        return -1;
    return ordinal;
}

static void see_name(void *arg, const char *name)
{
    bool *any = arg;

    if (sm_file_ordinal(name) >= 0)
        *any = true;
}

bool sm_folder_has_logs(const struct sm_folder *f)
{
    bool any = false;

    return f->door->list(f->door, f->path, see_name, &any) >= 0 && any;
}

static void path_of(const struct sm_folder *f, const char *name, const char *ending,
                    char out[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8])
{
    snprintf(out, SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8, "%s/%s%s", f->path, name, ending);
}

int sm_folder_has_file(const struct sm_folder *f, const char *name, int fd)
{
    char path[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8];
    struct stat open, named;
    int r = f->door->fstat(f->door, fd, &open);

    path_of(f, name, "", path);
    if (r >= 0)
        r = f->door->stat(f->door, path, &named);
    if (r < 0)
        return r;
    return open.st_dev == named.st_dev && open.st_ino == named.st_ino ? 0 : -ENOENT;
}

int sm_folder_begin_file(const struct sm_folder *f, const char *name)
{
    char path[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8];
    int fd;

    path_of(f, name, ".new", path);
    fd = f->door->open(f->door, path, O_WRONLY | O_APPEND | O_CREAT | O_EXCL, 0640);
    if (fd == -EEXIST) { /* of an attempt that ended before it was shown */
        (void)f->door->unlink(f->door, path);
        fd = f->door->open(f->door, path, O_WRONLY | O_APPEND | O_CREAT | O_EXCL, 0640);
    }
    return fd;
}

int sm_folder_show_file(const struct sm_folder *f, const char *name)
{
    char from[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8], to[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8];
    struct stat st;
    int fd, r;

    path_of(f, name, ".new", from);
    path_of(f, name, "", to);
    r = f->door->stat(f->door, to, &st);
    if (r != -ENOENT) /* never over another; nobody else makes files here: the folder is locked */
        return r < 0 ? r : -EEXIST;
    r = f->door->rename(f->door, from, to);
    if (r < 0)
        return r;
    fd = f->door->open(f->door, f->path, O_RDONLY | O_DIRECTORY, 0);
    if (fd < 0)
        return fd;
    r = f->door->fsync(f->door, fd);
    (void)f->door->close(f->door, fd);
    return r;
}

void sm_folder_drop_file(const struct sm_folder *f, const char *name)
{
    char path[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE + 8];

    path_of(f, name, ".new", path);
    (void)f->door->unlink(f->door, path);
}
