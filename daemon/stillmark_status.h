/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_status.h: `stillmark status`: what each meter does now. */
#ifndef SM_DAEMON_STILLMARK_STATUS_H
#define SM_DAEMON_STILLMARK_STATUS_H
#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

/* argv[argc] are the words after "status". Returns the exit status: 0 told, 2 no daemon. */
int sm_stillmark_status(int argc, char **argv);

/* A status object to standard output: "bench-2: Settling …", and what else is to be known, each on
 * a line of its own below it. */
void sm_status_print(const json_t *status, bool method_note);

/* "bench-1, bench-2": the meters of a list of status objects. Safe for a terminal. */
void sm_status_names(const json_t *list, char *ret_text, size_t cap);
#endif
