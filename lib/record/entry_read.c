/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_read.c: a line of the log back to what it was. The keys are listed in entry_input.c. */
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "record/entry.h"
#include "record/fields.h"
#include "record/load.h"

void sm_entry_store_init(struct sm_entry_store *s)
{
    s->sheet_text = NULL;
    s->sheet_cap = 0;
}

void sm_entry_store_finish(struct sm_entry_store *s)
{
    free(s->sheet_text);
    sm_entry_store_init(s);
}

/* Each character is a byte. */
static void take_raw(struct sm_taking *k, const json_t *b, struct sm_entry_store *store,
                     struct sm_chunk *c)
{
    const char *s = json_string_value(b);
    const size_t n = json_string_length(b);
    size_t at = 0, n_bytes = 0;

    if (!json_is_string(b))
        sm_taking_refuse(k, "bytes: b: expected a string");
    while (at < n && !k->bad) {
        uint32_t code = (unsigned char)s[at];
        const size_t len = code < 0x80 ? 1 : sm_utf8_next(s + at, n - at, &code);

        if (len == 0 || code > 0xff)
            sm_taking_refuse(k, "bytes: b: a character that is no byte");
        else if (n_bytes == SM_BYTES_MAX)
            sm_taking_refuse(k, "bytes: b: more than %d bytes", SM_BYTES_MAX);
        else
            store->bytes[n_bytes++] = (unsigned char)code;
        at += len;
    }
    c->bytes = store->bytes;
    c->n = n_bytes;
}

static void take_bytes(struct sm_fields *f, struct sm_entry_store *store, struct sm_input *in)
{
    struct sm_chunk *c = &in->chunk;
    const json_t *b = sm_fields_need(f, "b"), *list;

    c->t_ns = in->t_ns;
    if (b != NULL)
        take_raw(f->taking, b, store, c);
    list = sm_fields_list(f, "bad", SM_BYTES_MAX);
    if (list == NULL)
        return;
    for (size_t i = 0; i < json_array_size(list); i++) {
        int64_t at;

        if (!sm_json_is_int(json_array_get(list, i), &at) || at < 0 || (size_t)at >= c->n ||
            (i > 0 && at <= store->bad[i - 1])) {
            sm_taking_refuse(f->taking, "bytes: bad: expected offsets into b, rising");
            return;
        }
        store->bad[i] = (uint16_t)at;
    }
    c->bad = store->bad;
    c->n_bad = json_array_size(list);
}

static void take_sheet_text(struct sm_fields *f, struct sm_entry_store *store, struct sm_act *a)
{
    const json_t *v = sm_fields_get(f, "text");
    const size_t n = json_string_length(v);

    if (v == NULL)
        return;
    if (!json_is_string(v) || n > SM_SHEET_TEXT_MAX) {
        sm_taking_refuse(f->taking, "act: text: expected a sheet of at most %u bytes",
                         SM_SHEET_TEXT_MAX);
        return;
    }
    if (store->sheet_cap < n + 1) {
        char *more = realloc(store->sheet_text, n + 1);

        if (more == NULL) {
            sm_taking_refuse(f->taking, "act: text: no memory for the sheet");
            return;
        }
        store->sheet_text = more;
        store->sheet_cap = n + 1;
    }
    memcpy(store->sheet_text, json_string_value(v), n + 1);
    a->sheet_text = store->sheet_text;
    a->sheet_text_n = n;
}

static void take_act(struct sm_fields *f, struct sm_entry_store *store, struct sm_act *a)
{
    const json_t *peer;
    struct sm_fields in;

    sm_fields_text(f, "id", a->id, sizeof a->id);
    a->has_seen = sm_fields_int(f, "seen", INT64_MIN, INT64_MAX, &a->seen);
    sm_fields_text(f, "who", a->who, sizeof a->who);
    sm_fields_text(f, "door", a->door, sizeof a->door);
    peer = sm_fields_get(f, "peer");
    if (peer != NULL && sm_fields_begin(&in, f->taking, peer, "act: peer")) {
        a->has_uid = sm_fields_int(&in, "uid", INT64_MIN, INT64_MAX, &a->uid);
        sm_fields_end(&in);
    }
    sm_fields_text(f, "why", a->why, sizeof a->why);
    a->has_temperature = sm_fields_real(f, "temperature", &a->temperature_c);
    a->has_subject = sm_fields_int(f, "of", INT64_MIN, INT64_MAX, &a->subject);
    if (a->act != SM_ACT_SHEET) {
        sm_fields_text(f, "text", a->text, sizeof a->text);
        return;
    }
    sm_fields_text(f, "file", a->sheet_file, sizeof a->sheet_file);
    sm_fields_text(f, "refused", a->sheet_why, sizeof a->sheet_why);
    take_sheet_text(f, store, a);
}

static void take_link(struct sm_fields *f, struct sm_link *l)
{
    static const enum sm_link_state states[] = { SM_LINK_UP, SM_LINK_LOST, SM_LINK_REFUSED };
    char state[24] = "";
    bool known = false;

    sm_fields_text(f, "state", state, sizeof state);
    for (size_t i = 0; i < sizeof states / sizeof states[0] && !known; i++) {
        known = strcmp(state, sm_link_state_name(states[i])) == 0;
        l->state = states[i];
    }
    if (!known)
        sm_taking_refuse(f->taking, "link: state: expected one of up, lost, refused");
    sm_fields_text(f, "why", l->why, sizeof l->why);
    sm_fields_text(f, "port", l->port, sizeof l->port);
    sm_fields_text(f, "device", l->device, sizeof l->device);
    sm_fields_text(f, "identity", l->identity, sizeof l->identity);
    sm_fields_text(f, "settings", l->settings, sizeof l->settings);
    sm_fields_bool(f, "continues", &l->continues);
}

static void take_clock(struct sm_fields *f, struct sm_input *in)
{
    char what[24] = "";

    sm_fields_text(f, "what", what, sizeof what);
    if (strcmp(what, sm_clock_what_name(SM_CLOCK_JUMP)) == 0)
        in->clock_what = SM_CLOCK_JUMP;
    else if (strcmp(what, sm_clock_what_name(SM_CLOCK_SUSPEND)) == 0)
        in->clock_what = SM_CLOCK_SUSPEND;
    else
        sm_taking_refuse(f->taking, "clock: what: expected jump or suspend");
    if (!sm_fields_int(f, "by_us", INT64_MIN, INT64_MAX, &in->clock_by_us))
        sm_taking_refuse(f->taking, "clock: by_us is missing");
}

/* False: an act that this program does not know. */
static bool take_input(struct sm_fields *f, struct sm_entry_store *store, struct sm_input *in)
{
    char act[24] = "";

    switch (in->kind) {
    case SM_INPUT_BYTES:
        take_bytes(f, store, in);
        break;
    case SM_INPUT_ACT:
        if (!sm_fields_text(f, "act", act, sizeof act))
            sm_taking_refuse(f->taking, "act: act is missing");
        if (!sm_act_known(act, &in->act.act))
            return false;
        take_act(f, store, &in->act);
        break;
    case SM_INPUT_LINK:
        take_link(f, &in->link);
        break;
    case SM_INPUT_CLOCK:
        take_clock(f, in);
        break;
    case SM_INPUT_SENT:
        if (!sm_fields_int(f, "of", 0, INT64_MAX, &in->sent_of))
            sm_taking_refuse(f->taking, "sent: of is missing");
        break;
    case SM_INPUT_TICK:
    case SM_INPUT_ROLL:
    case SM_INPUT_COUNT:
        break;
    }
    return true;
}

static void sort_out(const char *k, struct sm_entry *e)
{
    static const struct {
        const char *k;
        enum sm_entry_kind kind;
    } own[] = { { "stamp", SM_ENTRY_STAMP },
                { "open", SM_ENTRY_OPEN },
                { "file", SM_ENTRY_FILE },
                { "close", SM_ENTRY_CLOSE } };

    e->kind = SM_ENTRY_UNKNOWN;
    for (unsigned i = 0; i < SM_INPUT_COUNT; i++)
        if (strcmp(k, sm_input_kind_name((enum sm_input_kind)i)) == 0) {
            e->kind = SM_ENTRY_INPUT;
            e->input.kind = (enum sm_input_kind)i;
            return;
        }
    for (unsigned i = 0; i < SM_EVENT_COUNT; i++)
        if (strcmp(k, sm_event_kind_name((enum sm_event_kind)i)) == 0 &&
            sm_event_class((enum sm_event_kind)i) != SM_LIVE) {
            e->kind = SM_ENTRY_EVENT;
            e->event = (enum sm_event_kind)i;
            return;
        }
    for (size_t i = 0; i < sizeof own / sizeof own[0]; i++)
        if (strcmp(k, own[i].k) == 0)
            e->kind = own[i].kind;
}

static void take_head(struct sm_fields *f, struct sm_entry *e)
{
    const json_t *utc;

    if (!sm_fields_int(f, "n", 1, INT64_MAX, &e->n))
        sm_taking_refuse(f->taking, "entry: n is missing");
    if (!sm_fields_int(f, "t", 0, INT64_MAX, &e->t_ns))
        sm_taking_refuse(f->taking, "entry: t is missing");
    utc = sm_fields_need(f, "utc");
    if (utc != NULL &&
        (!json_is_string(utc) ||
         sm_utc_parse(json_string_value(utc), json_string_length(utc), &e->utc_us) != SM_OK))
        sm_taking_refuse(f->taking, "entry: utc: expected a time");
    if (!sm_fields_text(f, "k", e->k, sizeof e->k))
        sm_taking_refuse(f->taking, "entry: k is missing");
}

enum sm_status sm_entry_read(const char *line, size_t n, struct sm_entry_store *store,
                             struct sm_entry *ret_entry, char ret_why[SM_REASON_SIZE])
{
    struct sm_entry *e = ret_entry;
    struct sm_taking k;
    struct sm_fields f;
    json_t *o = NULL;
    enum sm_status st = sm_json_load(line, n, &o, ret_why);

    if (st != SM_OK)
        return st;
    memset(e, 0, sizeof *e);
    sm_taking_begin(&k, ret_why);
    if (sm_fields_begin(&f, &k, o, "entry"))
        take_head(&f, e);
    if (!k.bad) {
        sort_out(e->k, e);
        if (e->kind == SM_ENTRY_INPUT) {
            e->input.n = e->n;
            e->input.t_ns = e->t_ns;
            e->input.utc_us = e->utc_us;
            if (!take_input(&f, store, &e->input))
                e->kind = SM_ENTRY_UNKNOWN;
            sm_fields_end(&f);
            e->passed_over = k.passed_over;
        }
    }
    if (k.bad) {
        json_decref(o);
        return SM_ESYNTAX;
    }
    e->json = o;
    return SM_OK;
}
