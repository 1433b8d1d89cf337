/* SPDX-License-Identifier: GPL-3.0-or-later */
/* port_hold.c: a port made ours alone, and the sentences that say why it could not be. */
#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/file.h>
#include <sys/ioctl.h>

#include "base/text.h"
#include "port_inside.h"

bool sm_port_is_terminal_pair(const char *device)
{
    return strncmp(device, "/dev/pts/", 9) == 0;
}

bool sm_port_is_serial(const char *device)
{
    return strncmp(device, "/dev/tty", 8) == 0 && device[8] != '\0';
}

enum sm_status sm_port_say(struct sm_link *link, enum sm_link_state state, enum sm_status s,
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

static enum sm_status say_no_access(const struct sm_door *d, struct sm_link *link)
{
    char what[SM_REASON_SIZE];
    struct sm_text t;
    struct stat st;

    sm_text_init(&t, what, sizeof what);
    sm_text_add(&t, "may not be opened: add this user to the group dialout");
    if (link->device[0] != '\0' && d->stat(d, link->device, &st) == 0)
        sm_text_addf(&t, " (the device belongs to user %u and group %u, mode %04o)", st.st_uid,
                     st.st_gid, st.st_mode & 07777u);
    return sm_port_say(link, SM_LINK_REFUSED, SM_EIO, what, 0);
}

enum sm_status sm_port_say_failed(const struct sm_door *d, struct sm_link *link, int result,
                                  const char *step)
{
    switch (result) {
    case -ENOENT:
        return sm_port_say(link, SM_LINK_LOST, SM_EIO, "is not there: is the adapter plugged in?",
                           0);
    case -EACCES:
    case -EPERM:
        return say_no_access(d, link);
    case -EBUSY:
        return sm_port_say(link, SM_LINK_REFUSED, SM_EBUSY,
                           "is in use by another program: close it (a modem service may hold a new "
                           "port for some seconds)",
                           0);
    case -ENOTTY:
        return sm_port_say(link, SM_LINK_REFUSED, SM_EIO,
                           "is no serial line: check port: in the setup", 0);
    default:
        return sm_port_say(link, SM_LINK_LOST, SM_EIO, step, result);
    }
}

/* Programs that know nothing of flock leave /var/lock/LCK..ttyUSB0 with the number of their
 * process: honoured while that runs, never written. */
static enum sm_status other_lock(const struct sm_door *d, struct sm_link *link)
{
    char path[512], text[32] = "";
    const char *slash = strrchr(link->device, '/');
    struct sm_text t;
    struct stat st;
    long process;
    ssize_t n;
    int fd;

    sm_text_init(&t, path, sizeof path);
    sm_text_addf(&t, "/var/lock/LCK..%s", slash != NULL ? slash + 1 : link->device);
    fd = d->open(d, path, O_RDONLY | O_NONBLOCK, 0);
    if (fd < 0)
        return SM_OK;
    n = d->read(d, fd, text, sizeof text - 1);
    (void)d->close(d, fd);
    process = n > 0 ? strtol(text, NULL, 10) : 0;
    if (process <= 0)
        return SM_OK;
    sm_text_init(&t, path, sizeof path);
    sm_text_addf(&t, "/proc/%ld", process);
    if (d->stat(d, path, &st) < 0)
        return SM_OK; /* left behind */
    sm_text_init(&t, path, sizeof path);
    sm_text_addf(&t, "is in use by another program: close process %ld (/var/lock/LCK..%s names it)",
                 process, slash != NULL ? slash + 1 : link->device);
    return sm_port_say(link, SM_LINK_REFUSED, SM_EBUSY, path, 0);
}

enum sm_status sm_port_hold(struct sm_port *p, struct sm_link *link)
{
    const struct sm_door *d = p->door;
    int exclusive = 0, r;

    if (sm_port_is_serial(link->device)) {
        const enum sm_status s = other_lock(d, link);
        if (s != SM_OK)
            return s;
    }
    p->lock_fd = d->open(d, link->device, O_RDWR | O_NOCTTY | O_NONBLOCK, 0);
    if (p->lock_fd < 0)
        return sm_port_say_failed(d, link, p->lock_fd, "cannot be opened");
    r = d->flock(d, p->lock_fd, LOCK_EX | LOCK_NB);
    if (r == -EWOULDBLOCK || r == -EAGAIN)
        return sm_port_say_failed(d, link, -EBUSY, "");
    if (r < 0)
        return sm_port_say_failed(d, link, r, "cannot be locked");
    if (sm_port_is_terminal_pair(
            link->device)) /* its mark would outlive us: the other end keeps it alive */
        return SM_OK;
    if (d->ioctl(d, p->lock_fd, TIOCGEXCL, &exclusive) >= 0 && exclusive != 0)
        return sm_port_say_failed(d, link, -EBUSY, "");
    return SM_OK;
}
