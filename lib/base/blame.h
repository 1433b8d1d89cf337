/* SPDX-License-Identifier: GPL-3.0-or-later */
/* blame.h: what is wrong in a person's file, where, and what was expected; as many as there are. */
#ifndef SM_BASE_BLAME_H
#define SM_BASE_BLAME_H
#include <stdbool.h>
#include <stddef.h>

#define SM_PATH_SIZE 256
#define SM_BLAME_SIZE 320

struct sm_blame {
    char file[SM_PATH_SIZE];
    unsigned line, column; /* from 1; 0 = the file as a whole */
    char text[SM_BLAME_SIZE];
};

struct sm_blames {
    struct sm_blame *list; /* [cap], the caller's */
    size_t cap, n;
    size_t left_out; /* more than cap were found */
};

void sm_blames_init(struct sm_blames *b, struct sm_blame *list, size_t cap);

/* Adds one; past the ceiling it only counts. The text is cut where it does not fit. */
__attribute__((format(printf, 5, 6))) void sm_blames_add(struct sm_blames *b, const char *file,
                                                         unsigned line, unsigned column,
                                                         const char *fmt, ...);

/* "conf/methods/ph.yaml:14:9: slope.from: expected …" into out[cap], cut where it does not fit;
 * line and column are left out where 0; control characters are shown as \xNN. */
void sm_blame_write(const struct sm_blame *b, char *out, size_t cap);
#endif
