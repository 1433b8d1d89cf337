/* SPDX-License-Identifier: GPL-3.0-or-later */
/* say.h: the daemon's own lines, plain sentences on standard error (the unit's journal). */
#ifndef SM_DAEMON_SAY_H
#define SM_DAEMON_SAY_H

/* "bench-2: the port is back" with a newline; about NULL: without the name. Control characters are
 * shown as \xNN. */
__attribute__((format(printf, 2, 3))) void sm_say(const char *about, const char *fmt, ...);
#endif
