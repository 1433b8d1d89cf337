/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_watch.h: `stillmark watch`: a line for everything worth saying, as it happens. */
#ifndef SM_DAEMON_STILLMARK_WATCH_H
#define SM_DAEMON_STILLMARK_WATCH_H

/* argv[argc] are the words after "watch". Ends when the daemon does, or is interrupted. Returns the
 * exit status, which is 2. */
int sm_stillmark_watch(int argc, char **argv);
#endif
