/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter_log.c: entries into groups, groups to the writer, announced when they are on disk; and what
 * happens when they do not get there. */
#include <assert.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "meter_inside.h"

void sm_meter_trouble(struct sm_meter *m, const char *fmt, ...)
{
    va_list args;

    if (m->trouble[0] != '\0')
        return; /* the first is what counts */
    va_start(args, fmt);
    vsnprintf(m->trouble, sizeof m->trouble, fmt, args);
    va_end(args);
}

struct sm_text sm_meter_line(struct sm_meter *m)
{
    struct sm_text t;

    sm_text_init(&t, m->line, SM_ENTRY_MAX);
    return t;
}

void sm_meter_append(struct sm_meter *m, const struct sm_now *now, const struct sm_text *t,
                     bool held, int64_t answer)
{
    if (m->trouble[0] != '\0')
        return;
    if (t->cut) {
        sm_meter_trouble(m, "entry %lld is longer than an entry may be", (long long)m->n);
        return;
    }
    if (m->group == NULL) {
        m->group = sm_group_create();
        if (m->group == NULL) {
            sm_meter_trouble(m, "no memory");
            return;
        }
        m->group->epoch = m->epoch;
        m->group->since_boot_ns = now->boot_ns;
    }
    if (sm_group_add(m->group, t->buf, t->len, held, answer) != SM_OK) {
        sm_meter_trouble(m, "no memory");
        return;
    }
    sm_hasher_add(m->hasher, t->buf, t->len);
    m->unwritten += t->len;
    if (!held)
        m->about.hooks.line(m->about.hooks.ctx, m, t->buf, t->len);
}

static void hand_over(struct sm_meter *m)
{
    struct sm_group *g = m->group;

    m->group = NULL;
    g->next = NULL;
    *m->under_way_last = g;
    m->under_way_last = &g->next;
    if (sm_writer_group(m->writer, g) != SM_OK) {
        sm_meter_trouble(m, "no memory");
        m->under_way_last = &m->under_way;
        while (*m->under_way_last != g)
            m->under_way_last = &(*m->under_way_last)->next;
        *m->under_way_last = NULL;
        sm_group_destroy(g);
    }
}

void sm_meter_stamp(struct sm_meter *m, const struct sm_now *now, bool sign)
{
    char hash[SM_HASH_HEX], sig[SM_SIG_HEX];
    struct sm_text t;

    if (m->group == NULL || m->trouble[0] != '\0')
        return;
    sign = sign || m->group->durable || m->signed_boot_ns == SM_NEVER ||
           now->boot_ns - m->signed_boot_ns >= SIGN_NS;
    sm_hasher_take(m->hasher, hash);
    m->n++;
    if (sign && sm_signer_sign(m->about.signer, m->name, m->ordinal, m->n, hash, sig) != SM_OK) {
        sm_meter_trouble(m, "the stamp cannot be signed");
        return;
    }
    t = sm_meter_line(m);
    sm_entry_stamp(&t, m->n, m->last_t_ns, m->last_utc_us, m->stamp_from, hash, sign ? sig : NULL);
    sm_meter_append(m, now, &t, true, 0);
    if (m->trouble[0] != '\0')
        return;
    if (sign)
        m->signed_boot_ns = now->boot_ns;
    memcpy(m->last_stamp, hash, sizeof m->last_stamp);
    m->stamp_from = m->n + 1;
    hand_over(m);
}

void sm_meter_settle(struct sm_meter *m, const struct sm_now *now)
{
    if (m->group == NULL)
        return;
    if (m->group->durable || m->group->n >= GROUP_BYTES ||
        now->boot_ns - m->group->since_boot_ns >= GROUP_NS)
        sm_meter_stamp(m, now, false);
}

bool sm_meter_durable_waits(const struct sm_meter *m)
{
    if (m->group != NULL && m->group->durable)
        return true;
    for (const struct sm_group *g = m->under_way; g != NULL; g = g->next)
        if (g->durable)
            return true;
    return false;
}

/* On disk: what was held back may be told. */
static void announce(struct sm_meter *m, const struct sm_group *g)
{
    const struct sm_meter_hooks *h = &m->about.hooks;

    for (size_t i = 0; i < g->n_lines; i++) {
        const struct sm_group_line *l = &g->line[i];
        if (l->held)
            h->line(h->ctx, m, g->text + l->at, l->n);
        if (l->answer != 0)
            h->answer(h->ctx, m, l->answer, g->text + l->at, l->n);
    }
}

static void on_disk(struct sm_meter *m, const struct sm_group *g, const struct sm_now *now)
{
    if (g->begins[0] != '\0') {
        m->disk.before_ordinal = m->disk.ordinal;
        m->disk.before_bytes = m->disk.bytes;
        m->disk.ordinal = sm_file_ordinal(g->begins);
        m->disk.bytes = 0;
        snprintf(m->disk.path, sizeof m->disk.path, "%s/%s", m->folder.path, g->begins);
        if (m->missed.is || m->begun_with[0] != '\0')
            sm_say(m->name, "a new log file is begun: %s", m->begun_with);
        m->begun_with[0] = '\0';
        m->missed.is = false;
        m->missed.bytes = 0;
        if (m->log == LOG_BEGINNING)
            m->log = LOG_OPEN;
        m->tried = true;
    }
    m->disk.bytes += (int64_t)g->n;
    announce(m, g);
    if (g->ends && m->log == LOG_CLOSING) {
        m->log = LOG_CLOSED;
        m->closed_well = true;
    }
    if (m->log == LOG_OPEN)
        sm_meter_port_wake(m, now);
}

/* The groups come back in the order in which they went. */
static void take_back(struct sm_meter *m, struct sm_group *g)
{
    assert(g != NULL);
    if (m->under_way == g) {
        m->under_way = g->next;
        if (m->under_way == NULL)
            m->under_way_last = &m->under_way;
        m->unwritten -= g->n;
    }
}

static void on_group(struct sm_meter *m, struct sm_done *d, const struct sm_now *now)
{
    take_back(m, d->group);
    if (d->epoch == m->epoch && m->log != LOG_FAILED && m->log != LOG_RECOVERING) {
        if (d->good)
            on_disk(m, d->group, now);
        else {
            m->missed.bytes += d->group->raw_bytes;
            sm_meter_fail(m, now, d->why);
        }
    }
    sm_group_destroy(d->group);
}

static void on_recovered(struct sm_meter *m, struct sm_done *d, const struct sm_now *now)
{
    if (d->epoch != m->epoch || m->log != LOG_RECOVERING)
        sm_beginning_destroy(d->beginning);
    else if (d->good)
        sm_meter_begin(m, now, d->beginning);
    else
        sm_meter_fail(m, now, d->why);
}

void sm_meter_written(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_done d;

    while (sm_writer_next(m->writer, &d)) {
        if (d.kind == SM_DONE_GROUP)
            on_group(m, &d, now);
        else
            on_recovered(m, &d, now);
    }
    sm_meter_wake(m, now);
}

/* Bytes of the meter that were fed but are not known to be on disk. */
static uint64_t unsure_bytes(const struct sm_meter *m)
{
    uint64_t n = m->group != NULL ? m->group->raw_bytes : 0;

    for (const struct sm_group *g = m->under_way; g != NULL; g = g->next)
        n += g->raw_bytes;
    return n;
}

void sm_meter_fail(struct sm_meter *m, const struct sm_now *now, const char *why)
{
    const bool news = !m->missed.is || strcmp(m->missed.why, why) != 0;
    char told[SM_WHY_SIZE];

    sm_text_copy(told, sizeof told, why); /* may be m->trouble */
    if (!m->missed.is) {
        m->missed.from_utc_us = now->utc_us;
        m->missed.n = m->n;
        m->missed.ordinal = m->disk.ordinal;
        sm_text_copy(m->missed.first, sizeof m->missed.first, told);
    }
    m->missed.is = true;
    m->missed.bytes += unsure_bytes(m);
    sm_text_copy(m->missed.why, sizeof m->missed.why, told);
    if (news)
        sm_say(
            m->name,
            "the log is interrupted: %s. What the meter sends is shown, marked not logged, and a "
            "new file is tried every 2 s",
            told);
    sm_core_destroy(m->core);
    m->core = NULL;
    m->n_asks = 0;
    sm_group_destroy(m->group);
    m->group = NULL;
    m->under_way = NULL; /* the writer gives them back one by one */
    m->under_way_last = &m->under_way;
    m->unwritten = 0;
    m->trouble[0] = '\0';
    m->epoch++;
    sm_writer_abandon(m->writer, m->epoch);
    m->log = m->log == LOG_CLOSING ? LOG_CLOSED : LOG_FAILED;
    m->tried = true;
    m->log_retry_ns = now->boot_ns + LOG_RETRY_NS;
    m->about.hooks.lost(m->about.hooks.ctx, m, told);
    sm_meter_watch(m);
}

void sm_meter_disk(const struct sm_meter *m, struct sm_meter_disk *ret_disk)
{
    *ret_disk = m->disk;
}

static void shown_lines(const struct sm_group *g, void (*each)(void *, const char *, size_t),
                        void *arg)
{
    for (size_t i = 0; g != NULL && i < g->n_lines; i++)
        if (!g->line[i].held)
            each(arg, g->text + g->line[i].at, g->line[i].n);
}

void sm_meter_shown(const struct sm_meter *m, void (*each)(void *arg, const char *line, size_t n),
                    void *arg)
{
    for (const struct sm_group *g = m->under_way; g != NULL; g = g->next)
        shown_lines(g, each, arg);
    shown_lines(m->group, each, arg);
}
