/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter_port.c: the meter's port: opened again and again for ever, read, asked, lost. */
#include <stdio.h>
#include <string.h>

#include "meter_inside.h"
#include "record/json.h"

void sm_meter_watch(struct sm_meter *m)
{
    const bool want = m->port != NULL && m->unwritten < HOLD_BACK_BYTES &&
                      (m->log == LOG_OPEN || m->log == LOG_FAILED || m->log == LOG_RECOVERING);

    if (want == m->watched)
        return;
    m->watched = want;
    m->about.hooks.watch(m->about.hooks.ctx, m, want ? sm_port_fd(m->port) : -1);
}

void sm_meter_port_close(struct sm_meter *m)
{
    if (m->port == NULL)
        return;
    if (m->watched)
        m->about.hooks.watch(m->about.hooks.ctx, m, -1);
    m->watched = false;
    sm_port_close(m->port);
    m->port = NULL;
}

void sm_meter_feed_link(struct sm_meter *m, const struct sm_now *now, bool continues)
{
    struct sm_input in = { .kind = SM_INPUT_LINK, .link = m->link };

    in.link.continues = continues;
    sm_meter_feed(m, now, &in);
}

void sm_meter_port_lost(struct sm_meter *m, const struct sm_now *now, const char *why)
{
    sm_meter_port_close(m);
    m->link.state = SM_LINK_LOST;
    sm_text_copy(m->link.why, sizeof m->link.why, why);
    sm_say(m->name, "the port is lost: %s", why);
    sm_meter_feed_link(m, now, false);
    m->port_wait_ns = PORT_RETRY_FIRST_NS;
    m->port_retry_ns = now->boot_ns + m->port_wait_ns;
}

static void try_open(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_link link;
    enum sm_status s;
    bool news;

    memset(&link, 0, sizeof link);
    s = sm_port_open(m->about.door, &m->about.meter->port, m->identity, &m->port, &link);
    news = !m->has_link || link.state != m->link.state || strcmp(link.why, m->link.why) != 0;
    m->has_link = true;
    if (s == SM_OK) {
        m->link = link;
        if (link.identity[0] != '\0')
            memcpy(m->identity, link.identity, sizeof m->identity);
        m->port_wait_ns = 0;
        m->port_retry_ns = SM_NEVER;
        sm_say(m->name, "listening on %s, %s%s%s", link.device, link.settings,
               link.why[0] != '\0' ? ": " : "", link.why);
        sm_meter_feed_link(m, now, false);
        return;
    }
    m->port = NULL;
    m->port_wait_ns = m->port_wait_ns == 0 ? PORT_RETRY_FIRST_NS : 2 * m->port_wait_ns;
    if (m->port_wait_ns > PORT_RETRY_NS)
        m->port_wait_ns = PORT_RETRY_NS;
    m->port_retry_ns = now->boot_ns + m->port_wait_ns;
    if (!news)
        return;
    m->link = link;
    sm_say(m->name, "no port: %s", link.why);
    sm_meter_feed_link(m, now, false);
}

void sm_meter_port_wake(struct sm_meter *m, const struct sm_now *now)
{
    if ((m->log == LOG_OPEN || m->log == LOG_FAILED) && m->port == NULL &&
        now->boot_ns >= m->port_retry_ns)
        try_open(m, now);
    sm_meter_watch(m);
}

/* While the log cannot be written: shown, marked, counted. */
static void show_raw(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_text t = sm_meter_line(m);

    m->missed.bytes += m->bytes.n;
    sm_json_head(&t, 0, 0, now->utc_us, "raw");
    sm_json_bytes(&t, "b", m->bytes.bytes, m->bytes.n);
    sm_json_text(&t, "note", "not logged");
    sm_json_end(&t);
    m->about.hooks.live(m->about.hooks.ctx, m, "raw", t.buf, t.len);
}

static void feed_bytes(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_input in = { .kind = SM_INPUT_BYTES };

    if (m->core == NULL) {
        show_raw(m, now);
        return;
    }
    in.chunk.bytes = m->bytes.bytes;
    in.chunk.n = m->bytes.n;
    in.chunk.bad = m->bytes.bad;
    in.chunk.n_bad = m->bytes.n_bad;
    sm_meter_feed(m, now, &in);
    if (m->group != NULL)
        m->group->raw_bytes += m->bytes.n;
}

void sm_meter_readable(struct sm_meter *m, const struct sm_now *now)
{
    char why[SM_LINK_TEXT_SIZE] = "";

    sm_meter_wake(m, now); /* a tick that is due comes before the bytes */
    for (int i = 0; i < READS_AT_ONCE && m->port != NULL && m->watched; i++) {
        const enum sm_port_got got = sm_port_read(m->port, &m->bytes, why);
        if (got == SM_PORT_NOTHING)
            break;
        if (got == SM_PORT_LOST) {
            sm_meter_port_lost(m, now, why);
            break;
        }
        feed_bytes(m, now);
        if (m->trouble[0] != '\0')
            break;
    }
    sm_meter_wake(m, now);
}

void sm_meter_ask(struct sm_meter *m, const struct sm_now *now)
{
    char why[SM_LINK_TEXT_SIZE] = "";

    while (m->n_asks > 0 && m->core != NULL && m->trouble[0] == '\0') {
        const struct ask a = m->ask[0];
        struct sm_input in = { .kind = SM_INPUT_SENT, .sent_of = a.n };
        m->n_asks--;
        memmove(m->ask, m->ask + 1, m->n_asks * sizeof *m->ask);
        if (m->port == NULL)
            continue;
        if (sm_port_write(m->port, a.text, a.text_n, why) == SM_OK)
            sm_meter_feed(m, now, &in);
        else
            sm_meter_port_lost(m, now, why);
    }
}
