/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fake_daemon.c: one thread, poll, a few connections. */
#include "fake_daemon.h"

#include <poll.h>
#include <pthread.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/un.h>
#include <unistd.h>

#include "check.h"

#define CONNECTIONS 8
#define REQUEST_MAX ((size_t)512 * 1024)

struct connection {
    int fd; /* -1: free */
    char *in;
    size_t n;
};

struct fake_daemon {
    const struct fake_rule *rules;
    char folder[64], path[96];
    int listener, stop[2];
    pthread_t thread;
    struct connection connection[CONNECTIONS];
    char *heard;
    size_t heard_n;
};

static void hear(struct fake_daemon *d, const char *line)
{
    const size_t n = strlen(line);
    char *heard = realloc(d->heard, d->heard_n + n + 2);

    if (heard == NULL)
        abort();
    d->heard = heard;
    memcpy(d->heard + d->heard_n, line, n);
    d->heard_n += n;
    d->heard[d->heard_n++] = '\n';
    d->heard[d->heard_n] = '\0';
}

static void put(int fd, const char *text, size_t n)
{
    while (n > 0) {
        const ssize_t got = send(fd, text, n, MSG_NOSIGNAL);
        if (got < 0)
            return; /* it has gone */
        text += got;
        n -= (size_t)got;
    }
}

static void reply(int fd, const char *text, const char *request)
{
    const char *id = strstr(request, "\"id\":\""), *at = text, *hole;

    while ((hole = strstr(at, "$ID")) != NULL) {
        put(fd, at, (size_t)(hole - at));
        if (id != NULL)
            put(fd, id + 6, strcspn(id + 6, "\""));
        at = hole + 3;
    }
    put(fd, at, strlen(at));
}

static void let_go(struct connection *c)
{
    if (c->fd >= 0)
        close(c->fd);
    c->fd = -1;
    c->n = 0;
}

static void on_request(struct fake_daemon *d, struct connection *c, const char *line)
{
    hear(d, line);
    for (const struct fake_rule *r = d->rules; r->when != NULL; r++) {
        if (strstr(line, r->when) == NULL)
            continue;
        if (r->reply != NULL)
            reply(c->fd, r->reply, line);
        if (r->close)
            let_go(c);
        return;
    }
}

static void on_bytes(struct fake_daemon *d, struct connection *c)
{
    const ssize_t got = recv(c->fd, c->in + c->n, REQUEST_MAX - 1 - c->n, 0);
    char *end;

    if (got <= 0) {
        let_go(c);
        return;
    }
    c->n += (size_t)got;
    while (c->fd >= 0 && (end = memchr(c->in, '\n', c->n)) != NULL) {
        const size_t n = (size_t)(end - c->in) + 1;
        *end = '\0';
        on_request(d, c, c->in);
        if (c->fd < 0)
            return;
        memmove(c->in, c->in + n, c->n - n);
        c->n -= n;
    }
}

static void on_caller(struct fake_daemon *d)
{
    const int fd = accept(d->listener, NULL, NULL);

    for (size_t i = 0; i < CONNECTIONS && fd >= 0; i++) {
        if (d->connection[i].fd < 0) {
            d->connection[i].fd = fd;
            return;
        }
    }
    if (fd >= 0)
        close(fd);
}

static void *serve(void *arg)
{
    struct fake_daemon *d = arg;

    for (;;) {
        struct pollfd p[CONNECTIONS + 2] = { { d->stop[0], POLLIN, 0 },
                                             { d->listener, POLLIN, 0 } };
        for (size_t i = 0; i < CONNECTIONS; i++)
            p[2 + i] = (struct pollfd){ d->connection[i].fd, POLLIN, 0 };
        if (poll(p, CONNECTIONS + 2, -1) < 0)
            continue;
        if (p[0].revents != 0)
            return NULL;
        for (size_t i = 0; i < CONNECTIONS; i++)
            if (p[2 + i].revents != 0)
                on_bytes(d, &d->connection[i]);
        if (p[1].revents != 0)
            on_caller(d);
    }
}

struct fake_daemon *fake_daemon_start(const struct fake_rule *rules)
{
    struct fake_daemon *d = calloc(1, sizeof *d);
    struct sockaddr_un a = { .sun_family = AF_UNIX };

    assert_non_null(d);
    d->rules = rules;
    d->heard = calloc(1, 1);
    assert_non_null(d->heard);
    for (size_t i = 0; i < CONNECTIONS; i++) {
        d->connection[i].fd = -1;
        d->connection[i].in = malloc(REQUEST_MAX);
        assert_non_null(d->connection[i].in);
    }
    strcpy(d->folder, "/tmp/stillmark-fake-XXXXXX");
    assert_non_null(mkdtemp(d->folder));
    snprintf(d->path, sizeof d->path, "%s/socket", d->folder);
    snprintf(a.sun_path, sizeof a.sun_path, "%s", d->path);
    assert_int_equal(pipe(d->stop), 0);
    d->listener = socket(AF_UNIX, SOCK_STREAM, 0);
    assert_true(d->listener >= 0);
    assert_int_equal(bind(d->listener, (const struct sockaddr *)&a, sizeof a), 0);
    assert_int_equal(listen(d->listener, CONNECTIONS), 0);
    assert_int_equal(pthread_create(&d->thread, NULL, serve, d), 0);
    return d;
}

const char *fake_daemon_path(const struct fake_daemon *d)
{
    return d->path;
}

void fake_daemon_stop(struct fake_daemon *d)
{
    assert_int_equal(write(d->stop[1], "x", 1), 1);
    assert_int_equal(pthread_join(d->thread, NULL), 0);
    for (size_t i = 0; i < CONNECTIONS; i++)
        let_go(&d->connection[i]);
    close(d->listener);
    close(d->stop[0]);
    close(d->stop[1]);
    unlink(d->path);
    rmdir(d->folder);
}

const char *fake_daemon_heard(const struct fake_daemon *d)
{
    return d->heard;
}

void fake_daemon_destroy(struct fake_daemon *d)
{
    for (size_t i = 0; i < CONNECTIONS; i++)
        free(d->connection[i].in);
    free(d->heard);
    free(d);
}
