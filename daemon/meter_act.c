/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter_act.c: what people tell a meter, and what it answers when asked how it is. */
#include <stdio.h>
#include <string.h>

#include "meter_inside.h"
#include "record/json.h"
#include "view/sentence.h"

/* "morning.yaml:3:5: …; …", as many as fit. */
static void write_blames(const struct sm_blames *b, char *out, size_t cap)
{
    char one[SM_BLAME_SIZE + SM_PATH_SIZE + 32];
    struct sm_text t;

    sm_text_init(&t, out, cap);
    for (size_t i = 0; i < b->n; i++) {
        sm_blame_write(&b->list[i], one, sizeof one);
        if (t.len + strlen(one) + 24 > cap && i > 0) {
            sm_text_addf(&t, "; and %zu more", b->n - i + b->left_out);
            return;
        }
        sm_text_addf(&t, "%s%s", i > 0 ? "; " : "", one);
    }
    if (b->left_out > 0)
        sm_text_addf(&t, "; and %zu more", b->left_out);
}

static void read_sheet(struct sm_meter *m, struct sm_act *act)
{
    struct sm_blame list[8];
    struct sm_blames blames;

    sm_blames_init(&blames, list, sizeof list / sizeof list[0]);
    if (sm_sheet_load(m->about.setup, act->sheet_file, act->sheet_text, act->sheet_text_n,
                      m->sheet_new, &blames) == SM_OK)
        act->sheet = m->sheet_new;
    else
        write_blames(&blames, act->sheet_why, sizeof act->sheet_why);
}

enum sm_status sm_meter_act(struct sm_meter *m, const struct sm_now *now, struct sm_act *act,
                            int64_t *ret_n, char ret_why[SM_WHY_SIZE])
{
    struct sm_input in = { .kind = SM_INPUT_ACT };

    sm_meter_wake(m, now);
    if (m->core == NULL || m->log != LOG_OPEN) {
        snprintf(ret_why, SM_WHY_SIZE,
                 "the log of %s cannot be written now%s%.400s; nothing was done", m->name,
                 m->missed.is ? ": " : "", m->missed.is ? m->missed.why : "");
        return SM_EIO;
    }
    if (act->act == SM_ACT_SHEET)
        read_sheet(m, act);
    in.act = *act;
    m->act = act;
    sm_meter_feed(m, now, &in);
    m->act = NULL;
    *ret_n = in.n;
    return SM_OK;
}

static void write_where(struct sm_text *t, const char *key, const struct sm_whereabouts *w)
{
    if (!w->has)
        return;
    sm_json_object(t, key);
    sm_json_int(t, "run", w->run);
    sm_json_size(t, "item", w->item);
    sm_json_text(t, "kind", sm_item_kind_name(w->kind));
    sm_json_text(t, "name", w->name);
    sm_json_close_object(t);
}

static void write_bench(struct sm_text *t, const struct sm_core_status *s)
{
    write_where(t, "now", &s->now);
    write_where(t, "next", &s->next);
    if (s->has_sheet) {
        sm_json_int(t, "run", s->run);
        sm_json_size(t, "items", s->items);
        sm_json_size(t, "measured", s->measured);
        sm_json_bool(t, "sheet_done", s->sheet_done);
    }
    if (s->last.has) {
        sm_json_object(t, "last");
        sm_json_int(t, "capture", s->last.n);
        sm_json_text(t, "name", s->last.name);
        sm_json_real(t, "value", s->last.value);
        sm_json_real(t, "expanded_uncertainty", s->last.u95);
        sm_json_words(t, "unit", sm_unit_name(s->signal_unit));
        sm_json_close_object(t);
    }
    if (s->curve_accepted || s->curve_refused)
        sm_json_text(t, "curve", s->curve_accepted ? "accepted" : "refused");
    sm_json_size(t, "provisional", s->provisional);
    sm_json_size(t, "held", s->held);
    sm_json_size(t, "questions", s->questions);
    sm_json_size(t, "since_check", s->since_check);
    sm_json_words(t, "analyst", s->on_duty);
    if (s->caution != NULL)
        sm_json_text(t, "caution", s->caution);
    if (s->method_note != NULL)
        sm_json_words(t, "method_note", s->method_note);
}

static void write_core(struct sm_meter *m, const struct sm_now *now, struct sm_text *t)
{
    const int64_t t_ns = now->boot_ns - m->opened_boot_ns;
    struct sm_core_status fresh;
    const struct sm_core_status *s = &fresh;
    char sentence_buf[1024];
    struct sm_text sentence;

    /* what is not on disk yet is not told here either */
    if (sm_meter_durable_waits(m)) {
        s = &m->shown;
    } else {
        sm_core_status(m->core, &fresh);
        m->shown_n = m->n;
    }
    sm_text_init(&sentence, sentence_buf, sizeof sentence_buf);
    sm_sentence(s, t_ns, &sentence);
    sm_json_int(t, "seen", m->shown_n);
    sm_json_text(t, "state", sm_bench_state_name(s->state));
    sm_json_int(t, "since", s->since_t_ns);
    sm_json_text(t, "sentence", sentence.buf);
    if (s->latest.has) {
        sm_json_real(t, "latest", s->latest.value);
        sm_json_words(t, "unit", sm_unit_name(s->signal_unit));
    }
    write_bench(t, s);
    sm_json_int(t, "unread", (int64_t)s->unread);
}

void sm_meter_status(struct sm_meter *m, const struct sm_now *now, size_t meters, struct sm_text *t)
{
    sm_json_head(t, 0, m->core != NULL ? now->boot_ns - m->opened_boot_ns : 0, now->utc_us,
                 "status");
    sm_json_text(t, "meter", m->name);
    sm_json_size(t, "meters", meters);
    sm_json_bool(t, "logging", m->log == LOG_OPEN);
    if (m->missed.is) {
        char from[SM_UTC_SIZE];
        sm_utc_write(from, m->missed.from_utc_us);
        sm_json_object(t, "not_logged");
        sm_json_text(t, "since", from);
        sm_json_text(t, "why", m->missed.why);
        sm_json_int(t, "bytes", (int64_t)m->missed.bytes);
        sm_json_close_object(t);
    }
    sm_json_words(t, "log", m->disk.path);
    if (m->has_link) {
        sm_json_object(t, "link");
        sm_json_text(t, "state", sm_link_state_name(m->link.state));
        sm_json_words(t, "why", m->link.why);
        sm_json_words(t, "port", m->link.port);
        sm_json_words(t, "device", m->link.device);
        sm_json_words(t, "settings", m->link.settings);
        sm_json_close_object(t);
    }
    if (m->core != NULL && m->log == LOG_OPEN)
        write_core(m, now, t);
    else
        sm_json_text(t, "sentence",
                     m->missed.is ? "Not logging: see why. What the meter sends is shown only."
                                  : "Starting.");
    sm_json_end(t);
}
