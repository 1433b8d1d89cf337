/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter_file.c: a file is begun from what the one before left, changed after midnight, closed. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "meter_inside.h"

#define CUT_AFTER_US (INT64_C(3600) * 1000000) /* past midnight, an open immersion is ended */

void sm_meter_recover(struct sm_meter *m, const struct sm_now *now)
{
    m->epoch++;
    m->log = LOG_RECOVERING;
    if (sm_writer_recover(m->writer, m->epoch) != SM_OK)
        sm_meter_fail(m, now, "no memory");
}

void sm_meter_keep_sheet(struct sm_meter *m, const char *file, const char *text, size_t n)
{
    char *copy = NULL;

    if (text != NULL) {
        copy = malloc(n + 1);
        if (copy == NULL) {
            sm_meter_trouble(m, "no memory");
            return;
        }
        memcpy(copy, text, n);
        copy[n] = '\0';
    }
    free(m->sheet_text);
    m->sheet_text = copy;
    m->sheet_text_n = copy != NULL ? n : 0;
    sm_text_copy(m->sheet_file, sizeof m->sheet_file, copy != NULL ? file : "");
}

/* The sheet in force as a typed sheet; NULL: none, or it cannot be read any more (said in notes).
 */
static const struct sm_sheet *read_sheet(struct sm_meter *m, struct sm_text *notes)
{
    struct sm_blame list[1];
    struct sm_blames blames;
    char what[SM_BLAME_SIZE + SM_PATH_SIZE + 32];

    if (m->sheet_text == NULL)
        return NULL;
    sm_blames_init(&blames, list, 1);
    if (sm_sheet_load(m->about.setup, m->sheet_file, m->sheet_text, m->sheet_text_n, m->sheet,
                      &blames) == SM_OK)
        return m->sheet;
    what[0] = '\0';
    if (blames.n > 0)
        sm_blame_write(&blames.list[0], what, sizeof what);
    sm_text_addf(notes, "%sthe sheet does not go with this setup any more and is put aside: %s",
                 notes->len > 0 ? "; " : "", what);
    sm_meter_keep_sheet(m, "", NULL, 0);
    return NULL;
}

/* As much of the state as goes with the setup: all of it; without its sheet and run; nothing. What
 * is left behind is said. */
static void start_core(struct sm_meter *m, const struct sm_sheet *sheet, struct sm_text *notes)
{
    char why[SM_REASON_SIZE] = "";
    enum sm_status s = sm_core_start(&m->about.meter->core, m->carried, sheet, &m->core, why);

    if (s == SM_EINVAL) {
        sm_text_addf(notes, "%sthe run does not go with this setup and is put aside: %s",
                     notes->len > 0 ? "; " : "", why);
        sm_meter_keep_sheet(m, "", NULL, 0);
        memset(&m->carried->run, 0, sizeof m->carried->run);
        s = sm_core_start(&m->about.meter->core, m->carried, NULL, &m->core, why);
    }
    if (s == SM_EINVAL) {
        sm_text_addf(notes, "; what was carried is put aside: %s", why);
        sm_carried_init(m->carried);
        s = sm_core_start(&m->about.meter->core, m->carried, NULL, &m->core, why);
    }
    if (s != SM_OK) {
        m->core = NULL;
        sm_meter_trouble(m, "the core cannot be started: %s",
                         s == SM_EINVAL ? why : sm_status_text(s));
    }
}

static void append_files(struct sm_meter *m, const struct sm_now *now)
{
    const struct sm_setup *s = m->about.setup;

    for (size_t i = 0; i < s->n_files; i++) {
        struct sm_text t = sm_meter_line(m);
        sm_entry_file(&t, ++m->n, now->utc_us, s->files[i].name, s->files[i].text, s->files[i].n,
                      false);
        sm_meter_append(m, now, &t, true, 0);
    }
    if (m->sheet_text != NULL) {
        struct sm_text t = sm_meter_line(m);
        sm_entry_file(&t, ++m->n, now->utc_us, m->sheet_file, m->sheet_text, m->sheet_text_n, true);
        sm_meter_append(m, now, &t, true, 0);
    }
}

/* `open`, the files, the first stamp; the core is begun before, so that what it cannot begin from
 * is not in the log. */
static void begin_file(struct sm_meter *m, const struct sm_now *now, struct sm_entry_open *o,
                       const struct sm_sheet *sheet, struct sm_text *notes)
{
    char key[SM_KEY_HEX];
    struct sm_text t;

    start_core(m, sheet, notes);
    if (m->core == NULL)
        return;
    sm_signer_public(m->about.signer, key);
    m->opened_boot_ns = now->boot_ns;
    m->opened_day = sm_utc_day(now->utc_us);
    m->signed_boot_ns = SM_NEVER;
    m->last_t_ns = 0;
    m->last_utc_us = now->utc_us;
    sm_hasher_take(m->hasher, m->last_stamp); /* begins anew, whatever a failed file left */
    m->n++;
    m->stamp_from = m->n;
    o->n = m->n;
    o->utc_us = now->utc_us;
    o->program = SM_VERSION;
    o->arithmetic = m->about.arithmetic;
    o->key = key;
    o->key_note = m->about.key_note;
    o->meter = m->name;
    o->ordinal = m->ordinal;
    o->missed = notes->buf;
    o->carried = m->carried;
    t = sm_meter_line(m);
    sm_entry_open(&t, o);
    sm_meter_append(m, now, &t, true, 0);
    append_files(m, now);
    if (m->group != NULL)
        sm_file_name(m->group->begins, m->ordinal, now->utc_us);
    sm_meter_stamp(m, now, true);
    o->key = ""; /* what it pointed to ends here */
    m->shown_n = m->n;
}

static void note_missed(const struct sm_meter *m, const struct sm_now *now,
                        const struct sm_beginning *b, struct sm_text *notes)
{
    char from[SM_UTC_SIZE], to[SM_UTC_SIZE];

    if (m->missed.is) {
        sm_utc_write(from, m->missed.from_utc_us);
        sm_utc_write(to, now->utc_us);
        sm_text_addf(notes, "from %s to %s nothing was logged (%s): %llu bytes of the meter", from,
                     to, m->missed.first, (unsigned long long)m->missed.bytes);
    } else if (b->has_state && !b->state.closed) {
        sm_text_add(notes, "the program ended without closing the file before");
    }
    if (b->damage[0] != '\0')
        sm_text_addf(notes, "%s%s", notes->len > 0 ? "; " : "", b->damage);
}

/* Aged to now: what was stated then. A wall clock that went back ages nothing. */
static int64_t age(struct sm_meter *m, const struct sm_now *now, const struct sm_beginning *b)
{
    const int64_t past_us = now->utc_us - b->state.carried_utc_us;
    int64_t ns = 0;

    if (past_us > 0)
        ns = past_us < INT64_MAX / 2000 ? past_us * 1000 : INT64_MAX / 2;
    sm_carried_age(m->carried, ns);
    return ns;
}

static int64_t later(int64_t a, int64_t b)
{
    return a > b ? a : b;
}

void sm_meter_begin(struct sm_meter *m, const struct sm_now *now, struct sm_beginning *b)
{
    struct sm_entry_open o = { .how = m->missed.is ? "recovery" : "first" };
    const struct sm_sheet *sheet;
    char note_buf[4 * SM_WHY_SIZE];
    struct sm_text notes;

    sm_text_init(&notes, note_buf, sizeof note_buf);
    note_missed(m, now, b, &notes);
    m->ordinal = b->ordinal;
    m->n = b->next_n - 1;
    if (m->missed.is) { /* what was shown and is lost, or a folder that is another one now */
        m->ordinal = later(m->ordinal, m->missed.ordinal + 1);
        m->n = later(m->n, m->missed.n);
    }
    m->trouble[0] = '\0';
    if (b->previous.has) {
        o.how = m->missed.is || !b->has_state || !b->state.closed ? "recovery" : "start";
        o.previous.has = true;
        o.previous.ordinal = b->previous.ordinal;
        memcpy(o.previous.stamp, b->previous.stamp, sizeof o.previous.stamp);
        o.previous.after_lines = b->previous.after_lines;
        o.previous.after_bytes = b->previous.after_bytes;
    }
    sm_carried_init(m->carried);
    sm_meter_keep_sheet(m, "", NULL, 0);
    if (b->has_state) {
        *m->carried = b->state.carried;
        sm_carried_interrupt(m->carried);
        if (m->identity[0] == '\0') /* the adapter of the daemon's life before this one */
            sm_text_copy(m->identity, sizeof m->identity, m->carried->meter.adapter);
        o.aged_ns = age(m, now, b);
        sm_meter_keep_sheet(m, b->state.sheet_file, b->state.sheet_text, b->state.sheet_text_n);
    }
    sm_beginning_destroy(b);
    sheet = read_sheet(m, &notes);
    m->log = LOG_BEGINNING;
    begin_file(m, now, &o, sheet, &notes);
    if (m->core != NULL && m->has_link)
        sm_meter_feed_link(m, now, false);
    sm_text_copy(m->begun_with, sizeof m->begun_with, note_buf);
}

void sm_meter_close_file(struct sm_meter *m, const struct sm_now *now, const char *why)
{
    struct sm_text t = sm_meter_line(m);

    m->last_t_ns = now->boot_ns - m->opened_boot_ns;
    m->last_utc_us = now->utc_us;
    sm_entry_close(&t, ++m->n, m->last_t_ns, m->last_utc_us, why);
    sm_meter_append(m, now, &t, true, 0);
    if (m->group != NULL)
        m->group->ends = true;
    sm_meter_stamp(m, now, true);
}

static void roll(struct sm_meter *m, const struct sm_now *now)
{
    struct sm_entry_open o = { .how = "rollover" };
    struct sm_input in = { .kind = SM_INPUT_ROLL };
    const struct sm_sheet *sheet;
    char note_buf[2 * SM_WHY_SIZE];
    struct sm_text notes;

    sm_text_init(&notes, note_buf, sizeof note_buf);
    sm_meter_feed(m, now, &in);
    if (m->trouble[0] != '\0')
        return;
    sm_core_carried(m->core, m->carried);
    sheet = sm_core_sheet(m->core);
    if (sheet != NULL) {
        *m->sheet = *sheet;
        sheet = m->sheet;
    }
    sm_meter_close_file(m, now, "rollover");
    sm_core_destroy(m->core);
    m->core = NULL;
    if (m->trouble[0] != '\0')
        return;
    o.previous.has = true;
    o.previous.ordinal = m->ordinal++;
    memcpy(o.previous.stamp, m->last_stamp, sizeof o.previous.stamp);
    begin_file(m, now, &o, sheet, &notes);
    if (m->core != NULL && m->has_link)
        sm_meter_feed_link(m, now, m->port != NULL);
}

void sm_meter_roll_if_due(struct sm_meter *m, const struct sm_now *now)
{
    if (m->core == NULL || m->log != LOG_OPEN || sm_utc_day(now->utc_us) <= m->opened_day)
        return;
    if (sm_core_may_roll(m->core) ||
        (now->utc_us >= (m->opened_day + 1) * SM_US_PER_DAY + CUT_AFTER_US &&
         sm_core_may_cut(m->core)))
        roll(m, now);
}
