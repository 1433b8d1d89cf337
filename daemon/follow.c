/* SPDX-License-Identifier: GPL-3.0-or-later */
/* follow.c: a follower that begins with older entries reads what is on disk, piece by piece as it
 * takes them, then what is shown already, then it is live. Nothing is sent twice or left out. */
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>

#include "client.h"
#include "record/head.h"

#define PIECE (64u * 1024u)
#define PAUSE_OUTPUT (256u * 1024u) /* more waits to be read: go on later */

void follow_end(struct client *c)
{
    const struct sm_door *door = c->hub->about.door;

    if (c->fd >= 0)
        (void)door->close(door, c->fd);
    if (c->piece != NULL)
        evbuffer_free(c->piece);
    c->fd = -1;
    c->piece = NULL;
    c->following = FOLLOW_NOT;
}

static void send_from(struct client *c, const char *line, size_t n)
{
    struct sm_head head;

    if (sm_head_read(line, n - 1, &head) && head.n >= c->from)
        client_send(c, line, n);
}

static void send_shown(void *arg, const char *line, size_t n)
{
    send_from(arg, line, n);
}

static void go_live(struct client *c)
{
    struct sm_meter *m = c->meter;

    follow_end(c);
    c->following = FOLLOW_LIVE;
    sm_meter_shown(m, send_shown, c);
}

static bool open_file(struct client *c, const struct sm_meter_disk *disk)
{
    const struct sm_door *door = c->hub->about.door;

    if (c->fd >= 0)
        (void)door->close(door, c->fd);
    c->fd = door->open(door, disk->path, O_RDONLY, 0);
    if (c->fd < 0) {
        client_error(c, NULL, sm_door_text(c->fd));
        c->fd = -1;
        return false;
    }
    c->ordinal = disk->ordinal;
    c->at = 0;
    return true;
}

/* How much of the file that is being read was announced. */
static int64_t limit_of(const struct client *c, const struct sm_meter_disk *disk)
{
    if (c->ordinal == disk->ordinal)
        return disk->bytes;
    return c->ordinal == disk->before_ordinal ? disk->before_bytes : 0;
}

static void send_lines(struct client *c)
{
    size_t n;
    char *line;

    while ((line = evbuffer_readln(c->piece, &n, EVBUFFER_EOL_LF)) != NULL) {
        line[n] = '\n'; /* the room of its NUL */
        send_from(c, line, n + 1);
        free(line);
    }
}

/* One piece; false: there is nothing more in this file. */
static bool read_piece(struct client *c, int64_t limit)
{
    const struct sm_door *door = c->hub->about.door;
    char buf[PIECE];
    const int64_t left = limit - c->at;
    ssize_t got;

    if (left <= 0)
        return false;
    got = door->read(door, c->fd, buf, left < (int64_t)sizeof buf ? (size_t)left : sizeof buf);
    if (got <= 0 || evbuffer_add(c->piece, buf, (size_t)got) != 0)
        return false;
    c->at += got;
    send_lines(c);
    return true;
}

void follow_more(struct client *c)
{
    struct evbuffer *out = bufferevent_get_output(c->bev);
    struct sm_meter_disk disk;

    while (!c->dead && c->following == FOLLOW_FILE && evbuffer_get_length(out) < PAUSE_OUTPUT) {
        sm_meter_disk(c->meter, &disk);
        if (disk.ordinal == 0) {
            go_live(c);
        } else if (c->fd < 0) {
            if (!open_file(c, &disk))
                go_live(c);
        } else if (!read_piece(c, limit_of(c, &disk))) {
            evbuffer_drain(c->piece, evbuffer_get_length(c->piece));
            if (c->ordinal == disk.ordinal || !open_file(c, &disk))
                go_live(c);
        }
    }
}

void follow_begin(struct client *c, struct sm_meter *m, bool has_from, int64_t from)
{
    c->meter = m;
    c->from = from;
    if (!has_from) {
        c->following = FOLLOW_LIVE;
        return;
    }
    c->piece = evbuffer_new();
    if (c->piece == NULL) {
        client_error(c, NULL, "no memory");
        return;
    }
    c->following = FOLLOW_FILE;
    follow_more(c);
}
