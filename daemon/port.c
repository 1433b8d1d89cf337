/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port.c: a meter's port opened: resolved, held alone, known again, set up, compared, flushed. */
#include "port.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>

#include "base/text.h"
#include "port_inside.h"

/* The same adapter as before? A text that names it; "" where nothing is known. */
static enum sm_status identify(struct sm_port *p, const struct sm_port_setup *setup,
                               const char *known, struct sm_link *link)
{
    const struct sm_door *d = p->door;
    struct sm_text t;

    if (sm_port_is_terminal_pair(link->device))
        sm_text_copy(link->identity, sizeof link->identity, "pseudo-terminal");
    else if (d->serial_identity(d, link->device, link->identity, sizeof link->identity) < 0)
        link->identity[0] = '\0';
    if (known[0] == '\0' || strcmp(known, link->identity) == 0 || setup->other_adapter)
        return SM_OK;
    link->state = SM_LINK_REFUSED;
    sm_text_init(&t, link->why, sizeof link->why);
    sm_text_addf(&t,
                 "%.200s is another adapter now (%.100s, before %.100s): plug the old one back, or "
                 "set other-adapter: allow",
                 link->port, link->identity[0] != '\0' ? link->identity : "not known", known);
    return SM_EINVAL;
}

/* Allowed by the setup, and said all the same. */
static void say_other_adapter(const char *known, struct sm_link *link)
{
    char why[SM_LINK_TEXT_SIZE];
    struct sm_text t;

    if (known[0] == '\0' || strcmp(known, link->identity) == 0)
        return;
    sm_text_init(&t, why, sizeof why);
    sm_text_addf(&t, "another adapter than before (%.100s), which the setup allows%s%s", known,
                 link->why[0] != '\0' ? "; " : "", link->why);
    sm_text_copy(link->why, sizeof link->why, why);
}

/* libserialport, where it can have this port; else a plain descriptor. */
static enum sm_status set_serial(struct sm_port *p, const struct sm_port_setup *setup,
                                 struct sm_link *link)
{
    const struct sm_door *d = p->door;
    int r = d->serial_open(d, link->device, &p->serial, &p->fd);

    if (r == -ENOTTY || r == -EINVAL) { /* a gadget port, say */
        p->serial = NULL;
        p->fd = p->lock_fd;
        return SM_OK;
    }
    if (r < 0) {
        p->serial = NULL;
        return sm_port_say_failed(d, link, r, "cannot be opened");
    }
    r = d->serial_setup(d, p->serial, setup);
    if (r == -EINVAL || r == -EOPNOTSUPP)
        return sm_port_say(link, SM_LINK_REFUSED, SM_EINVAL,
                           "cannot have the settings of the setup: check baud, bits, parity, stop, "
                           "flow, dtr and rts",
                           r);
    return r < 0 ? sm_port_say_failed(d, link, r, "does not take its settings") : SM_OK;
}

static enum sm_status set_up(struct sm_port *p, const struct sm_port_setup *setup,
                             struct sm_link *link)
{
    const struct sm_door *d = p->door;
    int r;

    p->fd = p->lock_fd;
    if (sm_port_is_serial(link->device)) {
        const enum sm_status s = set_serial(p, setup, link);
        if (s != SM_OK)
            return s;
    }
    if (!sm_port_is_terminal_pair(link->device))
        p->exclusive = d->ioctl(d, p->fd, TIOCEXCL, NULL) >= 0; /* else the lock alone holds it */
    r = sm_line_settings(p, setup, link);
    if (r < 0)
        return sm_port_say_failed(d, link, r, "does not take its settings");
    r = d->tcflush(d, p->fd);
    if (r < 0)
        return sm_port_say_failed(d, link, r, "cannot be flushed");
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
        return sm_port_say(ret_link, SM_LINK_LOST, SM_ENOMEM, "no memory", 0);
    p->door = door;
    p->fd = p->lock_fd = -1;
    r = door->realpath(door, setup->port, ret_link->device, sizeof ret_link->device);
    s = r < 0 ? sm_port_say_failed(door, ret_link, r, "cannot be found")
              : sm_port_hold(p, ret_link);
    if (s == SM_OK)
        s = identify(p, setup, known, ret_link);
    if (s == SM_OK)
        s = set_up(p, setup, ret_link);
    if (s != SM_OK) {
        sm_port_close(p);
        return s;
    }
    say_other_adapter(known, ret_link);
    ret_link->state = SM_LINK_UP;
    *ret_port = p;
    return SM_OK;
}

void sm_port_close(struct sm_port *p)
{
    if (p == NULL)
        return;
    if (p->exclusive) /* would stay while anybody else has it open */
        (void)p->door->ioctl(p->door, p->fd, TIOCNXCL, NULL);
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
