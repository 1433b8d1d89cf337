/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port_bytes.c: bytes off the line, with the line discipline's marks decoded, and questions on it.
 */
#include <errno.h>
#include <poll.h>
#include <string.h>

#include "base/text.h"
#include "port_inside.h"

#define IDLE_READS_MAX 100 /* in a row on a line that says it is readable: it is gone */

static void add(struct sm_port_bytes *out, unsigned char byte, bool bad)
{
    if (bad)
        out->bad[out->n_bad++] = (uint16_t)out->n;
    out->bytes[out->n++] = byte;
}

void sm_port_decode(struct sm_port *p, const unsigned char *raw, size_t n,
                    struct sm_port_bytes *out)
{
    for (size_t i = 0; i < n; i++) {
        const unsigned char b = raw[i];

        if (!p->marked) {
            add(out, b, false);
            continue;
        }
        switch (p->mark) {
        case SM_NO_MARK:
            if (b == 0xff)
                p->mark = SM_MARK_FF;
            else
                add(out, b, false);
            break;
        case SM_MARK_FF:
            p->mark = b == 0 ? SM_MARK_FF_00 : SM_NO_MARK;
            if (b != 0)
                add(out, 0xff, false);
            if (b != 0 && b != 0xff) /* no mark after all: nothing that came is left out */
                add(out, b, false);
            break;
        case SM_MARK_FF_00:
            p->mark = SM_NO_MARK;
            add(out, b, true);
            break;
        }
    }
}

static enum sm_port_got lost(char ret_why[SM_LINK_TEXT_SIZE], const char *why)
{
    sm_text_copy(ret_why, SM_LINK_TEXT_SIZE, why);
    return SM_PORT_LOST;
}

/* A read that gave no bytes: idle, or is the adapter gone? */
static enum sm_port_got nothing(struct sm_port *p, char ret_why[SM_LINK_TEXT_SIZE])
{
    short seen = 0;
    const int r = p->door->poll(p->door, p->fd, POLLIN, &seen);

    if (r < 0)
        return lost(ret_why, "the line could not be looked at: the adapter is gone");
    if ((seen & (POLLHUP | POLLERR | POLLNVAL)) != 0)
        return lost(ret_why, "the adapter was unplugged or the line hung up");
    p->idle_reads = (seen & POLLIN) != 0 ? p->idle_reads + 1 : 0;
    if (p->idle_reads >= IDLE_READS_MAX)
        return lost(ret_why, "the line gives end of file again and again: the adapter is gone");
    return SM_PORT_NOTHING;
}

enum sm_port_got sm_port_read(struct sm_port *p, struct sm_port_bytes *ret_bytes,
                              char ret_why[SM_LINK_TEXT_SIZE])
{
    unsigned char raw[SM_BYTES_MAX - 1]; /* decoding may make one more of it */
    const ssize_t n = p->door->read(p->door, p->fd, raw, sizeof raw);
    struct sm_text why;

    if (n == -EAGAIN || n == -EWOULDBLOCK || n == 0)
        return nothing(p, ret_why);
    if (n == -EIO || n == -ENXIO || n == -ENODEV)
        return lost(ret_why, "the adapter was unplugged or the line hung up");
    if (n < 0) {
        sm_text_init(&why, ret_why, SM_LINK_TEXT_SIZE);
        sm_text_addf(&why, "reading failed: %s", sm_door_text((int)n));
        return SM_PORT_LOST;
    }
    p->idle_reads = 0;
    ret_bytes->n = ret_bytes->n_bad = 0;
    sm_port_decode(p, raw, (size_t)n, ret_bytes);
    return ret_bytes->n > 0 ? SM_PORT_BYTES : SM_PORT_NOTHING;
}

enum sm_status sm_port_write(struct sm_port *p, const char *bytes, size_t n,
                             char ret_why[SM_LINK_TEXT_SIZE])
{
    const ssize_t w = p->door->write(p->door, p->fd, bytes, n);
    struct sm_text why;

    if (w == (ssize_t)n)
        return SM_OK;
    sm_text_init(&why, ret_why, SM_LINK_TEXT_SIZE);
    if (w >= 0 || w == -EAGAIN)
        sm_text_add(&why, "the line does not take the question: check flow control and cable");
    else
        sm_text_addf(&why, "the question could not be sent: %s", sm_door_text((int)w));
    return SM_EIO;
}
