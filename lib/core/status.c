/* SPDX-License-Identifier: GPL-3.0-or-later */
/* status.c: what a person wants to know at a glance. */
#include "core/inside.h"

#include <string.h>

static enum sm_bench_state state(const struct sm_core *c, int64_t *ret_since_t_ns)
{
    const struct sm_immersion *im = &c->immersion;

    *ret_since_t_ns = c->link_t_ns;
    if (!c->link_up)
        return SM_STATE_NO_LINK;
    if (c->silent) {
        *ret_since_t_ns = c->last_reading_t_ns == SM_NEVER ? c->link_t_ns : c->last_reading_t_ns;
        return SM_STATE_SILENT;
    }
    if (c->now->rest.has) {
        *ret_since_t_ns = c->rest_born_t_ns;
        return SM_STATE_RESTING;
    }
    if (c->open_circuit)
        return SM_STATE_OPEN;
    if (!im->begun)
        return SM_STATE_WAITING;
    *ret_since_t_ns = im->captured ? im->settled_t_ns : im->began_t_ns;
    if (im->captured)
        return SM_STATE_SETTLED;
    return im->not_settled ? SM_STATE_NOT_SETTLED : SM_STATE_SETTLING;
}

/* The caution of the step that is under way or comes next. */
static const char *caution(const struct sm_core *c)
{
    enum sm_caution_when when = SM_CAUTION_LOADING;

    if (!c->has_sheet || c->now->run.next >= c->sheet->n)
        return NULL;
    if (c->now->run.next > 0) {
        const enum sm_class class = sm_item_class(c->sheet->item[c->now->run.next].kind);

        when = class == SM_CLASS_STANDARD ? SM_CAUTION_STANDARD
               : class == SM_CLASS_CHECK  ? SM_CAUTION_CHECK
                                          : SM_CAUTION_SAMPLE;
    }
    for (size_t i = 0; i < c->method->n_cautions; i++) {
        if (c->method->caution[i].when == when)
            return c->method->caution[i].text;
    }
    return NULL;
}

static void counts(const struct sm_core *c, struct sm_core_status *s)
{
    for (size_t i = 0; i < c->now->n_results; i++) {
        if (c->now->result[i].state == SM_RESULT_PROVISIONAL)
            s->provisional++;
        else
            s->held++;
    }
    s->questions = c->now->n_questions;
    s->since_check = c->now->checks.since;
    s->unread = c->unread;
}

void sm_core_status(const struct sm_core *c, struct sm_core_status *ret_status)
{
    struct sm_core_status *s = ret_status;
    const struct sm_carried_run *run = &c->now->run;

    memset(s, 0, sizeof *s);
    s->state = state(c, &s->since_t_ns);
    s->now = c->immersion.where;
    s->has_sheet = c->has_sheet;
    s->run = run->number;
    if (c->has_sheet) {
        s->items = run->n_items;
        s->measured = sm_run_measured(run);
        s->sheet_done = run->next >= run->n_items;
        sm_core_where(c, run->next + (c->immersion.given && !c->immersion.not_settled ? 1 : 0),
                      &s->next);
    }
    s->latest.has = c->latest[c->signal_at].has;
    s->latest.value = c->latest[c->signal_at].value;
    s->signal_unit = c->setup->profile->channel[c->signal_at].unit;
    s->result_unit = c->method->measures;
    s->last.has = c->now->last.has;
    s->last.n = c->now->last.capture;
    sm_text_copy(s->last.name, sizeof s->last.name, c->now->last.name);
    s->last.value = c->now->last.value;
    s->last.u95 = c->now->last.u95;
    s->curve_accepted = c->now->curve.n != 0 && c->now->curve.accepted;
    s->curve_refused = c->now->curve.n != 0 && !c->now->curve.accepted;
    counts(c, s);
    sm_text_copy(s->on_duty, sizeof s->on_duty, c->now->on_duty);
    s->caution = caution(c);
    s->method_note = c->method->note;
}
