/* SPDX-License-Identifier: GPL-3.0-or-later */
/* client.h: one connection to the control socket. Private to hub.c, client.c, request.c and
 * follow.c. */
#ifndef SM_DAEMON_CLIENT_H
#define SM_DAEMON_CLIENT_H
#include <event2/buffer.h>
#include <event2/bufferevent.h>
#include <event2/event.h>

#include "hub.h"

#define WAITING_MAX 32
#define LIVE_KINDS 3
#define LIVE_OUTPUT_MAX (64u * 1024u)      /* more waits to be read: no live objects */
#define OUTPUT_MAX (4u * 1024u * 1024u)    /* more: cut off */
#define LIVE_EVERY_NS (100 * SM_NS_PER_MS) /* of one kind */

struct waiting { /* an act whose answer is not on disk yet */
    struct sm_meter *meter;
    int64_t act;
    char id[SM_ID_SIZE];
};

enum following { FOLLOW_NOT, FOLLOW_FILE, FOLLOW_LIVE };

struct client {
    struct client *next;
    struct sm_hub *hub;
    struct bufferevent *bev;
    bool has_uid;
    int64_t uid;
    bool dead;  /* to be freed by the sweep */
    bool ended; /* it sends no more */
    struct waiting waiting[WAITING_MAX];
    size_t n_waiting;
    /* following */
    enum following following;
    struct sm_meter *meter;
    int64_t from;
    int fd; /* of the file being read; -1 none */
    int64_t ordinal, at;
    struct evbuffer *piece; /* read, its last line not whole */
    int64_t live_boot_ns[LIVE_KINDS];
};

struct sm_hub {
    struct sm_hub_about about;
    char path[108];
    int fd;
    struct event *accept, *again, *sweep;
    struct client *clients;
    size_t n_clients;
    char *line; /* SM_ENTRY_MAX */
    bool full_said;
};

/* client.c */
struct client *client_create(struct sm_hub *h, int fd);
void client_destroy(struct client *c);
void client_send(struct client *c, const char *line, size_t n);
void client_error(struct client *c, const char *id, const char *why);
void client_kill(struct client *c);

/* request.c: one line from the client, without newline */
void client_request(struct client *c, const char *line, size_t n);

/* follow.c */
void follow_begin(struct client *c, struct sm_meter *m, bool has_from, int64_t from);
void follow_more(struct client *c); /* there is room for more */
void follow_end(struct client *c);
#endif
