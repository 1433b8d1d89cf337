/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_maker.c: see log_maker.h. */
#include "log_maker.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "record/arithmetic.h"
#include "source_disk.h"

/* As in the daemon: entries are synced within this, groups signed at least so often. */
#define GROUP_NS SM_NS_PER_S
#define GROUP_BYTES (64u * 1024u)
#define SIGN_NS (14 * 60 * SM_NS_PER_S)
#define BLAMES 8

/* By its name from the source tree, so that a log does not depend on where that lies. */
static void load_setup(struct log_maker *m, const char *setup_file, const char *meter)
{
    char line[1024];
    struct sm_disk disk;
    struct sm_source source;
    struct sm_blame list[BLAMES];
    struct sm_blames blames;

    assert_int_equal(chdir(SM_SOURCE_DIR), 0);
    sm_source_disk(&disk, setup_file, &source);
    sm_blames_init(&blames, list, BLAMES);
    if (sm_setup_load(&source, setup_file, &m->setup, &blames) != SM_OK) {
        sm_blame_write(&blames.list[0], line, sizeof line);
        fail_msg("%s: %s", setup_file, blames.n > 0 ? line : "cannot be read");
    }
    for (size_t i = 0; i < m->setup->n_meters; i++) {
        if (strcmp(m->setup->meter[i].core.meter, meter) == 0)
            m->core_setup = &m->setup->meter[i].core;
    }
    if (m->core_setup == NULL)
        fail_msg("%s: no meter %s", setup_file, meter);
}

void log_maker_prepare(struct log_maker *m, const char *setup_file, const char *meter,
                       int64_t utc_us)
{
    unsigned char seed[32];

    memset(m, 0, sizeof *m);
    load_setup(m, setup_file, meter);
    memset(seed, 9, sizeof seed); /* a key to throw away */
    assert_int_equal(sm_signer_create(seed, &m->signer), SM_OK);
    assert_int_equal(sm_hasher_create(&m->hasher), SM_OK);
    sm_signer_public(m->signer, m->key);
    sm_arithmetic(m->arithmetic);
    m->line = malloc(SM_ENTRY_MAX);
    m->sheet = calloc(1, sizeof *m->sheet);
    m->carried = calloc(1, sizeof *m->carried);
    m->stated = calloc(1, sizeof *m->stated);
    assert_true(m->line && m->sheet && m->carried && m->stated);
    sm_carried_init(m->carried);
    m->begin_utc_us = utc_us;
    m->ordinal = 1;
}

static struct sm_text line(struct log_maker *m)
{
    struct sm_text t;

    sm_text_init(&t, m->line, SM_ENTRY_MAX);
    return t;
}

static int64_t t_now(const struct log_maker *m)
{
    return m->now_ns - m->opened_ns;
}

static int64_t utc_now(const struct log_maker *m)
{
    return m->begin_utc_us + m->now_ns / 1000;
}

/* At its end, not more. */
static void put(struct log_maker *m, const struct sm_text *t)
{
    struct log_maker_file *f = &m->file[m->n_files - 1];

    assert_false(t->cut);
    if (f->cap - f->n < t->len) {
        f->cap = 2 * (f->cap + t->len);
        f->text = realloc(f->text, f->cap);
        assert_non_null(f->text);
    }
    memcpy(f->text + f->n, t->buf, t->len);
    f->n += t->len;
}

/* One more entry of the group. */
static void append(struct log_maker *m, const struct sm_text *t)
{
    if (m->group_n == 0)
        m->group_ns = m->now_ns;
    m->group_n += t->len;
    put(m, t);
    sm_hasher_add(m->hasher, t->buf, t->len);
}

static void stamp(struct log_maker *m, bool sign)
{
    char sig[SM_SIG_HEX];
    struct sm_text t = line(m);

    if (m->group_n == 0 || m->unstamped)
        return;
    sign = sign || m->group_durable || m->now_ns - m->signed_ns >= SIGN_NS;
    sm_hasher_take(m->hasher, m->last_stamp);
    m->n++;
    if (sign)
        assert_int_equal(
            sm_signer_sign(m->signer, m->core_setup->meter, m->ordinal, m->n, m->last_stamp, sig),
            SM_OK);
    sm_entry_stamp(&t, m->n, m->last_t_ns, m->last_utc_us, m->stamp_from, m->last_stamp,
                   sign ? sig : NULL);
    put(m, &t);
    sm_hasher_add(m->hasher, t.buf, t.len); /* the next hash begins with this line */
    if (sign)
        m->signed_ns = m->now_ns;
    m->stamp_from = m->n + 1;
    m->group_n = 0;
    m->group_durable = false;
}

static void start_core(struct log_maker *m, const struct sm_sheet *sheet)
{
    char why[SM_REASON_SIZE] = "";

    if (sm_core_start(m->core_setup, m->carried, sheet, &m->core, why) != SM_OK)
        fail_msg("the core does not start: %s", why);
}

static void append_files(struct log_maker *m)
{
    for (size_t i = 0; i < m->setup->n_files; i++) {
        const struct sm_setup_file *f = &m->setup->files[i];
        struct sm_text t = line(m);

        sm_entry_file(&t, ++m->n, utc_now(m), f->name, f->text, f->n, false);
        append(m, &t);
    }
    if (m->sheet_text != NULL) {
        struct sm_text t = line(m);

        sm_entry_file(&t, ++m->n, utc_now(m), m->sheet_file, m->sheet_text, m->sheet_text_n, true);
        append(m, &t);
    }
}

/* A new file, begun from m->carried. */
static void open_file(struct log_maker *m, const char *how, int64_t aged_ns,
                      const struct sm_sheet *sheet)
{
    struct sm_entry_open o = { .how = how, .aged_ns = aged_ns, .key_note = "", .missed = "" };
    struct sm_text t = line(m);

    start_core(m, sheet);
    m->opened_ns = m->now_ns;
    m->last_t_ns = 0;
    m->last_utc_us = utc_now(m);
    *m->stated = *m->carried;
    m->carried_ns = m->now_ns;
    if (m->unlogged)
        return;
    m->file = realloc(m->file, (m->n_files + 1) * sizeof *m->file);
    assert_non_null(m->file);
    m->file[m->n_files++] = (struct log_maker_file){ 0 };
    sm_hasher_destroy(m->hasher); /* begins anew */
    assert_int_equal(sm_hasher_create(&m->hasher), SM_OK);
    o.previous.has = m->ordinal > 1;
    o.previous.ordinal = m->ordinal - 1;
    memcpy(o.previous.stamp, m->last_stamp, sizeof o.previous.stamp);
    m->stamp_from = ++m->n;
    o.n = m->n;
    o.utc_us = utc_now(m);
    o.program = SM_VERSION;
    o.arithmetic = m->unstamped ? "" : m->arithmetic;
    o.key = m->unstamped ? "" : m->key;
    o.meter = m->core_setup->meter;
    o.ordinal = m->ordinal;
    o.carried = m->carried;
    sm_entry_open(&t, &o);
    append(m, &t);
    append_files(m);
    stamp(m, true);
}

static void keep_ask(struct log_maker *m, const struct sm_event *e)
{
    assert_true(m->n_asks < COUNT(m->ask));
    m->ask[m->n_asks].n = e->n;
    m->ask[m->n_asks].text_n = e->u.ask.n;
    memcpy(m->ask[m->n_asks++].text, e->u.ask.text, e->u.ask.n);
}

static void take_event(struct log_maker *m, const struct sm_event *e)
{
    if (m->event != NULL)
        m->event(m->arg, m, e);
    if (sm_event_class(e->kind) == SM_LIVE)
        return;
    m->n = e->n;
    if (e->kind == SM_EVENT_ASK)
        keep_ask(m, e);
    if (e->kind == SM_EVENT_CARRIED) {
        *m->stated = *e->u.carried;
        m->carried_ns = m->now_ns;
    }
    if (e->kind == SM_EVENT_ANSWER) {
        m->done = e->u.answer.done;
        sm_text_copy(m->why, sizeof m->why, e->u.answer.why);
    }
    if (sm_event_class(e->kind) == SM_DURABLE) {
        m->group_durable = true;
        m->newest_durable_n = e->n;
    }
    if (!m->unlogged) {
        struct sm_text t = line(m);

        sm_entry_event(&t, e);
        append(m, &t);
    }
}

static void feed(struct log_maker *m, struct sm_input *in)
{
    const struct sm_event *e;
    enum sm_status s;

    in->n = ++m->n;
    in->t_ns = m->last_t_ns = t_now(m);
    in->utc_us = m->last_utc_us = utc_now(m);
    in->chunk.t_ns = in->t_ns;
    if (!m->unlogged) {
        struct sm_text t = line(m);

        sm_entry_input(&t, in);
        append(m, &t);
    }
    s = sm_core_feed(m->core, in);
    if (s != SM_OK)
        fail_msg("input %lld (%s): %s", (long long)in->n, sm_input_kind_name(in->kind),
                 sm_status_text(s));
    while (sm_core_next(m->core, &e))
        take_event(m, e);
    assert_int_equal(sm_core_last_n(m->core), m->n);
}

/* What the shell does when it has fed: questions out, the group closed where it is time. */
static void settle(struct log_maker *m, struct sm_sim *sim)
{
    for (size_t i = 0; i < m->n_asks; i++) {
        struct sm_input in = { .kind = SM_INPUT_SENT, .sent_of = m->ask[i].n };

        if (!m->link_is_up)
            continue;
        feed(m, &in);
        if (sim != NULL)
            sm_sim_ask(sim, m->now_ns, m->ask[i].text, m->ask[i].text_n);
    }
    m->n_asks = 0;
    if (m->group_durable || m->group_n >= GROUP_BYTES || m->now_ns - m->group_ns >= GROUP_NS)
        stamp(m, false);
}

/* When the next tick is due, in time of the session. */
static int64_t tick_due(const struct log_maker *m)
{
    const int64_t due = sm_core_deadline(m->core);

    return due > SM_NEVER - m->opened_ns ? SM_NEVER : m->opened_ns + due;
}

static void tick(struct log_maker *m, struct sm_sim *sim, int64_t at_ns)
{
    struct sm_input in = { .kind = SM_INPUT_TICK };

    if (at_ns > m->now_ns)
        m->now_ns = at_ns;
    feed(m, &in);
    settle(m, sim);
}

void log_maker_until(struct log_maker *m, struct sm_sim *sim, int64_t t_ns)
{
    int64_t due;

    while ((due = tick_due(m)) <= t_ns)
        tick(m, sim, due);
    if (t_ns != SM_NEVER && t_ns > m->now_ns)
        m->now_ns = t_ns;
}

void log_maker_bytes(struct log_maker *m, const void *bytes, size_t n)
{
    struct sm_input in = { .kind = SM_INPUT_BYTES };

    in.chunk.bytes = bytes;
    in.chunk.n = n;
    feed(m, &in);
}

static void feed_link(struct log_maker *m, bool up, bool continues, const char *why)
{
    struct sm_input in = { .kind = SM_INPUT_LINK };

    in.link.state = up ? SM_LINK_UP : SM_LINK_LOST;
    in.link.continues = continues;
    sm_text_copy(in.link.why, sizeof in.link.why, why);
    sm_text_copy(in.link.port, sizeof in.link.port, "simulated");
    m->link_is_up = up;
    feed(m, &in);
}

void log_maker_link(struct log_maker *m, bool up, const char *why)
{
    feed_link(m, up, false, why);
    settle(m, NULL);
}

void log_maker_open(struct log_maker *m)
{
    open_file(m, "first", 0, NULL);
    log_maker_link(m, true, "");
}

void log_maker_begin(struct log_maker *m, const char *setup_file, const char *meter, int64_t utc_us)
{
    log_maker_prepare(m, setup_file, meter, utc_us);
    log_maker_open(m);
}

void log_maker_feed_act(struct log_maker *m, struct sm_input *in)
{
    snprintf(in->act.id, sizeof in->act.id, "made-%u", ++m->acts);
    in->act.has_seen = true;
    in->act.seen = m->newest_durable_n;
    sm_text_copy(in->act.door, sizeof in->act.door, "test");
    feed(m, in);
    settle(m, NULL);
}

void log_maker_act(struct log_maker *m, enum sm_act_kind act, const char *text)
{
    struct sm_input in = { .kind = SM_INPUT_ACT };

    in.act.act = act;
    sm_text_copy(in.act.text, sizeof in.act.text, text);
    sm_text_copy(in.act.why, sizeof in.act.why, text);
    log_maker_feed_act(m, &in);
    if (!m->done)
        fail_msg("act %s refused: %s", sm_act_name(act), m->why);
}

void log_maker_sheet(struct log_maker *m, const char *file, const char *text, size_t n)
{
    struct sm_input in = { .kind = SM_INPUT_ACT };
    struct sm_blame list[BLAMES];
    struct sm_blames blames;

    sm_blames_init(&blames, list, BLAMES);
    in.act.act = SM_ACT_SHEET;
    sm_text_copy(in.act.sheet_file, sizeof in.act.sheet_file, file);
    in.act.sheet_text = text;
    in.act.sheet_text_n = n;
    if (sm_sheet_load(m->setup, file, text, n, m->sheet, &blames) == SM_OK)
        in.act.sheet = m->sheet;
    else
        sm_blame_write(&blames.list[0], in.act.sheet_why, sizeof in.act.sheet_why);
    log_maker_feed_act(m, &in);
    if (!m->done)
        fail_msg("sheet refused: %s", m->why);
    free(m->sheet_text);
    m->sheet_text = malloc(n + 1);
    assert_non_null(m->sheet_text);
    memcpy(m->sheet_text, text, n);
    m->sheet_text[n] = '\0';
    m->sheet_text_n = n;
    sm_text_copy(m->sheet_file, sizeof m->sheet_file, file);
}

/* False: the scenario is over. */
static bool sim_says(struct log_maker *m, struct sm_sim *sim)
{
    char buf[512];
    int64_t t_ns;
    size_t n = 0;

    switch (sm_sim_next(sim, &t_ns, buf, sizeof buf, &n)) {
    case SM_SIM_BYTES:
        if (m->link_is_up)
            log_maker_bytes(m, buf, n);
        break;
    case SM_SIM_DOWN:
        feed_link(m, false, false, "unplugged");
        break;
    case SM_SIM_UP:
        feed_link(m, true, false, "");
        break;
    case SM_SIM_STEP:
    case SM_SIM_QUIET:
        break;
    case SM_SIM_END:
        return false;
    }
    settle(m, sim);
    return true;
}

bool log_maker_step(struct log_maker *m, struct sm_sim *sim, int64_t until_ns)
{
    const int64_t sim_due = sm_sim_due(sim), due = tick_due(m);

    if (due <= sim_due && due <= until_ns) { /* a tick that is due comes before the bytes */
        tick(m, sim, due);
        return true;
    }
    if (sim_due > until_ns) {
        log_maker_until(m, sim, until_ns);
        return false;
    }
    if (sim_due < m->now_ns) { /* from while the program was stopped */
        char unheard[512];
        int64_t t_ns;
        size_t n;

        return sm_sim_next(sim, &t_ns, unheard, sizeof unheard, &n) != SM_SIM_END;
    }
    m->now_ns = sim_due;
    return sim_says(m, sim);
}

void log_maker_play(struct log_maker *m, struct sm_sim *sim, int64_t until_ns)
{
    while (log_maker_step(m, sim, until_ns))
        ;
}

void log_maker_end(struct log_maker *m)
{
    if (!m->unlogged) {
        struct sm_text t = line(m);

        m->last_t_ns = t_now(m);
        m->last_utc_us = utc_now(m);
        sm_entry_close(&t, ++m->n, m->last_t_ns, m->last_utc_us, "stopped");
        append(m, &t);
        stamp(m, true);
    }
    sm_core_destroy(m->core);
    m->core = NULL;
}

/* The sheet in force, for the next core; NULL: none. */
static const struct sm_sheet *keep_sheet(struct log_maker *m)
{
    const struct sm_sheet *s = sm_core_sheet(m->core);

    if (s == NULL)
        return NULL;
    *m->sheet = *s;
    return m->sheet;
}

void log_maker_roll(struct log_maker *m)
{
    struct sm_input in = { .kind = SM_INPUT_ROLL };
    const struct sm_sheet *sheet;

    assert_true(sm_core_may_roll(m->core));
    feed(m, &in);
    sm_core_carried(m->core, m->carried);
    sheet = keep_sheet(m);
    log_maker_end(m);
    m->ordinal++;
    open_file(m, "rollover", 0, sheet);
    if (m->link_is_up)
        feed_link(m, true, true, "");
    settle(m, NULL);
}

void log_maker_restart(struct log_maker *m, int64_t gap_ns)
{
    const struct sm_sheet *sheet = keep_sheet(m);
    const int64_t carried_ns = m->carried_ns;

    *m->carried = *m->stated;
    log_maker_end(m);
    sm_carried_interrupt(m->carried);
    m->now_ns += gap_ns;
    sm_carried_age(m->carried, m->now_ns - carried_ns);
    m->ordinal++;
    open_file(m, "start", m->now_ns - carried_ns, sheet);
    log_maker_link(m, true, "");
}

void log_maker_finish(struct log_maker *m)
{
    sm_core_destroy(m->core);
    sm_setup_destroy(m->setup);
    sm_signer_destroy(m->signer);
    sm_hasher_destroy(m->hasher);
    for (size_t i = 0; i < m->n_files; i++)
        free(m->file[i].text);
    free(m->file);
    free(m->sheet_text);
    free(m->sheet);
    free(m->carried);
    free(m->stated);
    free(m->line);
    memset(m, 0, sizeof *m);
}
