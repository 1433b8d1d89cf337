/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_corpus.c: an ordinary program around a fuzz target: it feeds it every file of the folders
 * and files named, and every file cut after each of its first bytes. A broken invariant aborts. */
#include <dirent.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define INPUT_MAX (1 << 20)
#define CUTS_MAX 64

static int fed;

/* A copy of exactly n bytes, so that a sanitizer sees a read past its end. */
static void feed_first(const char *bytes, size_t n)
{
    uint8_t *copy = malloc(n > 0 ? n : 1);

    if (copy == NULL)
        exit(2);
    memcpy(copy, bytes, n);
    LLVMFuzzerTestOneInput(copy, n);
    free(copy);
}

static void feed_file(const char *path)
{
    static char bytes[INPUT_MAX];
    FILE *f = fopen(path, "rb");

    if (f == NULL) {
        fprintf(stderr, "cannot open %s\n", path);
        exit(2);
    }
    const size_t n = fread(bytes, 1, sizeof bytes, f);
    fclose(f);
    printf("%s, %zu bytes\n", path, n);
    fflush(stdout); /* so that the file is known that makes it abort */
    feed_first(bytes, n);
    for (size_t k = 0; k < n && k < CUTS_MAX; k++)
        feed_first(bytes, k);
    fed++;
}

static void feed(const char *path)
{
    struct stat st;
    DIR *folder;

    if (stat(path, &st) != 0 || !S_ISDIR(st.st_mode)) {
        feed_file(path);
        return;
    }
    folder = opendir(path);
    if (folder == NULL) {
        fprintf(stderr, "cannot open %s\n", path);
        exit(2);
    }
    for (struct dirent *e; (e = readdir(folder)) != NULL;) {
        char name[4096];

        if (e->d_name[0] == '.')
            continue;
        snprintf(name, sizeof name, "%s/%s", path, e->d_name);
        feed(name);
    }
    closedir(folder);
}

int main(int argc, char **argv)
{
    for (int i = 1; i < argc; i++)
        feed(argv[i]);
    printf("%d files\n", fed);
    return fed > 0 ? 0 : 1;
}
