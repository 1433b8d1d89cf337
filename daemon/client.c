/* SPDX-License-Identifier: GPL-3.0-or-later */
/* client.c: lines in, lines out, and the ceilings on both. */
#include "client.h"

#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <unistd.h>

#include "base/time.h"
#include "record/json.h"
#include "say.h"

static size_t output_size(const struct client *c)
{
    return evbuffer_get_length(bufferevent_get_output(c->bev));
}

void client_kill(struct client *c)
{
    if (c->dead)
        return;
    c->dead = true;
    bufferevent_disable(c->bev, EV_READ | EV_WRITE);
    event_active(c->hub->sweep, EV_TIMEOUT, 0);
}

void client_send(struct client *c, const char *line, size_t n)
{
    if (c->dead)
        return;
    if (output_size(c) + n > OUTPUT_MAX) {
        sm_say(NULL, "a client of the control socket reads too slowly and is cut off");
        client_kill(c);
        return;
    }
    if (bufferevent_write(c->bev, line, n) != 0)
        client_kill(c);
}

void client_error(struct client *c, const char *id, const char *why)
{
    char buf[1600];
    struct sm_text t;

    sm_text_init(&t, buf, sizeof buf);
    sm_json_object(&t, NULL);
    sm_json_text(&t, "k", "error");
    if (id != NULL)
        sm_json_words(&t, "id", id);
    sm_json_text(&t, "why", why);
    sm_json_end(&t);
    if (t.cut) { /* a why of control characters that grew sixfold */
        sm_text_init(&t, buf, sizeof buf);
        sm_text_add(&t, "{\"k\":\"error\",\"why\":\"the request could not be read\"}\n");
    }
    client_send(c, t.buf, t.len);
}

/* Nothing is owed to it any more and it has said all it wants. */
static void close_if_done(struct client *c)
{
    if (c->ended && c->n_waiting == 0 && c->following == FOLLOW_NOT && output_size(c) == 0)
        client_kill(c);
}

static void on_read(struct bufferevent *bev, void *arg)
{
    struct evbuffer *in = bufferevent_get_input(bev);
    struct client *c = arg;
    size_t n;
    char *line;

    while (!c->dead && (line = evbuffer_readln(in, &n, EVBUFFER_EOL_LF)) != NULL) {
        if (n > SM_REQUEST_MAX)
            client_error(c, NULL, "a line is longer than 256 KiB");
        else if (n > 0)
            client_request(c, line, n);
        free(line);
    }
    if (!c->dead && evbuffer_get_length(in) > SM_REQUEST_MAX) {
        client_error(c, NULL, "a line is longer than 256 KiB");
        evbuffer_drain(in, evbuffer_get_length(in));
        bufferevent_disable(bev, EV_READ);
        c->ended = true;
        close_if_done(c);
    }
}

static void on_write(struct bufferevent *bev, void *arg)
{
    struct client *c = arg;

    (void)bev;
    if (c->following == FOLLOW_FILE)
        follow_more(c);
    close_if_done(c);
}

static void on_event(struct bufferevent *bev, short what, void *arg)
{
    struct client *c = arg;

    (void)bev;
    if ((what & BEV_EVENT_ERROR) != 0) {
        client_kill(c);
    } else if ((what & BEV_EVENT_EOF) != 0) {
        c->ended = true;
        follow_end(c);
        close_if_done(c);
    }
}

static void read_peer(struct client *c, int fd)
{
    struct ucred who;
    socklen_t size = sizeof who;

    if (getsockopt(fd, SOL_SOCKET, SO_PEERCRED, &who, &size) == 0) {
        c->has_uid = true;
        c->uid = who.uid;
    }
}

struct client *client_create(struct sm_hub *h, int fd)
{
    struct client *c = calloc(1, sizeof *c);

    if (c == NULL)
        return NULL;
    c->hub = h;
    c->fd = -1;
    c->bev = bufferevent_socket_new(h->about.base, fd, BEV_OPT_CLOSE_ON_FREE);
    if (c->bev == NULL) {
        free(c);
        return NULL;
    }
    read_peer(c, fd);
    bufferevent_setcb(c->bev, on_read, on_write, on_event, c);
    bufferevent_setwatermark(c->bev, EV_READ, 0, SM_REQUEST_MAX + 4096);
    if (bufferevent_enable(c->bev, EV_READ | EV_WRITE) != 0) {
        bufferevent_free(c->bev);
        free(c);
        return NULL;
    }
    return c;
}

void client_destroy(struct client *c)
{
    follow_end(c);
    bufferevent_free(c->bev);
    free(c);
}
