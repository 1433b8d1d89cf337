/* SPDX-License-Identifier: GPL-3.0-or-later */
/* hub.c: the listening socket, and what meters tell to whom. */
#include "hub.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/stat.h>
#include <sys/un.h>
#include <unistd.h>

#include "base/time.h"
#include "client.h"
#include "record/entry.h"
#include "say.h"

void sm_socket_path(const char *option, const char *setup, char *ret_path, size_t cap)
{
    const char *runtime = getenv("XDG_RUNTIME_DIR");

    if (option != NULL && option[0] != '\0')
        snprintf(ret_path, cap, "%s", option);
    else if (setup != NULL && setup[0] != '\0')
        snprintf(ret_path, cap, "%s", setup);
    else if (runtime != NULL && runtime[0] == '/')
        snprintf(ret_path, cap, "%s/stillmark/socket", runtime);
    else
        snprintf(ret_path, cap, "/run/stillmark/socket");
}

/* ---- listening ---- */

static void make_parent(const char *path)
{
    char parent[108];
    char *slash;

    snprintf(parent, sizeof parent, "%s", path);
    slash = strrchr(parent, '/');
    if (slash == NULL || slash == parent)
        return;
    *slash = '\0';
    (void)mkdir(parent, 0750); /* there already, or bind says what is wrong */
}

/* A socket that nobody listens on is taken away. */
static enum sm_status clear_path(const struct sockaddr_un *a, char ret_why[SM_WHY_SIZE])
{
    struct stat st;
    int fd, r;

    if (lstat(a->sun_path, &st) < 0)
        return SM_OK;
    if (!S_ISSOCK(st.st_mode)) {
        snprintf(ret_why, SM_WHY_SIZE, "%s: is there and is no socket; move it away", a->sun_path);
        return SM_EIO;
    }
    fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);
    if (fd < 0)
        return SM_OK;
    r = connect(fd, (const struct sockaddr *)a, sizeof *a) < 0 ? errno : 0;
    close(fd);
    if (r == ECONNREFUSED) {
        unlink(a->sun_path);
        return SM_OK;
    }
    if (r == 0 || r == EAGAIN) {
        snprintf(ret_why, SM_WHY_SIZE,
                 "%s: another stillmarkd answers there; stop it, or give this one a socket of its "
                 "own (--socket)",
                 a->sun_path);
        return SM_EBUSY;
    }
    return SM_OK; /* bind says what is wrong */
}

static enum sm_status listen_on(struct sm_hub *h, const char *path, char ret_why[SM_WHY_SIZE])
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    enum sm_status s;

    if (strlen(path) >= sizeof a.sun_path) {
        snprintf(ret_why, SM_WHY_SIZE, "%.200s: a socket's path has at most %zu bytes", path,
                 sizeof a.sun_path - 1);
        return SM_EIO;
    }
    snprintf(a.sun_path, sizeof a.sun_path, "%s", path);
    make_parent(path);
    s = clear_path(&a, ret_why);
    if (s != SM_OK)
        return s;
    h->fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);
    if (h->fd < 0 || bind(h->fd, (const struct sockaddr *)&a, sizeof a) < 0) {
        snprintf(ret_why, SM_WHY_SIZE, "%s: the control socket cannot be made: %s", path,
                 sm_door_text(-errno));
        return SM_EIO;
    }
    memcpy(h->path, a.sun_path, sizeof h->path);
    if (chmod(path, 0660) < 0 || listen(h->fd, 16) < 0) {
        snprintf(ret_why, SM_WHY_SIZE, "%s: the control socket cannot be opened: %s", path,
                 sm_door_text(-errno));
        return SM_EIO;
    }
    return SM_OK;
}

/* ---- connections ---- */

static void turn_away(int fd)
{
    static const char full[] = "{\"k\":\"error\",\"why\":\"64 clients are connected already\"}\n";

    if (send(fd, full, sizeof full - 1, MSG_NOSIGNAL) < 0)
        (void)0; /* it is gone already */
    close(fd);
}

/* Nothing is left for another connection: who waits would wake us again at once. */
static void pause_accepting(struct sm_hub *h)
{
    static const struct timeval second = { 1, 0 };

    if (!h->full_said)
        sm_say(NULL, "no descriptor is left for another client of the control socket");
    h->full_said = true;
    event_del(h->accept);
    event_add(h->again, &second);
}

static void on_again(evutil_socket_t fd, short what, void *arg)
{
    struct sm_hub *h = arg;

    (void)fd;
    (void)what;
    event_add(h->accept, NULL);
}

static void on_accept(evutil_socket_t listener, short what, void *arg)
{
    struct sm_hub *h = arg;
    struct client *c;
    const int fd = accept4(listener, NULL, NULL, SOCK_CLOEXEC | SOCK_NONBLOCK);

    (void)what;
    if (fd < 0) {
        if (errno == EMFILE || errno == ENFILE || errno == ENOMEM || errno == ENOBUFS)
            pause_accepting(h);
        return;
    }
    h->full_said = false;
    c = h->n_clients < SM_CLIENTS_MAX ? client_create(h, fd) : NULL;
    if (c == NULL) {
        turn_away(fd);
        return;
    }
    c->next = h->clients;
    h->clients = c;
    h->n_clients++;
}

static void on_sweep(evutil_socket_t fd, short what, void *arg)
{
    struct sm_hub *h = arg;
    struct client **at = &h->clients;

    (void)fd;
    (void)what;
    while (*at != NULL) {
        struct client *c = *at;
        if (!c->dead) {
            at = &c->next;
            continue;
        }
        *at = c->next;
        h->n_clients--;
        client_destroy(c);
    }
}

enum sm_status sm_hub_create(const struct sm_hub_about *about, const char *path,
                             struct sm_hub **ret_hub, char ret_why[SM_WHY_SIZE])
{
    struct sm_hub *h = calloc(1, sizeof *h);
    enum sm_status s = SM_ENOMEM;

    snprintf(ret_why, SM_WHY_SIZE, "no memory");
    if (h == NULL)
        return s;
    h->about = *about;
    h->fd = -1;
    h->line = malloc(SM_ENTRY_MAX);
    if (h->line != NULL)
        s = listen_on(h, path, ret_why);
    if (s == SM_OK) {
        h->sweep = event_new(about->base, -1, 0, on_sweep, h);
        h->again = evtimer_new(about->base, on_again, h);
        h->accept = event_new(about->base, h->fd, EV_READ | EV_PERSIST, on_accept, h);
        if (h->sweep == NULL || h->again == NULL || h->accept == NULL)
            s = SM_ENOMEM;
    }
    if (s != SM_OK) {
        sm_hub_destroy(h);
        return s;
    }
    *ret_hub = h;
    return SM_OK;
}

enum sm_status sm_hub_open(struct sm_hub *h)
{
    return event_add(h->accept, NULL) == 0 ? SM_OK : SM_ENOMEM;
}

void sm_hub_destroy(struct sm_hub *h)
{
    if (h == NULL)
        return;
    while (h->clients != NULL) {
        struct client *c = h->clients;
        h->clients = c->next;
        client_destroy(c);
    }
    if (h->accept != NULL)
        event_free(h->accept);
    if (h->again != NULL)
        event_free(h->again);
    if (h->sweep != NULL)
        event_free(h->sweep);
    if (h->fd >= 0)
        close(h->fd);
    if (h->path[0] != '\0')
        unlink(h->path);
    free(h->line);
    free(h);
}

/* ---- from the meters ---- */

void sm_hub_line(struct sm_hub *h, struct sm_meter *m, const char *line, size_t n)
{
    for (struct client *c = h != NULL ? h->clients : NULL; c != NULL; c = c->next)
        if (c->following == FOLLOW_LIVE && c->meter == m)
            client_send(c, line, n);
}

static size_t kind_of(const char *kind)
{
    return strcmp(kind, "reading") == 0 ? 0 : strcmp(kind, "settling") == 0 ? 1 : 2;
}

void sm_hub_live(struct sm_hub *h, struct sm_meter *m, const char *kind, const char *line, size_t n)
{
    const size_t k = kind_of(kind);

    for (struct client *c = h != NULL ? h->clients : NULL; c != NULL; c = c->next) {
        if (c->following != FOLLOW_LIVE || c->meter != m)
            continue;
        const int64_t boot_ns = h->about.now(h->about.ctx)->boot_ns;
        if (boot_ns - c->live_boot_ns[k] < LIVE_EVERY_NS ||
            evbuffer_get_length(bufferevent_get_output(c->bev)) > LIVE_OUTPUT_MAX)
            continue;
        c->live_boot_ns[k] = boot_ns;
        client_send(c, line, n);
    }
}

void sm_hub_answer(struct sm_hub *h, struct sm_meter *m, int64_t act, const char *line, size_t n)
{
    for (struct client *c = h != NULL ? h->clients : NULL; c != NULL; c = c->next) {
        for (size_t i = 0; i < c->n_waiting; i++) {
            if (c->waiting[i].meter != m || c->waiting[i].act != act)
                continue;
            c->waiting[i] = c->waiting[--c->n_waiting];
            if (c->following != FOLLOW_LIVE || c->meter != m) /* else it has had the line */
                client_send(c, line, n);
            break;
        }
    }
}

void sm_hub_lost(struct sm_hub *h, struct sm_meter *m, const char *why)
{
    char told[SM_WHY_SIZE + 128];

    for (struct client *c = h != NULL ? h->clients : NULL; c != NULL; c = c->next) {
        for (size_t i = 0; i < c->n_waiting;) {
            if (c->waiting[i].meter != m) {
                i++;
                continue;
            }
            snprintf(
                told, sizeof told,
                "the log failed before the act was known to be on disk (%s): it may or may not be "
                "done; look at the status",
                why);
            client_error(c, c->waiting[i].id, told);
            c->waiting[i] = c->waiting[--c->n_waiting];
        }
    }
}
