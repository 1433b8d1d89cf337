/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port.c: a meter's port opened: resolved, held alone, set up, compared, flushed. */
#include "port.h"

#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/file.h>
#include <sys/ioctl.h>

#include "base/text.h"
#include "port_inside.h"

/* How an attempt ended, for the link entry. */
static enum sm_status say(struct sm_link *link, enum sm_link_state state, enum sm_status s,
                          const char *what, int result)
{
    struct sm_text t;

    sm_text_init(&t, link->why, sizeof link->why);
    sm_text_addf(&t, "%s %s", link->port, what);
    if (result < 0)
        sm_text_addf(&t, " (%s)", sm_door_text(result));
    link->state = state;
    return s;
}

static enum sm_status say_failed(struct sm_link *link, int result, const char *step)
{
    switch (result) {
    case -ENOENT:
        return say(link, SM_LINK_LOST, SM_EIO, "is not there: is the adapter plugged in?", 0);
    case -EACCES:
    case -EPERM:
        return say(link, SM_LINK_REFUSED, SM_EIO,
                   "may not be opened: add this user to the group dialout", result);
    case -EBUSY:
        return say(link, SM_LINK_REFUSED, SM_EBUSY,
                   "is in use by another program: close it (a modem service may hold a new port "
                   "for some seconds)",
                   0);
    default:
        return say(link, SM_LINK_LOST, SM_EIO, step, result);
    }
}

static bool is_terminal_pair(const char *device)
{
    return strncmp(device, "/dev/pts/", 9) == 0;
}

/* Is a port that libserialport knows how to set. */
static bool is_serial(const char *device)
{
    return strncmp(device, "/dev/tty", 8) == 0 && device[8] != '\0';
}

/* Nobody else's, before anything on it is changed. */
static enum sm_status hold(struct sm_port *p, struct sm_link *link)
{
    const struct sm_door *d = p->door;
    int exclusive = 0, r;

    p->lock_fd = d->open(d, link->device, O_RDWR | O_NOCTTY | O_NONBLOCK, 0);
    if (p->lock_fd < 0)
        return say_failed(link, p->lock_fd, "cannot be opened");
    r = d->flock(d, p->lock_fd, LOCK_EX | LOCK_NB);
    if (r == -EWOULDBLOCK || r == -EAGAIN)
        return say_failed(link, -EBUSY, "");
    if (r < 0)
        return say_failed(link, r, "cannot be locked");
    if (is_terminal_pair(
            link->device)) /* its mark would outlive us: the other end keeps it alive */
        return SM_OK;
    if (d->ioctl(d, p->lock_fd, TIOCGEXCL, &exclusive) >= 0 && exclusive != 0)
        return say_failed(link, -EBUSY, "");
    return SM_OK;
}

/* The same adapter as before? A text that names it; "" where nothing is known. */
static enum sm_status identify(struct sm_port *p, const struct sm_port_setup *setup,
                               const char *known, struct sm_link *link)
{
    const struct sm_door *d = p->door;

    if (is_terminal_pair(link->device))
        sm_text_copy(link->identity, sizeof link->identity, "pseudo-terminal");
    else if (d->serial_identity(d, link->device, link->identity, sizeof link->identity) < 0)
        link->identity[0] = '\0';
    if (known[0] != '\0' && strcmp(known, link->identity) != 0 && !setup->other_adapter) {
        struct sm_text t;

        link->state = SM_LINK_REFUSED;
        sm_text_init(&t, link->why, sizeof link->why);
        sm_text_addf(
            &t,
            "%.200s is another adapter now (%.100s, before %.100s): plug the old one back, "
            "or set other-adapter: allow",
            link->port, link->identity[0] != '\0' ? link->identity : "not known", known);
        return SM_EINVAL;
    }
    return SM_OK;
}

static enum sm_status set_up(struct sm_port *p, const struct sm_port_setup *setup,
                             struct sm_link *link)
{
    const struct sm_door *d = p->door;
    int r;

    p->fd = p->lock_fd;
    if (is_serial(link->device)) {
        r = d->serial_open(d, link->device, &p->serial, &p->fd);
        if (r == -ENOTTY || r == -EINVAL) { /* a gadget port: a plain descriptor serves */
            p->serial = NULL;
            p->fd = p->lock_fd;
        } else if (r < 0) {
            p->serial = NULL;
            return say_failed(link, r, "cannot be opened");
        } else {
            r = d->serial_setup(d, p->serial, setup);
            if (r < 0)
                return say_failed(link, r, "does not take its settings");
        }
    }
    if (!is_terminal_pair(link->device))
        (void)d->ioctl(d, p->fd, TIOCEXCL, NULL); /* the lock holds where this is not known */
    r = sm_line_settings(p, setup, link);
    if (r < 0)
        return say_failed(link, r, "does not take its settings");
    r = d->tcflush(d, p->fd);
    if (r < 0)
        return say_failed(link, r, "cannot be flushed");
    return SM_OK;
}

enum sm_status sm_port_open(const struct sm_door *door, const struct sm_port_setup *setup,
                            const char *known, struct sm_port **ret_port, struct sm_link *ret_link)
{
    struct sm_port *p = calloc(1, sizeof *p);
    enum sm_status s;
    int r;

    memset(ret_link, 0, sizeof *ret_link);
    sm_text_copy(ret_link->port, sizeof ret_link->port, setup->port);
    if (p == NULL)
        return say(ret_link, SM_LINK_LOST, SM_ENOMEM, "no memory", 0);
    p->door = door;
    p->fd = p->lock_fd = -1;
    r = door->realpath(door, setup->port, ret_link->device, sizeof ret_link->device);
    s = r < 0 ? say_failed(ret_link, r, "cannot be found") : hold(p, ret_link);
    if (s == SM_OK)
        s = identify(p, setup, known, ret_link);
    if (s == SM_OK)
        s = set_up(p, setup, ret_link);
    if (s != SM_OK) {
        sm_port_close(p);
        return s;
    }
    ret_link->state = SM_LINK_UP;
    *ret_port = p;
    return SM_OK;
}

void sm_port_close(struct sm_port *p)
{
    if (p == NULL)
        return;
    if (p->serial != NULL)
        (void)p->door->serial_close(p->door, p->serial);
    if (p->lock_fd >= 0)
        (void)p->door->close(p->door, p->lock_fd);
    free(p);
}

int sm_port_fd(const struct sm_port *p)
{
    return p->fd;
}
