/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_log.h: `stillmark-replay LOG… [--rules METHOD.yaml]`. */
#ifndef SM_DAEMON_REPLAY_LOG_H
#define SM_DAEMON_REPLAY_LOG_H

/* argv: what stands behind the program's name. Exit status 0, 1 or 2. */
int sm_replay_log(int argc, char **argv);
#endif
