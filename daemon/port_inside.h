/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port_inside.h: what port.c, line_settings.c and port_bytes.c share. */
#ifndef SM_DAEMON_PORT_INSIDE_H
#define SM_DAEMON_PORT_INSIDE_H
#include "port.h"

/* Where the reader is in a mark of the line discipline: FF FF is a byte FF, FF 00 x a hurt x. */
enum sm_mark_state { SM_NO_MARK, SM_MARK_FF, SM_MARK_FF_00 };

struct sm_port {
    const struct sm_door *door;
    struct sp_port *serial; /* NULL: plain */
    int fd;                 /* read and written */
    int lock_fd;            /* holds the lock; the same as fd where plain */
    enum sm_mark_state mark;
    unsigned idle_reads; /* that gave nothing although the line seemed readable */
};

/* Last step of setting up: what libserialport leaves undone (hardware flow control, parity and
 * framing errors marked, one byte wakes) or, for a plain descriptor, all of it; reads back and
 * compares. ret_link->settings tells what is, ->why what could not be had. 0, or -errno. */
int sm_line_settings(struct sm_port *p, const struct sm_port_setup *setup,
                     struct sm_link *ret_link);

/* Decodes n raw bytes behind what is in `out` already; never more than n bytes come of it. */
void sm_port_decode(struct sm_port *p, const unsigned char *raw, size_t n,
                    struct sm_port_bytes *out);
#endif
