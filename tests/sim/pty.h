/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pty.h: a pseudo-terminal that stands for a meter's serial line, and the symbolic link by which it
 * is found. Bytes sent while nobody has it open are lost, as on a real line. */
#ifndef SM_SIM_PTY_H
#define SM_SIM_PTY_H
#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"

#define SM_SIM_PTY_PATH 64

struct sm_sim_pty {
    int fd;                     /* the meter's end, non-blocking; -1: closed */
    char path[SM_SIM_PTY_PATH]; /* the other end */
};

/* A new one, raw (no echo). SM_EIO: errno says why. */
SM_MUST_CHECK enum sm_status sm_sim_pty_open(struct sm_sim_pty *ret_pty);
void sm_sim_pty_close(struct sm_sim_pty *p); /* whoever has the other end open sees it hang up */

bool sm_sim_pty_heard(const struct sm_sim_pty *p); /* somebody has the other end open */

/* Sends what can be sent now; the rest is lost. */
void sm_sim_pty_send(const struct sm_sim_pty *p, const char *bytes, size_t n);
/* What was sent to the meter, up to cap bytes; 0: nothing now. */
size_t sm_sim_pty_receive(const struct sm_sim_pty *p, char *buf, size_t cap);

/* Makes link point to the other end, in one move; refuses to replace anything but a link.
 *   SM_EIO  errno says why */
SM_MUST_CHECK enum sm_status sm_sim_pty_link(const struct sm_sim_pty *p, const char *link);
/* Takes link away if it still points to this one. */
void sm_sim_pty_unlink(const struct sm_sim_pty *p, const char *link);
#endif
