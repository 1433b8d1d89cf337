/* SPDX-License-Identifier: GPL-3.0-or-later */
/* loop.c: events of the operating system become calls of the meters; time is stamped once per
 * wake-up. */
#include "loop.h"

#include <event2/event.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "clock.h"
#include "hub.h"
#include "keys.h"
#include "meter.h"
#include "notify.h"
#include "record/arithmetic.h"
#include "say.h"

#define START_NS (10 * SM_NS_PER_S) /* a log not begun by then does not keep the socket closed */
#define STOP_NS (12 * SM_NS_PER_S)  /* a disk that takes nothing does not keep us */

struct bound { /* a meter and its events */
    struct sm_loop *loop;
    struct sm_meter *meter;
    struct event *port, *written, *due;
};

struct sm_loop {
    const struct sm_door *door;
    const struct sm_setup *setup;
    struct event_base *base;
    struct sm_clock clock;
    struct sm_now now;
    bool clock_said, ready;
    struct sm_signer *signer;
    char key_note[SM_REASON_SIZE];
    char arithmetic[17];
    char socket_path[512];
    struct sm_hub *hub;
    struct sm_notify notify;
    struct event *on_term, *on_int, *on_hup, *second;
    struct bound bound[SM_METERS_MAX];
    struct sm_meter *meter[SM_METERS_MAX];
    size_t n;
    int64_t started_boot_ns, stopping_boot_ns; /* SM_NEVER: not stopping */
};

/* ---- time ---- */

static void arm(struct bound *b)
{
    const int64_t due = sm_meter_due(b->meter);
    int64_t wait_ns = due - b->loop->now.boot_ns;
    struct timeval tv;

    if (due == SM_NEVER) {
        event_del(b->due);
        return;
    }
    if (wait_ns < SM_NS_PER_MS)
        wait_ns = wait_ns <= 0 ? SM_NS_PER_MS / 10 : wait_ns;
    if (wait_ns > 3600 * SM_NS_PER_S)
        wait_ns = 3600 * SM_NS_PER_S;
    tv.tv_sec = wait_ns / SM_NS_PER_S;
    tv.tv_usec = (wait_ns % SM_NS_PER_S + 999) / 1000;
    if (tv.tv_usec == 1000000) {
        tv.tv_sec++;
        tv.tv_usec = 0;
    }
    event_add(b->due, &tv);
}

/* Once per wake-up. A jump or a sleep is told to every meter before anything else. */
static const struct sm_now *stamp(void *ctx)
{
    struct sm_loop *l = ctx;
    const enum sm_status s = sm_clock_stamp(&l->clock, &l->now);

    if (s != SM_OK && !l->clock_said)
        sm_say(NULL, "the clock cannot be read; time stands still until it can");
    l->clock_said = s != SM_OK;
    if (l->now.jump_us != 0 || l->now.asleep_us != 0) {
        for (size_t i = 0; i < l->n; i++)
            sm_meter_clock(l->meter[i], &l->now);
        l->now.jump_us = l->now.asleep_us = 0;
    }
    return &l->now;
}

static const struct sm_now *now_of(void *ctx)
{
    struct sm_loop *l = ctx;

    return &l->now;
}

/* ---- start and stop ---- */

static void after(void *ctx, struct sm_meter *m);

/* Who connects is served when every meter has begun its log or could not. */
static void open_hub(struct sm_loop *l)
{
    char status[96];
    bool started = true;

    for (size_t i = 0; i < l->n; i++)
        started = started && sm_meter_started(l->meter[i]);
    if (!started && l->now.boot_ns - l->started_boot_ns < START_NS)
        return;
    if (sm_hub_open(l->hub) != SM_OK)
        return; /* tried again in a second */
    l->ready = true;
    snprintf(status, sizeof status, "%zu meter%s", l->n, l->n == 1 ? "" : "s");
    sm_say(NULL, "ready: %s, control socket %s", status, l->socket_path);
    sm_notify_ready(&l->notify, status);
}

static void end_if_stopped(struct sm_loop *l)
{
    static const struct timeval flush = { 0, 50000 };
    bool all = true;

    for (size_t i = 0; i < l->n; i++)
        all = all && sm_meter_stopped(l->meter[i]);
    if (all) {
        event_base_loopexit(l->base, &flush); /* what was just told still goes out */
    } else if (l->now.boot_ns - l->stopping_boot_ns > STOP_NS) {
        sm_say(NULL, "the disk takes nothing: not every log could be closed");
        _Exit(1); /* a writer hangs in the kernel: joining it would hang us too */
    }
}

static void go_on(struct sm_loop *l)
{
    if (l->stopping_boot_ns != SM_NEVER)
        end_if_stopped(l);
    else if (!l->ready)
        open_hub(l);
}

/* ---- from the operating system to the meters ---- */

static void on_port(evutil_socket_t fd, short what, void *arg)
{
    struct bound *b = arg;

    (void)fd;
    (void)what;
    sm_meter_readable(b->meter, stamp(b->loop));
    arm(b);
}

static void on_written(evutil_socket_t fd, short what, void *arg)
{
    struct bound *b = arg;

    (void)fd;
    (void)what;
    sm_meter_written(b->meter, stamp(b->loop));
    arm(b);
    go_on(b->loop);
}

static void on_due(evutil_socket_t fd, short what, void *arg)
{
    struct bound *b = arg;

    (void)fd;
    (void)what;
    sm_meter_wake(b->meter, stamp(b->loop));
    arm(b);
}

static void after(void *ctx, struct sm_meter *m)
{
    struct sm_loop *l = ctx;

    for (size_t i = 0; i < l->n; i++) {
        if (l->meter[i] != m)
            continue;
        sm_meter_wake(m, &l->now);
        arm(&l->bound[i]);
    }
}

/* ---- from the meters ---- */

static void hook_watch(void *ctx, struct sm_meter *m, int fd)
{
    struct bound *b = ctx;

    (void)m;
    if (b->port != NULL)
        event_free(b->port);
    b->port = NULL;
    if (fd < 0)
        return;
    b->port = event_new(b->loop->base, fd, EV_READ | EV_PERSIST, on_port, b);
    if (b->port == NULL || event_add(b->port, NULL) != 0)
        sm_say(sm_meter_name(b->meter), "the port cannot be watched");
}

static void hook_line(void *ctx, struct sm_meter *m, const char *line, size_t n)
{
    const struct bound *b = ctx;

    sm_hub_line(b->loop->hub, m, line, n);
}

static void hook_live(void *ctx, struct sm_meter *m, const char *kind, const char *line, size_t n)
{
    const struct bound *b = ctx;

    sm_hub_live(b->loop->hub, m, kind, line, n);
}

static void hook_answer(void *ctx, struct sm_meter *m, int64_t act, const char *line, size_t n)
{
    const struct bound *b = ctx;

    sm_hub_answer(b->loop->hub, m, act, line, n);
}

static void hook_lost(void *ctx, struct sm_meter *m, const char *why)
{
    const struct bound *b = ctx;

    sm_hub_lost(b->loop->hub, m, why);
}

static void on_second(evutil_socket_t fd, short what, void *arg)
{
    struct sm_loop *l = arg;

    (void)fd;
    (void)what;
    stamp(l);
    for (size_t i = 0; i < l->n; i++) {
        sm_meter_wake(l->meter[i], &l->now);
        arm(&l->bound[i]);
    }
    sm_notify_alive(&l->notify, l->now.boot_ns);
    go_on(l);
}

static void on_stop(evutil_socket_t sig, short what, void *arg)
{
    struct sm_loop *l = arg;

    (void)sig;
    (void)what;
    if (l->stopping_boot_ns != SM_NEVER)
        return;
    stamp(l);
    l->stopping_boot_ns = l->now.boot_ns;
    sm_say(NULL, "stopping: the logs are closed");
    sm_notify_stopping(&l->notify);
    for (size_t i = 0; i < l->n; i++) {
        sm_meter_stop(l->meter[i], &l->now);
        arm(&l->bound[i]);
    }
    end_if_stopped(l);
}

/* ---- creation ---- */

static enum sm_status make_meters(struct sm_loop *l, char ret_why[SM_WHY_SIZE])
{
    bool logs = false;
    enum sm_status s = SM_OK;

    for (size_t i = 0; i < l->setup->n_meters && s == SM_OK; i++) {
        struct bound *b = &l->bound[i];
        const struct sm_meter_about about = { l->door,
                                              l->setup,
                                              &l->setup->meter[i],
                                              NULL,
                                              "",
                                              l->arithmetic,
                                              { b, hook_watch, hook_line, hook_live, hook_answer,
                                                hook_lost } };
        b->loop = l;
        s = sm_meter_create(&about, &l->meter[i], ret_why);
        if (s != SM_OK)
            break;
        b->meter = l->meter[i];
        l->n++;
        logs = logs || sm_meter_has_logs(b->meter);
        b->due = evtimer_new(l->base, on_due, b);
        b->written =
            event_new(l->base, sm_meter_written_fd(b->meter), EV_READ | EV_PERSIST, on_written, b);
        if (b->due == NULL || b->written == NULL || event_add(b->written, NULL) != 0)
            s = SM_ENOMEM;
    }
    if (s == SM_OK)
        s = sm_keys_load(l->door, l->setup->state, logs, &l->signer, l->key_note, ret_why);
    for (size_t i = 0; i < l->n && s == SM_OK; i++)
        sm_meter_signer(l->meter[i], l->signer, l->key_note);
    return s;
}

static enum sm_status make_events(struct sm_loop *l)
{
    static const struct timeval second = { 1, 0 };

    l->on_term = evsignal_new(l->base, SIGTERM, on_stop, l);
    l->on_int = evsignal_new(l->base, SIGINT, on_stop, l);
    l->on_hup = evsignal_new(l->base, SIGHUP, on_stop, l); /* its terminal is closed */
    l->second = event_new(l->base, -1, EV_PERSIST, on_second, l);
    if (l->on_term == NULL || l->on_int == NULL || l->on_hup == NULL || l->second == NULL ||
        event_add(l->on_term, NULL) != 0 || event_add(l->on_int, NULL) != 0 ||
        event_add(l->on_hup, NULL) != 0 || event_add(l->second, &second) != 0)
        return SM_ENOMEM;
    return SM_OK;
}

static enum sm_status make_hub(struct sm_loop *l, char ret_why[SM_WHY_SIZE])
{
    const struct sm_hub_about about = { l->base, l->door, l->meter, l->n, l, stamp, now_of, after };

    return sm_hub_create(&about, l->socket_path, &l->hub, ret_why);
}

enum sm_status sm_loop_create(const struct sm_door *door, const struct sm_setup *setup,
                              const char *socket_path, struct sm_loop **ret_loop,
                              char ret_why[SM_WHY_SIZE])
{
    struct sm_loop *l = calloc(1, sizeof *l);
    enum sm_status s = SM_ENOMEM;

    snprintf(ret_why, SM_WHY_SIZE, "no memory");
    if (l == NULL)
        return s;
    l->door = door;
    l->setup = setup;
    l->stopping_boot_ns = SM_NEVER;
    sm_text_copy(l->socket_path, sizeof l->socket_path, socket_path);
    sm_arithmetic(l->arithmetic);
    sm_clock_init(&l->clock, door);
    sm_notify_init(&l->notify);
    l->base = event_base_new();
    if (l->base != NULL) {
        s = sm_clock_stamp(&l->clock, &l->now);
        if (s != SM_OK)
            snprintf(ret_why, SM_WHY_SIZE, "the clock cannot be read");
    }
    if (s == SM_OK)
        s = make_events(l);
    if (s == SM_OK)
        s = make_meters(l, ret_why);
    if (s == SM_OK)
        s = make_hub(l, ret_why);
    if (s != SM_OK) {
        sm_loop_destroy(l);
        return s;
    }
    *ret_loop = l;
    return SM_OK;
}

enum sm_status sm_loop_run(struct sm_loop *l, char ret_why[SM_WHY_SIZE])
{
    stamp(l);
    l->started_boot_ns = l->now.boot_ns;
    for (size_t i = 0; i < l->n; i++)
        sm_meter_start(l->meter[i], &l->now);
    if (event_base_dispatch(l->base) < 0) {
        snprintf(ret_why, SM_WHY_SIZE, "the event loop failed");
        return SM_EIO;
    }
    for (size_t i = 0; i < l->n; i++) {
        if (sm_meter_closed_well(l->meter[i]))
            continue;
        snprintf(ret_why, SM_WHY_SIZE, "the log of %s could not be closed",
                 sm_meter_name(l->meter[i]));
        return SM_EIO;
    }
    return SM_OK;
}

static void free_event(struct event *e)
{
    if (e != NULL)
        event_free(e);
}

void sm_loop_destroy(struct sm_loop *l)
{
    if (l == NULL)
        return;
    sm_hub_destroy(l->hub);
    l->hub = NULL;
    for (size_t i = 0; i < l->n; i++) {
        sm_meter_destroy(l->meter[i]); /* lets go of its port: stops watching it */
        free_event(l->bound[i].port);
        free_event(l->bound[i].written);
        free_event(l->bound[i].due);
    }
    free_event(l->second);
    free_event(l->on_hup);
    free_event(l->on_int);
    free_event(l->on_term);
    sm_signer_destroy(l->signer);
    sm_notify_finish(&l->notify);
    if (l->base != NULL)
        event_base_free(l->base);
    free(l);
}
