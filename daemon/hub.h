/* SPDX-License-Identifier: GPL-3.0-or-later */
/* hub.h: the control socket: who is connected, what they ask and follow, and what they are told.
 * JSON Lines, one object per line:
 *
 *   {"k":"status"}                      one `status` object per meter, each with "meters": how many
 *   {"k":"follow","meter":M,"from":N}   entries from n on out of the present file, then as they
 * come; without from: from now on. One meter per connection.
 *   {"k":"act","act":"next","id":ID,…}  the act's `answer` entry, when it is on disk
 *
 * "meter" may be left out where there is one. What cannot be done is told as {"k":"error","why":…},
 * with "id" where the act had one. Followers also get live objects, which have no n: `reading`,
 * `settling`, and `raw` (bytes that are not logged). Whoever reads too slowly misses live objects,
 * then is cut off. */
#ifndef SM_DAEMON_HUB_H
#define SM_DAEMON_HUB_H
#include "clock.h"
#include "meter.h"

struct event_base;
struct sm_hub;

#define SM_CLIENTS_MAX 64
#define SM_REQUEST_MAX (256u * 1024u) /* bytes of one line */

struct sm_hub_about {
    struct event_base *base;
    const struct sm_door *door;
    struct sm_meter **meter; /* [n_meters], lent */
    size_t n_meters;
    void *ctx;
    const struct sm_now *(*stamp)(void *ctx);     /* a wake-up begins: what time is it */
    const struct sm_now *(*now)(void *ctx);       /* the stamp of this wake-up */
    void (*after)(void *ctx, struct sm_meter *m); /* a meter was told something */
};

/* A Unix socket (0660); who connects waits until sm_hub_open. What a daemon that died left behind
 * is taken away; one that lives is not disturbed.
 *   SM_EBUSY           another daemon listens there
 *   SM_EIO, SM_ENOMEM  ret_why */
SM_MUST_CHECK enum sm_status sm_hub_create(const struct sm_hub_about *about, const char *path,
                                           struct sm_hub **ret_hub, char ret_why[SM_WHY_SIZE]);
SM_MUST_CHECK enum sm_status sm_hub_open(struct sm_hub *h); /* SM_ENOMEM */
void sm_hub_destroy(struct sm_hub *h);                      /* NULL is fine */

/* For the meters' hooks (h may be NULL: nobody is there). */
void sm_hub_line(struct sm_hub *h, struct sm_meter *m, const char *line, size_t n);
void sm_hub_live(struct sm_hub *h, struct sm_meter *m, const char *kind, const char *line,
                 size_t n);
void sm_hub_answer(struct sm_hub *h, struct sm_meter *m, int64_t act, const char *line, size_t n);
void sm_hub_lost(struct sm_hub *h, struct sm_meter *m, const char *why);

/* Where the socket is, of --socket, the setup's, $XDG_RUNTIME_DIR/stillmark/socket and
 * /run/stillmark/socket the first that is given. */
void sm_socket_path(const char *option, const char *setup, char *ret_path, size_t cap);
#endif
