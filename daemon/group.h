/* SPDX-License-Identifier: GPL-3.0-or-later */
/* group.h: entries that are written together and closed by one stamp. The meter fills it; the
 * writer writes it; when it is on disk the meter announces what it held back. Heap, one owner at a
 * time. */
#ifndef SM_DAEMON_GROUP_H
#define SM_DAEMON_GROUP_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define SM_FILE_NAME_SIZE 64

struct sm_group_line {
    size_t at, n;   /* in the text, the newline included */
    bool held;      /* to be announced only when the group is on disk */
    int64_t answer; /* an `answer`: n of its act; 0 otherwise */
};

struct sm_group {
    struct sm_group *next;          /* in the meter's list of those under way */
    uint64_t epoch;                 /* of the meter's file; older ones are dropped */
    char begins[SM_FILE_NAME_SIZE]; /* the file that this group begins; "" goes on with the one open
                                     */
    bool ends;                      /* the file is closed after it */
    bool durable;                   /* holds a durable event */
    uint64_t raw_bytes;             /* of the meter, in it */
    int64_t since_boot_ns;          /* when its first entry was appended */
    char *text;
    size_t n, cap;
    struct sm_group_line *line;
    size_t n_lines, cap_lines;
};

/* NULL: no memory. */
struct sm_group *sm_group_create(void);
void sm_group_destroy(struct sm_group *g);

/* One whole line. SM_ENOMEM: nothing is changed. */
SM_MUST_CHECK enum sm_status sm_group_add(struct sm_group *g, const char *line, size_t n, bool held,
                                          int64_t answer);
#endif
