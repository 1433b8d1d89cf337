/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port.h: one meter's line: opened exclusively, read without waiting, written whole questions only.
 * Two kinds behind it: a serial adapter (libserialport) and a plain descriptor (pseudo-terminals,
 * gadget ports). Nothing here waits, retries or logs: the meter decides. */
#ifndef SM_DAEMON_PORT_H
#define SM_DAEMON_PORT_H
#include "core/input.h"
#include "door.h"
#include "setup/setup.h"

struct sm_port;

/* Opens the port that the setup names: resolved anew (by-id links), exclusive, set up, read back
 * and compared, flushed. known: identity of the adapter seen before on this meter ("" none):
 * another one is refused unless the setup allows it.
 * ret_link is filled whatever happens; its why is a sentence that says what to do.
 *   UP       with device, identity and settings as read back; why: what could not be set as asked,
 *            or that the adapter is another one
 *   LOST     not there, or not working now
 *   REFUSED  in use, no access, another adapter, no serial line, settings it cannot have
 * The status:
 *   SM_EBUSY   in use
 *   SM_EINVAL  another adapter, or settings that this port cannot have at all
 *   SM_EIO     not there, no access, no serial line, or a call failed
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_port_open(const struct sm_door *door,
                                          const struct sm_port_setup *setup, const char *known,
                                          struct sm_port **ret_port, struct sm_link *ret_link);
/* Gives everything back at once; NULL is fine. */
void sm_port_close(struct sm_port *p);

/* To be watched for reading (level-triggered). */
int sm_port_fd(const struct sm_port *p);

enum sm_port_got { SM_PORT_NOTHING, SM_PORT_BYTES, SM_PORT_LOST };

struct sm_port_bytes {
    unsigned char bytes[SM_BYTES_MAX];
    size_t n;
    uint16_t bad[SM_BYTES_MAX]; /* offsets, rising, of bytes with a parity or framing error; a break
                                 * is a 0 byte listed here */
    size_t n_bad;
};

/* One read. BYTES: what came, with the line discipline's marks decoded (a mark cut by the end of
 * one read is finished by the next). NOTHING: idle. LOST: gone, ret_why says how; bytes that still
 * came before are given first, by a call of their own. */
enum sm_port_got sm_port_read(struct sm_port *p, struct sm_port_bytes *ret_bytes,
                              char ret_why[SM_LINK_TEXT_SIZE]);

/* The whole question at once, without waiting.
 *   SM_EIO  it did not go whole: the port is lost: ret_why */
SM_MUST_CHECK enum sm_status sm_port_write(struct sm_port *p, const char *bytes, size_t n,
                                           char ret_why[SM_LINK_TEXT_SIZE]);
#endif
