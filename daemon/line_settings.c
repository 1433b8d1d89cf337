/* SPDX-License-Identifier: GPL-3.0-or-later */
/* line_settings.c: termios set, read back and compared. */
#include <string.h>
#include <termios.h>

#include "base/text.h"
#include "port_inside.h"

static const struct {
    unsigned baud;
    speed_t speed;
} speeds[] = {
    { 300, B300 },     { 600, B600 },       { 1200, B1200 },     { 2400, B2400 },
    { 4800, B4800 },   { 9600, B9600 },     { 19200, B19200 },   { 38400, B38400 },
    { 57600, B57600 }, { 115200, B115200 }, { 230400, B230400 }, { 460800, B460800 },
};

/* Its termios constant; false: an odd rate, which only libserialport can set. */
static bool speed_of(unsigned baud, speed_t *ret_speed)
{
    for (size_t i = 0; i < sizeof speeds / sizeof speeds[0]; i++) {
        if (speeds[i].baud == baud) {
            *ret_speed = speeds[i].speed;
            return true;
        }
    }
    return false;
}

static tcflag_t bits_of(unsigned bits)
{
    return bits == 5 ? CS5 : bits == 6 ? CS6 : bits == 7 ? CS7 : CS8;
}

/* What a plain descriptor needs and libserialport does for its own ports. */
static void plain(struct termios *t, const struct sm_port_setup *s)
{
    speed_t speed;

    t->c_iflag = 0;
    t->c_oflag = 0;
    t->c_lflag = 0;
    t->c_cflag = CREAD | CLOCAL | HUPCL | bits_of(s->bits);
    if (s->parity == SM_PARITY_EVEN || s->parity == SM_PARITY_ODD)
        t->c_cflag |= PARENB | (s->parity == SM_PARITY_ODD ? PARODD : 0u);
    if (s->stop == 2)
        t->c_cflag |= CSTOPB;
    if (speed_of(s->baud, &speed)) {
        cfsetispeed(t, speed);
        cfsetospeed(t, speed);
    }
}

static void wanted(struct termios *t, const struct sm_port_setup *s)
{
    t->c_iflag &= ~(tcflag_t)(IGNPAR | ISTRIP | IXON | IXOFF | IXANY);
    t->c_iflag |= INPCK | PARMRK;
    if (s->flow == SM_FLOW_XON_XOFF)
        t->c_iflag |= IXON | IXOFF;
    t->c_cflag &= ~(tcflag_t)CRTSCTS;
    if (s->flow == SM_FLOW_RTS_CTS)
        t->c_cflag |= CRTSCTS;
    t->c_cc[VMIN] = 1;
    t->c_cc[VTIME] = 0;
}

static void mismatch(struct sm_text *why, const char *what)
{
    sm_text_addf(why, "%s%s", why->len == 0 ? "the port does not take: " : ", ", what);
}

static void compare(const struct termios *t, const struct sm_port_setup *s, struct sm_text *why)
{
    const tcflag_t parity = s->parity == SM_PARITY_NONE ? 0
                            : s->parity == SM_PARITY_ODD || s->parity == SM_PARITY_MARK
                                ? PARENB | PARODD
                                : PARENB;
    speed_t speed;

    if (speed_of(s->baud, &speed) && cfgetispeed(t) != speed)
        mismatch(why, "baud");
    if ((t->c_cflag & CSIZE) != bits_of(s->bits))
        mismatch(why, "bits");
    if ((t->c_cflag & (tcflag_t)(PARENB | PARODD)) != parity)
        mismatch(why, "parity");
    if (((t->c_cflag & CSTOPB) != 0) != (s->stop == 2))
        mismatch(why, "stop bits");
    if (((t->c_cflag & CRTSCTS) != 0) != (s->flow == SM_FLOW_RTS_CTS) ||
        ((t->c_iflag & IXON) != 0) != (s->flow == SM_FLOW_XON_XOFF))
        mismatch(why, "flow control");
    if ((t->c_iflag & PARMRK) == 0)
        mismatch(why, "marking of hurt bytes");
}

static void describe(const struct sm_port_setup *s, struct sm_text *t)
{
    static const char letters[] = "NEOMS";
    static const char *const flows[] = { "no flow control", "RTS/CTS", "XON/XOFF" };

    sm_text_addf(t, "%u %u%c%u, %s, DTR %s, RTS %s", s->baud, s->bits, letters[s->parity], s->stop,
                 flows[s->flow], s->dtr ? "on" : "off", s->rts ? "on" : "off");
}

int sm_line_settings(struct sm_port *p, const struct sm_port_setup *setup, struct sm_link *ret_link)
{
    struct termios t;
    struct sm_text settings, why;
    int r = p->door->tcgetattr(p->door, p->fd, &t);

    if (r < 0)
        return r;
    if (p->serial == NULL)
        plain(&t, setup);
    wanted(&t, setup);
    r = p->door->tcsetattr(p->door, p->fd, &t);
    if (r < 0)
        return r;
    r = p->door->tcgetattr(p->door, p->fd, &t);
    if (r < 0)
        return r;
    sm_text_init(&settings, ret_link->settings, sizeof ret_link->settings);
    describe(setup, &settings);
    sm_text_init(&why, ret_link->why, sizeof ret_link->why);
    compare(&t, setup, &why);
    if (why.len > 0)
        sm_text_addf(&settings, "; %s", ret_link->why);
    return 0;
}
