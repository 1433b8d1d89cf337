/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fake_daemon.h: something that answers on a Unix socket as a test says, in a thread of the test's
 * own process. */
#ifndef SM_TEST_FAKE_DAEMON_H
#define SM_TEST_FAKE_DAEMON_H
#include <stdbool.h>
#include <stddef.h>

/* The first rule whose text stands in a request answers it; a request of no rule is not answered.
 */
struct fake_rule {
    const char *when;
    const char *reply; /* "$ID" is the request's id; NULL: nothing */
    bool close;        /* then the connection is closed */
};

struct fake_daemon;

/* Listens at a path of its own in /tmp. rules end with one of when NULL; lent. */
struct fake_daemon *fake_daemon_start(const struct fake_rule *rules);
const char *fake_daemon_path(const struct fake_daemon *d);
/* Ends it. */
void fake_daemon_stop(struct fake_daemon *d);
/* After it has ended: the requests, one per line, in order. */
const char *fake_daemon_heard(const struct fake_daemon *d);
void fake_daemon_destroy(struct fake_daemon *d);
#endif
