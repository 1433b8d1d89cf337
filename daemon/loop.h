/* SPDX-License-Identifier: GPL-3.0-or-later */
/* loop.h: the one event loop: ports, writers, timers, signals, the control socket, the service
 * manager. */
#ifndef SM_DAEMON_LOOP_H
#define SM_DAEMON_LOOP_H
#include "door.h"
#include "folder.h"
#include "setup/setup.h"

struct sm_loop;

/* Locks the log folders, reads the signing key, makes the control socket. setup and door are lent.
 *   SM_EBUSY   another daemon has a folder or the socket
 *   SM_EINVAL  the key is not safe
 *   SM_EIO, SM_ENOMEM: ret_why, one sentence */
SM_MUST_CHECK enum sm_status sm_loop_create(const struct sm_door *door,
                                            const struct sm_setup *setup, const char *socket_path,
                                            struct sm_loop **ret_loop, char ret_why[SM_WHY_SIZE]);

/* Runs until SIGTERM, SIGINT or SIGHUP, then closes every log.
 *   SM_EIO  a log was not closed well: ret_why */
SM_MUST_CHECK enum sm_status sm_loop_run(struct sm_loop *l, char ret_why[SM_WHY_SIZE]);

void sm_loop_destroy(struct sm_loop *l); /* NULL is fine */
#endif
