/* SPDX-License-Identifier: GPL-3.0-or-later */
/* outside.h: the daemon's process seen from outside, plugs pulled and put back, and logs replayed
 * once it has stopped. */
#ifndef SM_TESTS_OUTSIDE_H
#define SM_TESTS_OUTSIDE_H
#include "live.h"
#include "log_check.h"

struct outside { /* of a process, from /proc */
    unsigned descriptors;
    long resident_kb;
    double cpu_s; /* used so far, its own and the kernel's for it */
};
struct outside outside_look(pid_t pid);

/* The meter's link goes and its line hangs up. */
void outside_unplug(struct live *l, size_t meter);
/* Another pseudo-terminal, the link pointing to it. */
void outside_plug(struct live *l, size_t meter);

/* The daemon stops well; every log verifies, by the reader and by `stillmark verify`, and replays.
 * ret_log: of this meter, for the caller to look at and free. */
void outside_stop_and_check(struct live *l, size_t meter, struct log_check *ret_log,
                            const char *what);

/* Lines of this kind that have this text in them. */
size_t outside_count(const struct log_check *c, const char *kind, const char *text);
/* The wall clock of an entry, in microseconds. */
int64_t outside_utc_us(const struct log_check_line *line);
int64_t outside_now_us(void);
#endif
