/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pty.c: see pty.h. */
#include "sim/pty.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <termios.h>
#include <unistd.h>

/* Raw, and once opened and closed: only then does the meter's end see "hung up" while nobody is
 * there. */
static bool prepare(const struct sm_sim_pty *p)
{
    struct termios how;
    const int fd = open(p->path, O_RDWR | O_NOCTTY | O_CLOEXEC);

    if (fd < 0)
        return false;
    bool done = tcgetattr(fd, &how) == 0;
    if (done) {
        cfmakeraw(&how);
        done = tcsetattr(fd, TCSANOW, &how) == 0;
    }
    close(fd);
    return done;
}

enum sm_status sm_sim_pty_open(struct sm_sim_pty *ret_pty)
{
    struct sm_sim_pty p = { -1, "" };

    p.fd = posix_openpt(O_RDWR | O_NOCTTY | O_NONBLOCK | O_CLOEXEC);
    if (p.fd < 0)
        return SM_EIO;
    if (grantpt(p.fd) != 0 || unlockpt(p.fd) != 0 || ptsname_r(p.fd, p.path, sizeof p.path) != 0 ||
        !prepare(&p)) {
        const int why = errno;
        close(p.fd);
        errno = why;
        return SM_EIO;
    }
    *ret_pty = p;
    return SM_OK;
}

void sm_sim_pty_close(struct sm_sim_pty *p)
{
    if (p->fd >= 0)
        close(p->fd);
    p->fd = -1;
}

bool sm_sim_pty_heard(const struct sm_sim_pty *p)
{
    struct pollfd f = { p->fd, POLLOUT, 0 };

    return p->fd >= 0 && poll(&f, 1, 0) >= 0 && !(f.revents & (POLLHUP | POLLERR));
}

void sm_sim_pty_send(const struct sm_sim_pty *p, const char *bytes, size_t n)
{
    if (!sm_sim_pty_heard(p))
        return;
    while (n > 0) {
        const ssize_t done = write(p->fd, bytes, n);
        if (done <= 0)
            return;
        bytes += done;
        n -= (size_t)done;
    }
}

size_t sm_sim_pty_receive(const struct sm_sim_pty *p, char *buf, size_t cap)
{
    const ssize_t n = p->fd < 0 ? -1 : read(p->fd, buf, cap);

    return n > 0 ? (size_t)n : 0;
}

enum sm_status sm_sim_pty_link(const struct sm_sim_pty *p, const char *link)
{
    char fresh[4096];
    struct stat there;

    if (lstat(link, &there) == 0 && !S_ISLNK(there.st_mode)) {
        errno = EEXIST;
        return SM_EIO;
    }
    const int n = snprintf(fresh, sizeof fresh, "%s.%ld", link, (long)getpid());
    if (n < 0 || (size_t)n >= sizeof fresh) {
        errno = ENAMETOOLONG;
        return SM_EIO;
    }
    unlink(fresh);
    if (symlink(p->path, fresh) != 0)
        return SM_EIO;
    if (rename(fresh, link) != 0) {
        const int why = errno;
        unlink(fresh);
        errno = why;
        return SM_EIO;
    }
    return SM_OK;
}

void sm_sim_pty_unlink(const struct sm_sim_pty *p, const char *link)
{
    char to[SM_SIM_PTY_PATH];
    const ssize_t n = readlink(link, to, sizeof to);

    if (n > 0 && (size_t)n == strlen(p->path) && memcmp(to, p->path, (size_t)n) == 0)
        unlink(link);
}
