/* SPDX-License-Identifier: GPL-3.0-or-later */
/* line_settings.c: termios and modem lines set, read back and compared. */
#include <errno.h>
#include <string.h>
#include <sys/ioctl.h>
#include <termios.h>

#include "base/text.h"
#include "port_inside.h"

/* A rate further off than this is another rate: receivers sample in mid-bit and live with some 2 to
 * 3 % over a frame (common practice). */
#define BAUD_OFF_SHARE 0.03

/* Linux's own termios (asm-generic/termbits.h), which tells any rate in bits per second; the C
 * library has no declaration that can stand beside its own. Kernels without it refuse the call. */
struct kernel_termios {
    tcflag_t iflag, oflag, cflag, lflag;
    cc_t line, cc[19];
    speed_t ispeed, ospeed;
};
#define GET_KERNEL_TERMIOS _IOR('T', 0x2a, struct kernel_termios)

static const struct {
    unsigned baud;
    speed_t speed;
} speeds[] = {
    { 50, B50 },         { 75, B75 },         { 110, B110 },         { 134, B134 },
    { 150, B150 },       { 200, B200 },       { 300, B300 },         { 600, B600 },
    { 1200, B1200 },     { 1800, B1800 },     { 2400, B2400 },       { 4800, B4800 },
    { 9600, B9600 },     { 19200, B19200 },   { 38400, B38400 },     { 57600, B57600 },
    { 115200, B115200 }, { 230400, B230400 }, { 460800, B460800 },   { 500000, B500000 },
    { 576000, B576000 }, { 921600, B921600 }, { 1000000, B1000000 },
};
#define SPEEDS (sizeof speeds / sizeof speeds[0])

static tcflag_t bits_of(unsigned bits)
{
    return bits == 5 ? CS5 : bits == 6 ? CS6 : bits == 7 ? CS7 : CS8;
}

static tcflag_t parity_of(enum sm_parity p)
{
    static const tcflag_t flags[] = { [SM_PARITY_NONE] = 0,
                                      [SM_PARITY_EVEN] = PARENB,
                                      [SM_PARITY_ODD] = PARENB | PARODD,
                                      [SM_PARITY_MARK] = PARENB | CMSPAR | PARODD,
                                      [SM_PARITY_SPACE] = PARENB | CMSPAR };

    return flags[p];
}
#define PARITY_FLAGS ((tcflag_t)(PARENB | PARODD | CMSPAR))

/* Nothing is left of what was there before but HUPCL, which is the machine's business, and the rate
 * where libserialport has set it: it knows odd ones. */
static void wanted(struct termios *t, const struct sm_port_setup *s, bool has_rate)
{
    t->c_iflag = INPCK | PARMRK;
    if (s->flow == SM_FLOW_XON_XOFF)
        t->c_iflag |= IXON | IXOFF;
    t->c_oflag = 0;
    t->c_lflag = 0;
    t->c_cflag &= ~(tcflag_t)(CSIZE | CSTOPB | CRTSCTS | PARITY_FLAGS);
    t->c_cflag |= CREAD | CLOCAL | bits_of(s->bits) | parity_of(s->parity);
    if (s->stop == 2)
        t->c_cflag |= CSTOPB;
    if (s->flow == SM_FLOW_RTS_CTS)
        t->c_cflag |= CRTSCTS;
    t->c_cc[VMIN] = 1;
    t->c_cc[VTIME] = 0;
    for (size_t i = 0; i < SPEEDS && !has_rate; i++) {
        if (speeds[i].baud != s->baud)
            continue;
        cfsetispeed(t, speeds[i].speed);
        cfsetospeed(t, speeds[i].speed);
    }
}

/* The rate in force; 0: not known. */
static unsigned baud_of(const struct sm_port *p, const struct termios *t)
{
    struct kernel_termios k;

    memset(&k, 0, sizeof k);
    if (p->door->ioctl(p->door, p->fd, GET_KERNEL_TERMIOS, &k) >= 0 && k.ospeed != 0)
        return k.ospeed;
    for (size_t i = 0; i < SPEEDS; i++)
        if (speeds[i].speed == cfgetospeed(t))
            return speeds[i].baud;
    return 0;
}

/* RTS and DTR of a port that libserialport does not set; those in force where it has such lines. */
static bool modem_lines(const struct sm_port *p, const struct sm_port_setup *s, int *ret_lines)
{
    const struct sm_door *d = p->door;
    int on = s->dtr ? TIOCM_DTR : 0, off = s->dtr ? 0 : TIOCM_DTR;

    if (p->serial == NULL) {
        if (s->flow != SM_FLOW_RTS_CTS) /* the driver's own then */
            *(s->rts ? &on : &off) |= TIOCM_RTS;
        (void)d->ioctl(d, p->fd, TIOCMBIS, &on); /* what came of it is read back */
        (void)d->ioctl(d, p->fd, TIOCMBIC, &off);
    }
    return d->ioctl(d, p->fd, TIOCMGET, ret_lines) >= 0;
}

static void mismatch(struct sm_text *why, const char *what)
{
    sm_text_addf(why, "%s%s", why->len == 0 ? "the port does not take: " : ", ", what);
}

static void compare(const struct termios *t, unsigned baud, const struct sm_port_setup *s,
                    struct sm_text *why)
{
    const double off = (double)baud - (double)s->baud;

    if (off > BAUD_OFF_SHARE * s->baud || off < -BAUD_OFF_SHARE * s->baud)
        mismatch(why, "baud");
    if ((t->c_cflag & CSIZE) != bits_of(s->bits))
        mismatch(why, "bits");
    if ((t->c_cflag & PARITY_FLAGS) != parity_of(s->parity))
        mismatch(why, "parity");
    if (((t->c_cflag & CSTOPB) != 0) != (s->stop == 2))
        mismatch(why, "stop bits");
    if (((t->c_cflag & CRTSCTS) != 0) != (s->flow == SM_FLOW_RTS_CTS) ||
        ((t->c_iflag & (tcflag_t)(IXON | IXOFF | IXANY)) !=
         (s->flow == SM_FLOW_XON_XOFF ? IXON | IXOFF : 0u)))
        mismatch(why, "flow control");
    if ((t->c_iflag & PARMRK) == 0 || (t->c_iflag & INPCK) == 0)
        mismatch(why, "marking of hurt bytes");
}

static void compare_lines(int lines, const struct sm_port_setup *s, struct sm_text *why)
{
    if (((lines & TIOCM_DTR) != 0) != s->dtr)
        mismatch(why, "DTR");
    if (s->flow != SM_FLOW_RTS_CTS && ((lines & TIOCM_RTS) != 0) != s->rts)
        mismatch(why, "RTS");
}

/* In the trade's short form, "9600 8N1". */
static void describe(const struct termios *t, unsigned baud, struct sm_text *out)
{
    const tcflag_t size = t->c_cflag & CSIZE, parity = t->c_cflag & PARITY_FLAGS;
    char letter = '?';

    for (int p = SM_PARITY_NONE; p <= SM_PARITY_SPACE; p++)
        if (parity == parity_of((enum sm_parity)p))
            letter = "NEOMS"[p];
    if (baud != 0)
        sm_text_addf(out, "%u ", baud);
    else
        sm_text_add(out, "unknown rate, ");
    sm_text_addf(out, "%d%c%d, ",
                 size == CS5   ? 5
                 : size == CS6 ? 6
                 : size == CS7 ? 7
                               : 8,
                 letter, (t->c_cflag & CSTOPB) != 0 ? 2 : 1);
    if ((t->c_cflag & CRTSCTS) != 0)
        sm_text_add(out, "RTS/CTS");
    else
        sm_text_add(out,
                    (t->c_iflag & (tcflag_t)(IXON | IXOFF)) != 0 ? "XON/XOFF" : "no flow control");
}

int sm_line_settings(struct sm_port *p, const struct sm_port_setup *setup, struct sm_link *ret_link)
{
    struct termios t;
    struct sm_text settings, why;
    unsigned baud;
    int lines = 0, r = p->door->tcgetattr(p->door, p->fd, &t);

    if (r < 0)
        return r;
    wanted(&t, setup, p->serial != NULL);
    r = p->door->tcsetattr(p->door, p->fd, &t);
    if (r < 0 && r != -EINVAL) /* EINVAL: a part of it was not taken; which, is read back */
        return r;
    r = p->door->tcgetattr(p->door, p->fd, &t);
    if (r < 0)
        return r;
    p->marked = (t.c_iflag & PARMRK) != 0;
    baud = baud_of(p, &t);
    sm_text_init(&settings, ret_link->settings, sizeof ret_link->settings);
    describe(&t, baud, &settings);
    sm_text_init(&why, ret_link->why, sizeof ret_link->why);
    compare(&t, baud, setup, &why);
    if (modem_lines(p, setup, &lines)) {
        sm_text_addf(&settings, ", DTR %s, RTS %s", (lines & TIOCM_DTR) != 0 ? "on" : "off",
                     (lines & TIOCM_RTS) != 0 ? "on" : "off");
        compare_lines(lines, setup, &why);
    }
    if (why.len > 0)
        sm_text_addf(&settings, "; %s", ret_link->why);
    return 0;
}
