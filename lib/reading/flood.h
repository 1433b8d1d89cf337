/* SPDX-License-Identifier: GPL-3.0-or-later */
/* flood.h: lines that gave no reading are logged in full ten a minute, the others are counted. A
 * minute begins with the first such line after the one before is over. */
#ifndef SM_READING_FLOOD_H
#define SM_READING_FLOOD_H
#include <stdbool.h>
#include <stdint.h>

#define SM_FLOOD_LINES 10
#define SM_FLOOD_WINDOW_NS INT64_C(60000000000)

struct sm_flood { /* all zero: nothing yet */
    bool begun;
    int64_t begun_t_ns;   /* of the minute */
    unsigned lines;       /* in it, logged in full */
    uint64_t passed_over; /* not told yet */
    int64_t due_t_ns;     /* when they are to be told */
};

void sm_flood_init(struct sm_flood *f);

/* A line that gave no reading; true: log it in full, false: it is counted. */
bool sm_flood_line(struct sm_flood *f, int64_t t_ns);

/* When the count of those passed over is to be told; SM_NEVER: none were. */
int64_t sm_flood_deadline(const struct sm_flood *f);

/* At or after the deadline: true, with how many were passed over. */
bool sm_flood_tick(struct sm_flood *f, int64_t t_ns, uint64_t *ret_count);

/* Before the file is changed or the link's end: what has not been told yet, if anything. */
bool sm_flood_end(struct sm_flood *f, uint64_t *ret_count);
#endif
