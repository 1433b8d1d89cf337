/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port_inside.h: what port.c, port_hold.c, line_settings.c and port_bytes.c share. */
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
    bool exclusive;         /* TIOCEXCL is on */
    bool marked;            /* the line discipline marks hurt bytes; else what comes is as it is */
    enum sm_mark_state mark;
    unsigned idle_reads; /* in a row, that gave nothing although the line seemed readable */
};

/* What kind of device this is, by its (resolved) name. */
bool sm_port_is_terminal_pair(const char *device);
bool sm_port_is_serial(const char *device); /* one that libserialport can have */

/* How an attempt ended, for the link entry: "PORT WHAT (text of result)". */
enum sm_status sm_port_say(struct sm_link *link, enum sm_link_state state, enum sm_status s,
                           const char *what, int result);
/* The same for what a door gave (negative): step is said where the result alone does not tell. */
enum sm_status sm_port_say_failed(const struct sm_door *d, struct sm_link *link, int result,
                                  const char *step);

/* Opens link->device and makes it ours before anything on it is changed: p->lock_fd. */
enum sm_status sm_port_hold(struct sm_port *p, struct sm_link *link);

/* Last step of setting up: what libserialport leaves undone (hardware flow control, parity and
 * framing errors marked, one byte wakes) or, for a plain descriptor, all of it; reads back and
 * compares. ret_link->settings tells what is, ->why what could not be had. 0, or -errno. */
int sm_line_settings(struct sm_port *p, const struct sm_port_setup *setup,
                     struct sm_link *ret_link);

/* Decodes n raw bytes into `out`, behind what is there already; what comes of it is at most n bytes
 * and, where the ones before ended within a mark that turns out to be none, one more. */
void sm_port_decode(struct sm_port *p, const unsigned char *raw, size_t n,
                    struct sm_port_bytes *out);
#endif
