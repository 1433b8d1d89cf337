/* SPDX-License-Identifier: GPL-3.0-or-later */
/* immersion.c: what the signal does, told as a stay in an item of the bench sheet. */
#include "core/inside.h"

#include <string.h>

void sm_core_where(const struct sm_core *c, size_t item, struct sm_whereabouts *ret_where)
{
    const struct sm_item *i;
    struct sm_text t;

    memset(ret_where, 0, sizeof *ret_where);
    ret_where->kind = SM_ITEM_NONE;
    if (!c->has_sheet || item >= c->sheet->n)
        return;
    i = &c->sheet->item[item];
    ret_where->has = true;
    ret_where->run = c->now->run.number;
    ret_where->item = item + 1;
    ret_where->kind = i->kind;
    sm_text_init(&t, ret_where->name, sizeof ret_where->name);
    if (i->kind == SM_ITEM_DUPLICATE || i->kind == SM_ITEM_SPIKE)
        sm_item_title(i, &t);
    else
        sm_text_add(&t, i->name);
}

void sm_core_lost_track(struct sm_core *c)
{
    struct sm_carried_run *run = &c->now->run;

    c->now->last.place = SM_AT_UNKNOWN;
    run->open = false;
    if (run->has && run->next < run->n_items)
        run->left = true;
}

void sm_core_signal_end(struct sm_core *c, const char *why)
{
    struct sm_signal_input end = { .kind = SM_SIGNAL_END, .t_ns = c->in.t_ns, .why = why };

    (void)!sm_signal_feed(c->signal, &end);
}

/* Gives a new immersion to the item whose turn it is, if it may have it. */
static void give(struct sm_core *c, enum sm_mark_by by)
{
    struct sm_immersion *im = &c->immersion;
    const bool marked = by == SM_MOVED_MARK;

    im->where.kind = SM_ITEM_NONE;
    if (!c->has_sheet || c->now->rest.has)
        return;
    if (by != SM_MOVED_TRANSIT && !marked) {
        if (by == SM_MOVED_START && c->now->run.next > 0 && c->now->run.next < c->now->run.n_items)
            sm_text_copy(
                im->why_not_given, sizeof im->why_not_given,
                "nobody saw the probe being moved: press next when it is in the next item");
        else if (by == SM_MOVED_VALUE)
            sm_text_copy(im->why_not_given, sizeof im->why_not_given,
                         "the value changed without a transit: same beaker disturbed?");
        return;
    }
    if (sm_run_enter(&c->now->run, c->sheet, marked, im->why_not_given)) {
        im->given = true;
        sm_core_where(c, c->now->run.next, &im->where);
    }
}

static void on_moved(struct sm_core *c, const struct sm_signal_event *e)
{
    struct sm_immersion *im = &c->immersion;
    struct sm_event *event;

    if (im->given && !im->captured)
        sm_run_left(&c->now->run, im->not_settled);
    memset(im, 0, sizeof *im);
    im->begun = true;
    im->began_t_ns = e->from_t_ns;
    give(c, e->by);
    sm_signal_class(c->signal, sm_item_class(im->where.kind));
    c->open_circuit = false;
    event = sm_core_push(c, SM_EVENT_MOVED);
    im->moved_n = event->n;
    event->u.moved.by = e->by;
    event->u.moved.of = e->by == SM_MOVED_MARK ? c->mark_of : 0;
    event->u.moved.began_t_ns = e->from_t_ns;
    event->u.moved.where = im->where;
    sm_text_copy(event->u.moved.why, sizeof event->u.moved.why,
                 im->why_not_given[0] != '\0' ? im->why_not_given : e->why);
}

static void on_transit(struct sm_core *c, const struct sm_signal_event *e)
{
    struct sm_event_transit *t = &sm_core_push(c, SM_EVENT_TRANSIT)->u.transit;

    t->from_t_ns = e->from_t_ns;
    t->to_t_ns = e->to_t_ns;
    t->how = e->how;
    t->returned = e->returned;
    c->open_circuit = false;
}

static void on_not_settled(struct sm_core *c, const struct sm_signal_event *e)
{
    struct sm_event *event = sm_core_push(c, SM_EVENT_NOT_SETTLED);

    event->u.not_settled.where = c->immersion.where;
    event->u.not_settled.moved = c->immersion.moved_n;
    sm_text_copy(event->u.not_settled.why, sizeof event->u.not_settled.why, e->why);
    c->immersion.not_settled = true;
}

static void on_settling(struct sm_core *c, const struct sm_signal_event *e)
{
    struct sm_event *event = sm_core_push(c, SM_EVENT_SETTLING);

    event->u.settling.latest = e->latest;
    event->u.settling.unit = c->setup->profile->channel[c->signal_at].unit;
    event->u.settling.since_moved_ns = c->in.t_ns - c->immersion.began_t_ns;
    event->u.settling.to_come = e->to_come;
    event->u.settling.wait_s = e->wait_s;
    c->open_circuit = false;
}

void sm_core_signal_event(struct sm_core *c, const struct sm_signal_event *e)
{
    switch (e->kind) {
    case SM_SIGNAL_MOVED:
        on_moved(c, e);
        break;
    case SM_SIGNAL_TRANSIT:
        on_transit(c, e);
        break;
    case SM_SIGNAL_SETTLING:
        on_settling(c, e);
        break;
    case SM_SIGNAL_SETTLED:
        sm_core_captured(c, &e->settled);
        break;
    case SM_SIGNAL_NOT_SETTLED:
        on_not_settled(c, e);
        break;
    case SM_SIGNAL_OPEN_CIRCUIT:
        c->open_circuit = true;
        (void)sm_core_push(c, SM_EVENT_OPEN_CIRCUIT);
        break;
    }
}
