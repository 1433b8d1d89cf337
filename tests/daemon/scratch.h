/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scratch.h: a temporary folder for a test, and looking into it. Each test file includes it once.
 */
#ifndef SM_TEST_SCRATCH_H
#define SM_TEST_SCRATCH_H
#include "check.h"

#include <dirent.h>
#include <errno.h>
#include <ftw.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

struct scratch {
    char path[64];
};

static int scratch_remove_one(const char *path, const struct stat *st, int type, struct FTW *f)
{
    (void)st;
    (void)type;
    (void)f;
    return remove(path);
}

static inline void scratch_make(struct scratch *s)
{
    snprintf(s->path, sizeof s->path, "/tmp/stillmark-test-XXXXXX");
    assert_non_null(mkdtemp(s->path));
}

static inline void scratch_remove(struct scratch *s)
{
    nftw(s->path, scratch_remove_one, 8, FTW_DEPTH | FTW_PHYS);
}

/* The whole file, NUL-terminated; the caller frees it. NULL: there is none. */
static inline char *scratch_read(const char *path, size_t *ret_n)
{
    FILE *f = fopen(path, "rb");
    char *text;
    long n;

    if (f == NULL)
        return NULL;
    assert_int_equal(fseek(f, 0, SEEK_END), 0);
    n = ftell(f);
    assert_true(n >= 0);
    rewind(f);
    text = malloc((size_t)n + 1);
    assert_non_null(text);
    assert_int_equal(fread(text, 1, (size_t)n, f), (size_t)n);
    text[n] = '\0';
    fclose(f);
    *ret_n = (size_t)n;
    return text;
}

static inline void scratch_write(const char *path, const char *text)
{
    FILE *f = fopen(path, "wb");

    assert_non_null(f);
    assert_int_equal(fwrite(text, 1, strlen(text), f), strlen(text));
    assert_int_equal(fclose(f), 0);
}

/* Names in the folder that end so, sorted, at most max; how many. */
static inline size_t scratch_list(const char *folder, const char *ending, char name[][80],
                                  size_t max)
{
    struct dirent **list;
    const int n = scandir(folder, &list, NULL, alphasort);
    size_t found = 0;

    for (int i = 0; i < n; i++) {
        const size_t len = strlen(list[i]->d_name), e = strlen(ending);
        if (len >= e && strcmp(list[i]->d_name + len - e, ending) == 0 && found < max)
            snprintf(name[found++], 80, "%.79s", list[i]->d_name);
        free(list[i]);
    }
    if (n >= 0)
        free(list);
    return found;
}
#endif
