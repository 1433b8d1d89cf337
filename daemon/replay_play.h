/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_play.h: `stillmark-replay play LOG [--speed N]`: be the meter. */
#ifndef SM_DAEMON_REPLAY_PLAY_H
#define SM_DAEMON_REPLAY_PLAY_H

/* argv: what stands behind the word play. Exit status 0 or 2. */
int sm_replay_play(int argc, char **argv);
#endif
