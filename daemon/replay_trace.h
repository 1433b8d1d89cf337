/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_trace.h: `stillmark-replay trace FILE.csv`: when a recording would have been taken as
 * settled. */
#ifndef SM_DAEMON_REPLAY_TRACE_H
#define SM_DAEMON_REPLAY_TRACE_H

/* argv[argc] are the words after "trace". Writes CSV to standard output; what is wrong as one line
 * to standard error. Returns the exit status: 0 done, 2 could not be done. */
int sm_replay_trace(int argc, char **argv);
#endif
