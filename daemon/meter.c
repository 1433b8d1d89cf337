/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter.c: the meter's life, and the feeding and draining of its core. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "meter_inside.h"

enum sm_status sm_meter_create(const struct sm_meter_about *about, struct sm_meter **ret_meter,
                               char ret_why[SM_WHY_SIZE])
{
    struct sm_meter *m = calloc(1, sizeof *m);
    enum sm_status s = SM_ENOMEM;

    snprintf(ret_why, SM_WHY_SIZE, "no memory");
    if (m == NULL)
        return s;
    m->about = *about;
    m->name = about->meter->core.meter;
    m->under_way_last = &m->under_way;
    m->signed_boot_ns = SM_NEVER;
    sm_folder_init(&m->folder, about->door, about->setup->logs, m->name);
    m->line = malloc(SM_ENTRY_MAX);
    m->carried = malloc(sizeof *m->carried);
    m->sheet = malloc(sizeof *m->sheet);
    m->sheet_new = malloc(sizeof *m->sheet_new);
    if (m->line != NULL && m->carried != NULL && m->sheet != NULL && m->sheet_new != NULL &&
        sm_hasher_create(&m->hasher) == SM_OK)
        s = sm_folder_hold(&m->folder, ret_why);
    if (s == SM_OK) {
        s = sm_writer_create(&m->folder, &m->writer);
        if (s != SM_OK)
            snprintf(ret_why, SM_WHY_SIZE, "%s: no thread for its log", m->name);
    }
    if (s != SM_OK) {
        sm_meter_destroy(m);
        return s;
    }
    *ret_meter = m;
    return SM_OK;
}

void sm_meter_destroy(struct sm_meter *m)
{
    if (m == NULL)
        return;
    sm_meter_port_close(m);
    sm_core_destroy(m->core);
    sm_writer_destroy(m->writer); /* and the groups under way */
    sm_group_destroy(m->group);
    sm_folder_let_go(&m->folder);
    sm_hasher_destroy(m->hasher);
    free(m->sheet_text);
    free(m->sheet_new);
    free(m->sheet);
    free(m->carried);
    free(m->line);
    free(m);
}

int sm_meter_written_fd(const struct sm_meter *m)
{
    return sm_writer_fd(m->writer);
}

const char *sm_meter_name(const struct sm_meter *m)
{
    return m->name;
}

bool sm_meter_has_logs(const struct sm_meter *m)
{
    return sm_folder_has_logs(&m->folder);
}

void sm_meter_signer(struct sm_meter *m, const struct sm_signer *signer, const char *key_note)
{
    m->about.signer = signer;
    m->about.key_note = key_note;
}

void sm_meter_start(struct sm_meter *m, const struct sm_now *now)
{
    sm_meter_recover(m, now);
}

bool sm_meter_started(const struct sm_meter *m)
{
    return m->tried;
}

static void keep_ask(struct sm_meter *m, const struct sm_event *e)
{
    struct ask *a = &m->ask[m->n_asks];

    if (m->n_asks == ASKS_MAX) {
        sm_meter_trouble(m, "the core asks more than %d questions at once", ASKS_MAX);
        return;
    }
    m->n_asks++;
    a->n = e->n;
    a->text_n = e->u.ask.n;
    memcpy(a->text, e->u.ask.text, e->u.ask.n);
}

/* An answer to the act being fed: the sheet that was taken on is kept for the next file. */
static int64_t answered(struct sm_meter *m, const struct sm_event *e)
{
    const struct sm_act *a = m->act;

    if (a != NULL && a->act == SM_ACT_SHEET && a->sheet != NULL && e->u.answer.done)
        sm_meter_keep_sheet(m, a->sheet_file, a->sheet_text, a->sheet_text_n);
    return e->u.answer.act;
}

static void show_live(struct sm_meter *m, const struct sm_event *e)
{
    struct sm_text t = sm_meter_line(m);

    sm_entry_event(&t, e);
    m->about.hooks.live(m->about.hooks.ctx, m, sm_event_kind_name(e->kind), t.buf, t.len);
}

static void take_event(struct sm_meter *m, const struct sm_now *now, const struct sm_event *e)
{
    const enum sm_event_class class = sm_event_class(e->kind);
    int64_t answer = 0;
    struct sm_text t;

    if (class == SM_LIVE) {
        show_live(m, e);
        return;
    }
    m->n = e->n;
    if (e->kind == SM_EVENT_ASK)
        keep_ask(m, e);
    if (e->kind == SM_EVENT_ANSWER)
        answer = answered(m, e);
    t = sm_meter_line(m);
    sm_entry_event(&t, e);
    /* `carried` tells of the durable events before it, so it waits with them */
    sm_meter_append(m, now, &t, class == SM_DURABLE || e->kind == SM_EVENT_CARRIED, answer);
    if (m->group != NULL && class == SM_DURABLE)
        m->group->durable = true;
}

void sm_meter_feed(struct sm_meter *m, const struct sm_now *now, struct sm_input *in)
{
    const struct sm_event *e;
    struct sm_text t;
    enum sm_status s;

    if (m->core == NULL || m->trouble[0] != '\0')
        return;
    if (!sm_meter_durable_waits(m)) {
        sm_core_status(m->core, &m->shown);
        m->shown_n = m->n;
    }
    in->n = ++m->n;
    in->t_ns = now->boot_ns - m->opened_boot_ns;
    in->utc_us = now->utc_us;
    in->chunk.t_ns = in->t_ns;
    m->last_t_ns = in->t_ns;
    m->last_utc_us = in->utc_us;
    t = sm_meter_line(m);
    sm_entry_input(&t, in);
    sm_meter_append(m, now, &t, false, 0);
    s = sm_core_feed(m->core, in);
    if (s != SM_OK) {
        sm_meter_trouble(m, "the core refused entry %lld: %s", (long long)in->n, sm_status_text(s));
        return;
    }
    while (sm_core_next(m->core, &e))
        take_event(m, now, e);
}

static void feed_clock(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_input in = { .kind = SM_INPUT_CLOCK };

    if (now->asleep_us != 0) {
        in.clock_what = SM_CLOCK_SUSPEND;
        in.clock_by_us = now->asleep_us;
        sm_meter_feed(m, now, &in);
    }
    if (now->jump_us != 0) {
        in.clock_what = SM_CLOCK_JUMP;
        in.clock_by_us = now->jump_us;
        sm_meter_feed(m, now, &in);
    }
}

static void feed_tick(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_input in = { .kind = SM_INPUT_TICK };

    if (m->core != NULL && m->log == LOG_OPEN && m->trouble[0] == '\0' &&
        sm_core_deadline(m->core) <= now->boot_ns - m->opened_boot_ns)
        sm_meter_feed(m, now, &in);
}

static int64_t oldest_unwritten(const struct sm_meter *m)
{
    const struct sm_group *g = m->under_way != NULL ? m->under_way : m->group;

    return g != NULL ? g->since_boot_ns : SM_NEVER;
}

static void check_log(struct sm_meter *m, const struct sm_now *now)
{
    const int64_t since = oldest_unwritten(m);

    if (m->unwritten > UNWRITTEN_BYTES)
        sm_meter_trouble(m, "more than 8 MiB wait to be written");
    else if (since != SM_NEVER && now->boot_ns - since > UNWRITTEN_NS)
        sm_meter_trouble(m, "the disk has taken nothing for 10 s");
    if (m->trouble[0] != '\0' && m->log != LOG_FAILED && m->log != LOG_CLOSED)
        sm_meter_fail(m, now, m->trouble);
    m->trouble[0] = '\0';
    if (m->log == LOG_FAILED && now->boot_ns >= m->log_retry_ns)
        sm_meter_recover(m, now);
}

void sm_meter_clock(struct sm_meter *m, const struct sm_now *now)
{
    if (m->log == LOG_OPEN)
        feed_clock(m, now);
}

void sm_meter_wake(struct sm_meter *m, const struct sm_now *now)
{
    feed_tick(m, now);
    sm_meter_ask(m, now);
    if (m->log == LOG_OPEN) {
        sm_meter_settle(m, now);
        sm_meter_roll_if_due(m, now);
    }
    check_log(m, now);
    sm_meter_port_wake(m, now);
}

static int64_t sooner(int64_t a, int64_t b)
{
    return a < b ? a : b;
}

int64_t sm_meter_due(const struct sm_meter *m)
{
    int64_t due = SM_NEVER;

    if (m->log == LOG_OPEN && m->core != NULL) {
        const int64_t tick = sm_core_deadline(m->core);
        if (tick != SM_NEVER)
            due = sooner(due, m->opened_boot_ns + tick);
        if (m->group != NULL)
            due = sooner(due, m->group->since_boot_ns + GROUP_NS);
    }
    if (m->log == LOG_FAILED)
        due = sooner(due, m->log_retry_ns);
    if ((m->log == LOG_OPEN || m->log == LOG_FAILED) && m->port == NULL)
        due = sooner(due, m->port_retry_ns);
    return due;
}

void sm_meter_stop(struct sm_meter *m, const struct sm_now *now)
{
    sm_meter_port_close(m);
    if ((m->log == LOG_OPEN || m->log == LOG_BEGINNING) && m->core != NULL) {
        m->log = LOG_CLOSING;
        sm_meter_close_file(m, now, "stopped");
        check_log(m, now);
    } else if (m->log != LOG_CLOSING) {
        m->closed_well = !m->missed.is; /* no file is open */
        m->log = LOG_CLOSED;
    }
}

bool sm_meter_idle(const struct sm_meter *m)
{
    return m->log != LOG_RECOVERING && m->under_way == NULL;
}

bool sm_meter_stopped(const struct sm_meter *m)
{
    return m->log == LOG_CLOSED;
}

bool sm_meter_closed_well(const struct sm_meter *m)
{
    return m->closed_well;
}
