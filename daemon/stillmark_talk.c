/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_talk.c: one connection, lines out and lines in. */
#include "stillmark_talk.h"

#include <errno.h>
#include <poll.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/stat.h>
#include <sys/un.h>
#include <time.h>
#include <unistd.h>

#include "base/text.h"
#include "base/time.h"
#include "hub.h"
#include "record/entry.h"
#include "record/load.h"

#define SYSTEM_SOCKET "/run/stillmark/socket"
#define PIECE 65536u /* bytes of one read */
#define BUSY_WAIT_MS 50

struct sm_talk {
    int fd;
    char path[256];
    char *in; /* [cap] what came; lines up to `at` were taken */
    size_t cap, n, at;
    const char *line; /* the last one taken, in `in` */
    size_t line_n;
};

int64_t sm_talk_clock_ns(void)
{
    struct timespec ts;

    clock_gettime(CLOCK_MONOTONIC, &ts);
    return (int64_t)ts.tv_sec * SM_NS_PER_S + ts.tv_nsec;
}

__attribute__((format(printf, 2, 3))) static void say(char why[SM_TALK_WHY_SIZE], const char *fmt,
                                                      ...)
{
    char raw[SM_TALK_WHY_SIZE];
    struct sm_text r, t;
    va_list args;

    sm_text_init(&r, raw, sizeof raw);
    va_start(args, fmt);
    sm_text_addv(&r, fmt, args);
    va_end(args);
    sm_text_init(&t, why, SM_TALK_WHY_SIZE);
    sm_text_add_safe(&t, raw, r.len);
}

/* Milliseconds to wait, never less than is left. */
static int left_ms(int64_t until_ns)
{
    const int64_t left = until_ns - sm_talk_clock_ns();

    if (left <= 0)
        return 0;
    return left / SM_NS_PER_MS >= 3600000 ? 3600000 : (int)(left / SM_NS_PER_MS) + 1;
}

/* ---- finding the daemon ---- */

static bool is_socket(const char *path)
{
    struct stat st;

    return stat(path, &st) == 0 && S_ISSOCK(st.st_mode);
}

static void find(const char *option, char *ret_path, size_t cap)
{
    const char *given = option != NULL && option[0] != '\0' ? option : getenv("STILLMARK_SOCKET");

    sm_socket_path(given, NULL, ret_path, cap);
    /* a person's own session has a runtime folder whether or not the daemon runs in it */
    if ((given == NULL || given[0] == '\0') && !is_socket(ret_path) && is_socket(SYSTEM_SOCKET))
        snprintf(ret_path, cap, "%s", SYSTEM_SOCKET);
}

static enum sm_status refuse_connect(const char *path, int err, char ret_why[SM_TALK_WHY_SIZE])
{
    if (err == EACCES || err == EPERM)
        say(ret_why, "%s: you may not talk to this daemon: ask to be made a member of its group",
            path);
    else if (err == EAGAIN)
        say(ret_why, "%s: the daemon there takes no connection", path);
    else
        say(ret_why, "no daemon answers at %s: is stillmarkd running?", path);
    return SM_EIO;
}

static enum sm_status connect_to(const char *path, int fd, int64_t until_ns,
                                 char ret_why[SM_TALK_WHY_SIZE])
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };

    if (strlen(path) >= sizeof a.sun_path) {
        say(ret_why, "%.200s: a socket's path has at most %zu bytes", path, sizeof a.sun_path - 1);
        return SM_EIO;
    }
    memcpy(a.sun_path, path, strlen(path) + 1);
    while (connect(fd, (const struct sockaddr *)&a, sizeof a) != 0) {
        if (errno != EAGAIN || left_ms(until_ns) == 0)
            return refuse_connect(path, errno, ret_why);
        poll(NULL, 0, BUSY_WAIT_MS); /* its queue is full */
    }
    return SM_OK;
}

enum sm_status sm_talk_open(const char *option, int64_t until_ns, struct sm_talk **ret_talk,
                            char ret_why[SM_TALK_WHY_SIZE])
{
    struct sm_talk *t = calloc(1, sizeof *t);
    enum sm_status s;

    if (t == NULL) {
        say(ret_why, "no memory");
        return SM_ENOMEM;
    }
    find(option, t->path, sizeof t->path);
    t->fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);
    if (t->fd < 0) {
        say(ret_why, "no socket can be made here");
        free(t);
        return SM_EIO;
    }
    s = connect_to(t->path, t->fd, until_ns, ret_why);
    if (s != SM_OK) {
        sm_talk_close(t);
        return s;
    }
    *ret_talk = t;
    return SM_OK;
}

void sm_talk_close(struct sm_talk *t)
{
    if (t == NULL)
        return;
    close(t->fd);
    free(t->in);
    free(t);
}

int sm_talk_fd(const struct sm_talk *t)
{
    return t->fd;
}

/* ---- out ---- */

static enum sm_status send_all(struct sm_talk *t, const char *text, size_t n, int64_t until_ns,
                               char ret_why[SM_TALK_WHY_SIZE])
{
    while (n > 0) {
        struct pollfd p = { t->fd, POLLOUT, 0 };
        const ssize_t put = send(t->fd, text, n, MSG_NOSIGNAL);

        if (put >= 0) {
            text += put;
            n -= (size_t)put;
        } else if (errno != EAGAIN && errno != EINTR) {
            say(ret_why, "%s: the daemon closed the connection", t->path);
            return SM_EIO;
        } else if (left_ms(until_ns) == 0) {
            say(ret_why, "%s: the daemon takes nothing", t->path);
            return SM_EIO;
        } else {
            poll(&p, 1, left_ms(until_ns));
        }
    }
    return SM_OK;
}

enum sm_status sm_talk_send(struct sm_talk *t, const json_t *request, int64_t until_ns,
                            char ret_why[SM_TALK_WHY_SIZE])
{
    char *line = json_dumps(request, JSON_COMPACT);
    enum sm_status s = SM_ENOMEM;
    size_t n;

    if (line == NULL) {
        say(ret_why, "no memory");
        return SM_ENOMEM;
    }
    n = strlen(line);
    if (n + 1 > SM_REQUEST_MAX) {
        say(ret_why, "it would take %zu bytes to tell, at most %u are possible", n + 1,
            SM_REQUEST_MAX);
        s = SM_EFULL;
    } else {
        line[n] = '\n'; /* the room of its NUL */
        s = send_all(t, line, n + 1, until_ns, ret_why);
    }
    free(line);
    return s;
}

/* ---- in ---- */

static bool make_room(struct sm_talk *t)
{
    if (t->at > 0) {
        memmove(t->in, t->in + t->at, t->n - t->at);
        t->n -= t->at;
        t->at = 0;
        t->line = NULL;
    }
    if (t->cap - t->n < PIECE) {
        char *in = realloc(t->in, t->cap + 4 * PIECE);
        if (in == NULL)
            return false;
        t->in = in;
        t->cap += 4 * PIECE;
    }
    return true;
}

/* A whole line that is here already. */
static bool take_line(struct sm_talk *t)
{
    const char *from, *end;

    if (t->n == t->at) /* nothing, and no storage yet at first */
        return false;
    from = t->in + t->at;
    end = memchr(from, '\n', t->n - t->at);
    if (end == NULL)
        return false;
    t->line = from;
    t->line_n = (size_t)(end - from);
    t->at += t->line_n + 1;
    return true;
}

/* Reads once, waiting for it if need be. SM_ESHORT: nothing came in time. */
static enum sm_status read_more(struct sm_talk *t, int64_t until_ns, char ret_why[SM_TALK_WHY_SIZE])
{
    struct pollfd p = { t->fd, POLLIN, 0 };
    ssize_t got;

    if (t->n - t->at > SM_ENTRY_MAX) {
        say(ret_why, "%s: what answers there sends a line without end", t->path);
        return SM_EIO;
    }
    if (!make_room(t)) {
        say(ret_why, "no memory");
        return SM_ENOMEM;
    }
    got = recv(t->fd, t->in + t->n, t->cap - t->n, 0);
    if (got > 0) {
        t->n += (size_t)got;
        return SM_OK;
    }
    if (got == 0 || (errno != EAGAIN && errno != EINTR)) {
        say(ret_why, "%s: the daemon closed the connection", t->path);
        return SM_EIO;
    }
    if (left_ms(until_ns) == 0)
        return SM_ESHORT;
    poll(&p, 1, left_ms(until_ns));
    return SM_OK;
}

enum sm_status sm_talk_next(struct sm_talk *t, int64_t until_ns, json_t **ret_object,
                            char ret_why[SM_TALK_WHY_SIZE])
{
    char why[SM_REASON_SIZE];

    while (!take_line(t)) {
        const enum sm_status s = read_more(t, until_ns, ret_why);

        if (s == SM_ESHORT)
            say(ret_why, "%s: the daemon does not answer", t->path);
        if (s != SM_OK)
            return s;
    }
    if (sm_json_load(t->line, t->line_n, ret_object, why) != SM_OK) {
        say(ret_why, "%s: what answers there is no stillmarkd: %s", t->path, why);
        return SM_EIO;
    }
    return SM_OK;
}

void sm_talk_print(const struct sm_talk *t)
{
    size_t at = 0;

    while (t->line != NULL && at < t->line_n) {
        const unsigned char first = (unsigned char)t->line[at];
        uint32_t code = 0;
        const size_t len = sm_utf8_next(t->line + at, t->line_n - at, &code);
        char shown[16];
        struct sm_text s;

        sm_text_init(&s, shown, sizeof shown);
        sm_text_add_safe(&s, t->line + at, len > 0 ? len : 1);
        if (shown[0] != '\\' || first == '\\')
            fputs(shown, stdout);
        else if (code < 0x20)
            fputc(' ', stdout); /* a raw control is white space between two values */
        else
            printf("\\u%04x", (unsigned)code & 0xffffU);
        at += len > 0 ? len : 1;
    }
    fputc('\n', stdout);
    fflush(stdout);
}

/* ---- what both acts and status need ---- */

bool sm_talk_is(const json_t *object, const char *k)
{
    const char *is = json_string_value(json_object_get(object, "k"));

    return is != NULL && strcmp(is, k) == 0;
}

bool sm_talk_is_error(const json_t *object, char ret_why[SM_TALK_WHY_SIZE])
{
    const json_t *why = json_object_get(object, "why");
    struct sm_text t;

    if (!sm_talk_is(object, "error"))
        return false;
    sm_text_init(&t, ret_why, SM_TALK_WHY_SIZE);
    if (json_string_length(why) > 0)
        sm_text_add_safe(&t, json_string_value(why), json_string_length(why));
    else
        sm_text_add(&t, "the daemon does not do that");
    return true;
}

/* How many there will be; at least this one. */
static size_t expected(const json_t *status)
{
    const json_t *meters = json_object_get(status, "meters");
    const json_int_t n = json_is_integer(meters) ? json_integer_value(meters) : 1;

    return n < 1 ? 1 : n > SM_METERS_MAX ? SM_METERS_MAX : (size_t)n;
}

static enum sm_status collect(struct sm_talk *t, bool print, int64_t until_ns, json_t *list,
                              char ret_why[SM_TALK_WHY_SIZE])
{
    size_t wanted = 1;

    while (json_array_size(list) < wanted) {
        json_t *o = NULL;
        const enum sm_status s = sm_talk_next(t, until_ns, &o, ret_why);

        if (s != SM_OK)
            return s;
        if (sm_talk_is_error(o, ret_why)) {
            json_decref(o);
            return SM_EUNKNOWN;
        }
        if (!sm_talk_is(o, "status")) {
            json_decref(o);
            continue;
        }
        wanted = expected(o);
        if (print)
            sm_talk_print(t);
        if (json_array_append_new(list, o) != 0) {
            say(ret_why, "no memory");
            return SM_ENOMEM;
        }
    }
    return SM_OK;
}

enum sm_status sm_talk_status(struct sm_talk *t, const char *meter, bool print, int64_t until_ns,
                              json_t **ret_list, char ret_why[SM_TALK_WHY_SIZE])
{
    json_t *ask = json_pack("{s:s, s:s*}", "k", "status", "meter", meter);
    json_t *list = json_array();
    enum sm_status s = SM_ENOMEM;

    say(ret_why, "no memory");
    if (ask != NULL && list != NULL)
        s = sm_talk_send(t, ask, until_ns, ret_why);
    if (s == SM_OK)
        s = collect(t, print, until_ns, list, ret_why);
    json_decref(ask);
    if (s != SM_OK)
        json_decref(list);
    else
        *ret_list = list;
    return s;
}
