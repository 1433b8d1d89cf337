/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_talk.h: the commands' end of the control socket: finds the daemon, sends one request
 * per line, takes one object per line. Waits at most until a stated time. What comes in may be
 * anything.
 *
 * Times are ns of sm_talk_clock_ns. ret_why is one sentence, safe for a terminal. */
#ifndef SM_DAEMON_STILLMARK_TALK_H
#define SM_DAEMON_STILLMARK_TALK_H
#include <jansson.h>
#include <stdbool.h>
#include <stdint.h>

#include "base/status.h"

#define SM_TALK_WHY_SIZE 1024
#define SM_TALK_WAIT_NS INT64_C(15000000000) /* longest wait for an answer */

struct sm_talk;

int64_t sm_talk_clock_ns(void); /* never steps */

/* Connects to: option, else $STILLMARK_SOCKET, else the socket that is there of
 * $XDG_RUNTIME_DIR/stillmark/socket and /run/stillmark/socket. option: NULL or "" none.
 *   SM_EIO, SM_ENOMEM  ret_why */
SM_MUST_CHECK enum sm_status sm_talk_open(const char *option, int64_t until_ns,
                                          struct sm_talk **ret_talk,
                                          char ret_why[SM_TALK_WHY_SIZE]);
void sm_talk_close(struct sm_talk *t); /* NULL is fine */

/* SM_EFULL the request is longer than the daemon takes; SM_EIO, SM_ENOMEM  ret_why */
SM_MUST_CHECK enum sm_status sm_talk_send(struct sm_talk *t, const json_t *request,
                                          int64_t until_ns, char ret_why[SM_TALK_WHY_SIZE]);

/* The next object, owned by the caller (json_decref). until_ns in the past: only what is here now.
 *   SM_ESHORT  nothing came in time
 *   SM_EIO     the daemon closed the connection, or what came is no object: ret_why */
SM_MUST_CHECK enum sm_status sm_talk_next(struct sm_talk *t, int64_t until_ns, json_t **ret_object,
                                          char ret_why[SM_TALK_WHY_SIZE]);
/* The line that the last object came as, and a newline; on standard output. Nothing in it disturbs
 * a terminal and it is still the same JSON. */
void sm_talk_print(const struct sm_talk *t);

/* To be polled for reading. */
int sm_talk_fd(const struct sm_talk *t);

/* The status objects of one meter, or (NULL) of all, as a list owned by the caller. print: each is
 * printed as it came.
 *   SM_EUNKNOWN  the daemon refuses: ret_why is its sentence
 *   SM_ESHORT, SM_EIO, SM_ENOMEM  ret_why */
SM_MUST_CHECK enum sm_status sm_talk_status(struct sm_talk *t, const char *meter, bool print,
                                            int64_t until_ns, json_t **ret_list,
                                            char ret_why[SM_TALK_WHY_SIZE]);

/* {"k":"error","why":…}: true, and its sentence in ret_why. */
bool sm_talk_is_error(const json_t *object, char ret_why[SM_TALK_WHY_SIZE]);
bool sm_talk_is(const json_t *object, const char *k);
#endif
