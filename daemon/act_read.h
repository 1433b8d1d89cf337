/* SPDX-License-Identifier: GPL-3.0-or-later */
/* act_read.h: an act as it comes over the control socket, in the log's words. Pure; the object is
 * from outside and may hold anything. */
#ifndef SM_DAEMON_ACT_READ_H
#define SM_DAEMON_ACT_READ_H
#include <jansson.h>

#include "core/input.h"

#define SM_ACT_WHY_SIZE 512

/* {"k":"act","act":"next","id":"7f2c-19","seen":61879,"who":"bench-a", …}: keys as in the log's
 * `act` entry, and "meter". door and peer are the daemon's to say, not the sender's. Texts are
 * lent: o must outlive the act.
 *   SM_ESYNTAX  ret_why: which key, what was expected */
SM_MUST_CHECK enum sm_status sm_act_read(const json_t *o, struct sm_act *ret_act,
                                         char ret_why[SM_ACT_WHY_SIZE]);
#endif
