/* SPDX-License-Identifier: GPL-3.0-or-later */
/* source_disk.c: reading setup files, before anything else of the daemon exists. */
#include "source_disk.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <limits.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static void say(char why[SM_REASON_SIZE], const char *what)
{
    sm_text_copy(why, SM_REASON_SIZE, what);
}

/* Non-blocking, so that a pipe under the name of a file cannot hold us up. */
static int open_plain(const char *path, char why[SM_REASON_SIZE])
{
    const int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK | O_NOCTTY);
    struct stat st;

    if (fd < 0) {
        say(why, strerror(errno));
        return -1;
    }
    if (fstat(fd, &st) != 0 || !S_ISREG(st.st_mode)) {
        say(why, "not a plain file");
        close(fd);
        return -1;
    }
    return fd;
}

/* Up to cap bytes; -1: errno. */
static ssize_t read_up_to(int fd, char *buf, size_t cap)
{
    size_t n = 0;

    while (n < cap) {
        const ssize_t got = read(fd, buf + n, cap - n);
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            return -1;
        if (got == 0)
            break;
        n += (size_t)got;
    }
    return (ssize_t)n;
}

enum sm_status sm_disk_read(const char *path, size_t limit, char **ret_text, size_t *ret_n,
                            char ret_why[SM_REASON_SIZE])
{
    const int fd = open_plain(path, ret_why);
    struct stat st;
    size_t cap;
    ssize_t n;
    char *text;

    if (fd < 0)
        return SM_EIO;
    cap = fstat(fd, &st) == 0 && st.st_size >= 0 && (size_t)st.st_size < limit ? (size_t)st.st_size
                                                                               : limit;
    cap += 1; /* one more, to see a file that is larger */
    text = malloc(cap + 1);
    if (text == NULL) {
        close(fd);
        return SM_ENOMEM;
    }
    n = read_up_to(fd, text, cap);
    if (n < 0)
        say(ret_why, strerror(errno));
    close(fd);
    if (n < 0 || (size_t)n > limit || (size_t)n == cap) {
        free(text);
        if (n < 0)
            return SM_EIO;
        snprintf(ret_why, SM_REASON_SIZE, "larger than %zu bytes", limit);
        return SM_EFULL;
    }
    text[n] = '\0';
    *ret_text = text;
    *ret_n = (size_t)n;
    return SM_OK;
}

/* The file with links followed lies in the setup's folder, or is the setup file itself. */
static bool is_inside(const struct sm_disk *d, const char *name, char *real,
                      char why[SM_REASON_SIZE])
{
    const size_t n = strlen(d->root);

    if (realpath(name, real) == NULL) {
        say(why, strerror(errno));
        return false;
    }
    if (strcmp(name, d->file) == 0 ||
        (n > 0 && strncmp(real, d->root, n) == 0 && (real[n] == '/' || n == 1)))
        return true;
    say(why, "it leads out of the setup's folder");
    return false;
}

static enum sm_status get(void *ctx, const char *name, size_t limit, char **ret_text, size_t *ret_n,
                          char ret_why[SM_REASON_SIZE])
{
    const struct sm_disk *d = ctx;
    char real[PATH_MAX];

    if (!is_inside(d, name, real, ret_why))
        return SM_EIO;
    return sm_disk_read(real, limit, ret_text, ret_n, ret_why);
}

/* The names that alphasort would sort by locale, by bytes. */
static int by_bytes(const struct dirent **a, const struct dirent **b)
{
    return strcmp((*a)->d_name, (*b)->d_name);
}

static enum sm_status list(void *ctx, const char *folder, void (*each)(void *arg, const char *name),
                           void *arg)
{
    struct dirent **entries = NULL;
    const int n = scandir(folder, &entries, NULL, by_bytes);

    (void)ctx;
    if (n < 0)
        return errno == ENOMEM ? SM_ENOMEM : SM_EIO;
    for (int i = 0; i < n; i++) {
        char name[SM_SETUP_PATH_SIZE];
        const int len = snprintf(name, sizeof name, "%s/%s", folder, entries[i]->d_name);

        if (len > 0 && (size_t)len < sizeof name && entries[i]->d_name[0] != '.')
            each(arg, name);
        free(entries[i]);
    }
    free(entries);
    return SM_OK;
}

void sm_source_disk(struct sm_disk *d, const char *file, struct sm_source *ret_source)
{
    char folder[SM_SETUP_PATH_SIZE], real[PATH_MAX];
    const char *slash = strrchr(file, '/');

    memset(d, 0, sizeof *d);
    sm_text_copy(d->file, sizeof d->file, file);
    if (slash == file)
        sm_text_copy(folder, sizeof folder, "/");
    else
        snprintf(folder, sizeof folder, "%.*s", slash != NULL ? (int)(slash - file) : 1,
                 slash != NULL ? file : ".");
    if (realpath(folder, real) != NULL && strlen(real) < sizeof d->root)
        sm_text_copy(d->root, sizeof d->root, real);
    *ret_source = (struct sm_source){ d, get, list };
}
