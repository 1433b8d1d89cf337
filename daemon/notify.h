/* SPDX-License-Identifier: GPL-3.0-or-later */
/* notify.h: tells the service manager, if there is one, that we are ready, alive, stopping (the
 * datagram protocol of sd_notify(3)). */
#ifndef SM_DAEMON_NOTIFY_H
#define SM_DAEMON_NOTIFY_H
#include <stdbool.h>
#include <stdint.h>

struct sm_notify {
    int fd;              /* -1: nobody listens */
    int64_t watchdog_ns; /* to be told this often at least; 0: not */
    int64_t told_boot_ns;
};

/* Reads NOTIFY_SOCKET, WATCHDOG_USEC and WATCHDOG_PID. */
void sm_notify_init(struct sm_notify *n);
void sm_notify_finish(struct sm_notify *n);
void sm_notify_ready(struct sm_notify *n, const char *status);
void sm_notify_stopping(struct sm_notify *n);
void sm_notify_status(struct sm_notify *n, const char *status);
/* WATCHDOG=1 when half of the time is over. */
void sm_notify_alive(struct sm_notify *n, int64_t boot_ns);
#endif
