/* SPDX-License-Identifier: GPL-3.0-or-later */
/* notify.c: one datagram per message; what does not arrive is no failure of ours. */
#include "notify.h"

#include <stddef.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/un.h>
#include <unistd.h>

#include "base/number.h"

static int connect_to(const char *path)
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    const size_t n = strlen(path);
    int fd;

    if ((path[0] != '/' && path[0] != '@') || n < 2 || n >= sizeof a.sun_path)
        return -1;
    memcpy(a.sun_path, path, n);
    if (path[0] == '@')
        a.sun_path[0] = '\0';
    fd = socket(AF_UNIX, SOCK_DGRAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);
    if (fd >= 0 && connect(fd, (const struct sockaddr *)&a,
                           (socklen_t)(offsetof(struct sockaddr_un, sun_path) + n)) < 0) {
        close(fd);
        fd = -1;
    }
    return fd;
}

static int64_t watchdog_ns(void)
{
    const char *us = getenv("WATCHDOG_USEC"), *pid = getenv("WATCHDOG_PID");
    int64_t v;

    if (us == NULL || sm_integer_parse(us, strlen(us), &v) != SM_OK || v <= 0 ||
        v > INT64_MAX / 1000)
        return 0;
    const int64_t ns = v * 1000;
    if (pid != NULL && (sm_integer_parse(pid, strlen(pid), &v) != SM_OK || v != getpid()))
        return 0;
    return ns;
}

void sm_notify_init(struct sm_notify *n)
{
    const char *path = getenv("NOTIFY_SOCKET");

    *n = (struct sm_notify){ .fd = path != NULL ? connect_to(path) : -1 };
    if (n->fd >= 0)
        n->watchdog_ns = watchdog_ns();
}

void sm_notify_finish(struct sm_notify *n)
{
    if (n->fd >= 0)
        close(n->fd);
    n->fd = -1;
}

static void tell(struct sm_notify *n, const char *text)
{
    if (n->fd >= 0 && send(n->fd, text, strlen(text), MSG_NOSIGNAL) < 0)
        return;
}

/* A status is one line. */
static void tell_with_status(struct sm_notify *n, const char *first, const char *status)
{
    char text[512];

    snprintf(text, sizeof text, "%sSTATUS=%.400s", first, status);
    for (char *c = strstr(text, "STATUS="); *c != '\0'; c++)
        if (*c == '\n')
            *c = ' ';
    tell(n, text);
}

void sm_notify_ready(struct sm_notify *n, const char *status)
{
    tell_with_status(n, "READY=1\n", status);
}

void sm_notify_stopping(struct sm_notify *n)
{
    tell(n, "STOPPING=1");
}

void sm_notify_status(struct sm_notify *n, const char *status)
{
    tell_with_status(n, "", status);
}

void sm_notify_alive(struct sm_notify *n, int64_t boot_ns)
{
    if (n->watchdog_ns == 0 || boot_ns - n->told_boot_ns < n->watchdog_ns / 2)
        return;
    n->told_boot_ns = boot_ns;
    tell(n, "WATCHDOG=1");
}
