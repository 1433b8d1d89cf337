/* SPDX-License-Identifier: GPL-3.0-or-later */
/* head.h: the first keys of a line of the log, read without parsing the rest. Our own entries
 * always begin with n, t, utc and k, in this order and without blanks. */
#ifndef SM_RECORD_HEAD_H
#define SM_RECORD_HEAD_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

struct sm_head {
    int64_t n, t_ns;
    const char *when; /* from the t on … */
    size_t when_n;    /* … to the end of utc: the same bytes where the time is the same */
    const char *k;    /* the kind, not NUL-terminated */
    size_t k_n;
    size_t rest; /* offset in the line of what follows the kind */
};

/* line[n] is without its newline. False: it does not begin as an entry does. */
bool sm_head_read(const char *line, size_t n, struct sm_head *ret_head);
bool sm_head_is(const struct sm_head *h, const char *k);
/* The line goes on, after its head, with exactly this text. */
bool sm_head_then(const struct sm_head *h, const char *line, size_t n, const char *text);
#endif
