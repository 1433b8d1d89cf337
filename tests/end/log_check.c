/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_check.c: see log_check.h. */
#include "log_check.h"

#include <stdlib.h>
#include <string.h>

#include "daemon/scratch.h"
#include "folder.h"
#include "record/head.h"

bool log_check_held_back(const char *line, size_t n)
{
    static const char *const kinds[] = { "capture", "curve",    "check",  "result",  "hold",
                                         "release", "question", "answer", "carried", "stamp",
                                         "open",    "file",     "close" };
    struct sm_head h;

    if (n == 0 || !sm_head_read(line, n - 1, &h))
        return false;
    for (size_t i = 0; i < COUNT(kinds); i++)
        if (sm_head_is(&h, kinds[i]))
            return true;
    return false;
}

static void add_line(struct log_check *c, int64_t n, const char *text, size_t len)
{
    if (c->n_lines == c->cap) {
        c->cap = 2 * c->cap + 4096;
        c->line = realloc(c->line, c->cap * sizeof *c->line);
        assert_non_null(c->line);
    }
    c->line[c->n_lines++] = (struct log_check_line){ n, text, len };
}

/* Every whole line has a number of its own, above all before it; those under a stamp without gap.
 */
static void take_lines(struct log_check *c, size_t file, size_t stamped, int64_t *highest,
                       const char *what)
{
    const char *const text = c->text[file];
    const char *at = text, *newline;
    struct sm_head h;

    while ((newline = memchr(at, '\n', c->size[file] - (size_t)(at - text))) != NULL) {
        const size_t len = (size_t)(newline - at);
        if (!sm_head_read(at, len, &h))
            fail_msg("%s: %s: a line that is no entry: %.80s", what, c->path[file], at);
        if (h.n <= *highest || (at > text && h.n != *highest + 1))
            fail_msg("%s: %s: entry %lld follows entry %lld", what, c->path[file], (long long)h.n,
                     (long long)*highest);
        *highest = h.n;
        if ((size_t)(newline + 1 - text) <= stamped)
            add_line(c, h.n, at, len + 1);
        else
            c->after_lines++;
        at = newline + 1;
    }
}

static void take_file(struct log_check *c, size_t i, int64_t *highest, const char *what)
{
    struct sm_verify v;
    char why[SM_REASON_SIZE];
    const char *const name = strrchr(c->path[i], '/') + 1;

    c->text[i] = scratch_read(c->path[i], &c->size[i]);
    assert_non_null(c->text[i]);
    sm_verify(c->text[i], c->size[i], NULL, &v);
    if (!v.good || v.stamps == 0)
        fail_msg("%s: %s does not verify: entries %lld to %lld: %s", what, name,
                 (long long)v.bad_from, (long long)v.bad_to, v.why);
    if (v.ordinal != sm_file_ordinal(name))
        fail_msg("%s: %s: its open says ordinal %lld", what, name, (long long)v.ordinal);
    if (i > 0 && v.ordinal != c->last.ordinal + 1)
        fail_msg("%s: %s follows ordinal %lld", what, name, (long long)c->last.ordinal);
    if (i > 0 && sm_verify_chain(&c->last, &v, why) != SM_OK)
        fail_msg("%s: %s does not follow the file before: %s", what, name, why);
    take_lines(c, i, v.stamped_bytes, highest, what);
    c->last = v;
}

void log_check_load(struct log_check *c, const char *folder, const char *what)
{
    static char name[LOG_CHECK_FILES][80];
    int64_t highest = 0;

    memset(c, 0, sizeof *c);
    c->n_unshown = scratch_list(folder, ".new", name, LOG_CHECK_FILES);
    c->n_files = scratch_list(folder, ".jsonl", name, LOG_CHECK_FILES);
    if (c->n_files == 0)
        fail_msg("%s: no log in %s", what, folder);
    for (size_t i = 0; i < c->n_files; i++) {
        const size_t size = strlen(folder) + 82;
        c->path[i] = malloc(size);
        assert_non_null(c->path[i]);
        snprintf(c->path[i], size, "%s/%s", folder, name[i]);
        take_file(c, i, &highest, what);
    }
}

void log_check_free(struct log_check *c)
{
    for (size_t i = 0; i < c->n_files; i++) {
        free(c->path[i]);
        free(c->text[i]);
    }
    free(c->line);
}

static int by_n(const void *a, const void *b)
{
    const struct log_check_line *x = a, *y = b;

    return x->n < y->n ? -1 : x->n > y->n;
}

const struct log_check_line *log_check_find(const struct log_check *c, int64_t n)
{
    const struct log_check_line key = { n, NULL, 0 };

    return bsearch(&key, c->line, c->n_lines, sizeof *c->line, by_n);
}

void log_check_has(const struct log_check *c, const char *announced, size_t n, const char *what)
{
    const char *at = announced;
    struct sm_head h;

    while (at < announced + n) {
        const char *const newline = memchr(at, '\n', n - (size_t)(at - announced));
        const struct log_check_line *l;
        assert_non_null(newline);
        const size_t len = (size_t)(newline + 1 - at);
        assert_true(sm_head_read(at, len - 1, &h));
        l = log_check_find(c, h.n);
        if (l == NULL)
            fail_msg("%s: announced, but under no stamp: %.*s", what, (int)len, at);
        if (l->len != len || memcmp(l->text, at, len) != 0)
            fail_msg("%s: announced: %.*s\nbut the log has: %.*s", what, (int)len, at, (int)l->len,
                     l->text);
        at += len;
    }
}

size_t log_check_count(const struct log_check *c, const char *kind)
{
    struct sm_head h;
    size_t found = 0;

    for (size_t i = 0; i < c->n_lines; i++)
        if (sm_head_read(c->line[i].text, c->line[i].len - 1, &h) && sm_head_is(&h, kind))
            found++;
    return found;
}
