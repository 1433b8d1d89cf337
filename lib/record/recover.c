/* SPDX-License-Identifier: GPL-3.0-or-later */
/* recover.c: the last stamped state of a file, and the sheet in force then. */
#include "record/recover.h"

#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "record/fields.h"
#include "record/head.h"
#include "record/load.h"

/* Where in the text what counts was found last. */
struct found {
    const char *carried, *open, *sheet; /* lines; NULL none */
    size_t carried_n, open_n, sheet_n;
    const char *act; /* a sheet act that is not answered yet */
    size_t act_n;
    int64_t act_number;
    int64_t last_utc_us;
};

static void take_utc(const struct sm_head *h, int64_t *ret_utc_us)
{
    int64_t utc_us;

    if (sm_utc_parse(h->when + h->when_n - (SM_UTC_SIZE - 1), SM_UTC_SIZE - 1, &utc_us) == SM_OK)
        *ret_utc_us = utc_us;
}

/* Does this answer say "done" to that act? */
static bool accepts(const char *line, size_t n, int64_t act)
{
    char why[SM_REASON_SIZE];
    json_t *o = NULL;
    struct sm_taking k;
    struct sm_fields f;
    int64_t of = 0;
    bool done = false;

    if (sm_json_load(line, n, &o, why) != SM_OK)
        return false;
    sm_taking_begin(&k, why);
    if (sm_fields_begin(&f, &k, o, "answer")) {
        sm_fields_int(&f, "act", 0, INT64_MAX, &of);
        sm_fields_bool(&f, "done", &done);
    }
    json_decref(o);
    return !k.bad && done && of == act;
}

/* A `file` entry says by `sheet` that it is the sheet in force. */
static bool is_sheet_file(const char *line, size_t n)
{
    char why[SM_REASON_SIZE];
    json_t *o = NULL;
    bool sheet;

    if (sm_json_load(line, n, &o, why) != SM_OK)
        return false;
    sheet = json_is_true(json_object_get(o, "sheet"));
    json_decref(o);
    return sheet;
}

static void look_at(struct found *f, const char *line, size_t n)
{
    struct sm_head h;

    if (!sm_head_read(line, n, &h))
        return;
    take_utc(&h, &f->last_utc_us);
    if (sm_head_is(&h, "carried")) {
        f->carried = line;
        f->carried_n = n;
    } else if (sm_head_is(&h, "open")) {
        f->open = line;
        f->open_n = n;
    } else if (sm_head_is(&h, "file") && is_sheet_file(line, n)) {
        f->sheet = line;
        f->sheet_n = n;
    } else if (sm_head_is(&h, "act") && sm_head_then(&h, line, n, ",\"act\":\"sheet\"")) {
        f->act = line;
        f->act_n = n;
        f->act_number = h.n;
    } else if (f->act != NULL && sm_head_is(&h, "answer") && accepts(line, n, f->act_number)) {
        f->sheet = f->act;
        f->sheet_n = f->act_n;
        f->act = NULL;
    }
}

static void look_through(struct found *f, const char *text, size_t n)
{
    const char *at = text, *end = text + n;

    while (at < end) {
        const char *newline = memchr(at, '\n', (size_t)(end - at));

        if (newline == NULL)
            break;
        look_at(f, at, (size_t)(newline - at));
        at = newline + 1;
    }
}

/* SM_ESHORT: nothing in it to begin from. */
static enum sm_status take_carried(const struct found *f, struct sm_recovered *ret)
{
    const bool own = f->carried != NULL;
    const char *line = own ? f->carried : f->open;
    const size_t n = own ? f->carried_n : f->open_n;
    char why[SM_REASON_SIZE];
    unsigned passed_over;
    struct sm_head h;
    json_t *o = NULL;
    const json_t *carried;
    enum sm_status st;

    if (line == NULL || sm_json_load(line, n, &o, why) != SM_OK)
        return SM_ESHORT;
    carried = own ? o : json_object_get(o, "carried");
    st = sm_carried_read(carried, &ret->carried, &passed_over, why);
    json_decref(o);
    if (st != SM_OK) {
        sm_carried_init(&ret->carried);
        return SM_ESHORT;
    }
    if (sm_head_read(line, n, &h))
        take_utc(&h, &ret->carried_utc_us);
    return SM_OK;
}

/* The text of a `file` entry or of a sheet act. */
static enum sm_status take_sheet(const struct found *f, struct sm_recovered *ret)
{
    char why[SM_REASON_SIZE];
    json_t *o = NULL;
    const json_t *text;
    struct sm_taking k;
    struct sm_fields in;
    enum sm_status st = SM_OK;

    if (f->sheet == NULL || sm_json_load(f->sheet, f->sheet_n, &o, why) != SM_OK)
        return SM_OK;
    sm_taking_begin(&k, why);
    if (sm_fields_begin(&in, &k, o, "sheet") &&
        !sm_fields_text(&in, "name", ret->sheet_file, sizeof ret->sheet_file))
        sm_fields_text(&in, "file", ret->sheet_file, sizeof ret->sheet_file);
    text = json_object_get(o, "text");
    if (json_is_string(text) && json_string_length(text) <= SM_SHEET_TEXT_MAX) {
        ret->sheet_text_n = json_string_length(text);
        ret->sheet_text = malloc(ret->sheet_text_n + 1);
        if (ret->sheet_text != NULL)
            memcpy(ret->sheet_text, json_string_value(text), ret->sheet_text_n + 1);
        else
            st = SM_ENOMEM;
    }
    json_decref(o);
    return st;
}

enum sm_status sm_recover(const char *text, size_t n, struct sm_recovered *ret)
{
    struct found f = { 0 };
    enum sm_status st;

    memset(ret, 0, sizeof *ret);
    sm_carried_init(&ret->carried);
    sm_verify(text, n, NULL, &ret->verify);
    ret->next_n = ret->verify.last_line_n + 1;
    ret->closed = ret->verify.closed;
    look_through(&f, text, ret->verify.stamped_bytes);
    ret->last_utc_us = f.last_utc_us;
    st = take_carried(&f, ret);
    if (st == SM_OK && ret->carried.run.has)
        st = take_sheet(&f, ret);
    if (st == SM_ENOMEM)
        return st;
    return ret->verify.good ? st : SM_EVALUE;
}

void sm_recovered_finish(struct sm_recovered *r)
{
    free(r->sheet_text);
    r->sheet_text = NULL;
}
