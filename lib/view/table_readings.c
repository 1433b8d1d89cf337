/* SPDX-License-Identifier: GPL-3.0-or-later */
/* table_readings.c: the readings of a log: its bytes run again through the setup that it carries,
 * so that what is a reading here is what was one at the bench. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "view/rerun.h"
#include "view/row.h"
#include "view/table_inside.h"

struct sm_export_readings {
    const struct sm_export_ask *ask;
    size_t *rows;
    char *line; /* [SM_ROW_SIZE] */
    bool begun; /* the header is written */
    size_t n_channels;
    char channel[SM_CHANNELS_MAX][SM_CHANNEL_SIZE];
    bool other; /* a later file has other channels */
    struct sm_whereabouts where;
};

void sm_export_readings_destroy(struct sm_export_readings *r)
{
    if (r == NULL)
        return;
    free(r->line);
    free(r);
}

static void put(struct sm_export_readings *r, struct sm_row *row)
{
    sm_row_end(row);
    r->ask->write(r->ask->arg, row->t.buf, row->t.len);
}

/* "utc,t (s),run,item,name,potential (mV),potential_flag,…" */
static void write_header(struct sm_export_readings *r, const struct sm_profile *p)
{
    static const char *const head[] = { "utc", "t (s)", "run", "item", "name" };
    struct sm_row row;

    r->begun = true;
    r->n_channels = p->n_channels;
    sm_row_begin(&row, r->line);
    for (size_t i = 0; i < sizeof head / sizeof head[0]; i++)
        sm_row_cell(&row, head[i]);
    for (size_t i = 0; i < p->n_channels; i++) {
        const char *unit = sm_unit_name(p->channel[i].unit);
        char cell[SM_CHANNEL_SIZE + 32];
        struct sm_text t;

        memcpy(r->channel[i], p->channel[i].name, SM_CHANNEL_SIZE);
        sm_text_init(&t, cell, sizeof cell);
        sm_text_addf(&t, unit[0] != '\0' ? "%s (%s)" : "%s%s", p->channel[i].name, unit);
        sm_row_cell(&row, cell);
        sm_text_init(&t, cell, sizeof cell);
        sm_text_addf(&t, "%s_flag", p->channel[i].name);
        sm_row_cell(&row, cell);
    }
    put(r, &row);
}

static bool same_channels(const struct sm_export_readings *r, const struct sm_profile *p)
{
    bool same = r->n_channels == p->n_channels;

    for (size_t i = 0; i < p->n_channels && same; i++)
        same = strcmp(r->channel[i], p->channel[i].name) == 0;
    return same;
}

static void write_reading(struct sm_export_readings *r, const struct sm_event *e)
{
    char utc[SM_UTC_SIZE], item[24] = "", run[24] = "";
    struct sm_row row;
    struct sm_text t;

    sm_utc_write(utc, e->utc_us);
    sm_row_begin(&row, r->line);
    sm_row_cell(&row, utc);
    sm_row_real(&row, (double)e->t_ns / 1e9);
    if (r->where.has) {
        sm_text_init(&t, run, sizeof run);
        sm_text_addf(&t, "%lld", (long long)r->where.run);
        sm_text_init(&t, item, sizeof item);
        sm_text_addf(&t, "%zu", r->where.item);
    }
    sm_row_cell(&row, run);
    sm_row_cell(&row, item);
    sm_row_cell(&row, r->where.has ? r->where.name : "");
    for (size_t i = 0; i < r->n_channels; i++) {
        const struct sm_value *v = &e->u.reading.channel[i];
        const bool here = i < e->u.reading.n && v->present;

        sm_row_real(&row, here && v->flag == SM_FLAG_OK ? v->value : NAN);
        sm_row_cell(&row, here ? sm_flag_name(v->flag) : "");
    }
    put(r, &row);
    (*r->rows)++;
}

static void take_event(void *arg, const struct sm_event *e, const struct sm_core_setup *setup)
{
    struct sm_export_readings *r = arg;

    if (!r->begun)
        write_header(r, setup->profile);
    if (e->kind == SM_EVENT_MOVED)
        r->where = e->u.moved.where;
    if (e->kind != SM_EVENT_READING || r->other)
        return;
    if (!same_channels(r, setup->profile))
        r->other = true;
    else if (!r->ask->has_run || (r->where.has && r->where.run == r->ask->run))
        write_reading(r, e);
}

enum sm_status sm_export_readings_add(const struct sm_export_ask *ask,
                                      struct sm_export_readings **readings, const char *text,
                                      size_t n, size_t *rows, char ret_why[SM_LINK_TEXT_SIZE])
{
    struct sm_export_readings *r = *readings;
    struct sm_rerun_ask again = { .text = text, .n = n, .event = take_event };
    struct sm_rerun_told told;
    enum sm_status st;

    if (r == NULL) {
        r = calloc(1, sizeof *r);
        *readings = r;
        if (r == NULL || (r->line = malloc(SM_ROW_SIZE)) == NULL)
            return SM_ENOMEM;
    }
    r->ask = ask;
    r->rows = rows;
    r->where.has = false;
    again.event_arg = r;
    st = sm_rerun(&again, &told);
    free(told.last);
    if (st != SM_OK)
        sm_text_copy(ret_why, SM_LINK_TEXT_SIZE, told.why);
    else if (r->other) {
        sm_text_copy(ret_why, SM_LINK_TEXT_SIZE,
                     "its profile has other channels than the file before: export it by itself");
        st = SM_ESYNTAX;
    }
    return st;
}
