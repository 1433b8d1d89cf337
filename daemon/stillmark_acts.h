/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_acts.h: `stillmark sheet`, `next`, `skip`, `note` … : an act is told to the running
 * daemon and its answer is waited for. */
#ifndef SM_DAEMON_STILLMARK_ACTS_H
#define SM_DAEMON_STILLMARK_ACTS_H
#include "core/input.h"

/* argv[argc] are the words after the act's name. The answer goes to standard output, as a sentence
 * or
 * (--json) as its entry; what is wrong as one line to standard error. Returns the exit status: 0
 * done, 1 refused, 2 could not be done. */
int sm_stillmark_act(enum sm_act_kind act, int argc, char **argv);
#endif
