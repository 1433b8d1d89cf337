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

struct sm_signal_start sm_core_place(const struct sm_core *c)
{
    struct sm_signal_start place;

    sm_signal_place(c->signal, &place);
    return place;
}

void sm_core_unsure(struct sm_core *c)
{
    struct sm_carried_run *run = &c->now->run;

    run->open = false;
    if (run->has && run->next < run->n_items)
        run->left = true;
    c->marked = false;
}

void sm_core_lost_track(struct sm_core *c)
{
    c->now->last.place = SM_AT_UNKNOWN;
    sm_core_unsure(c);
}

void sm_core_signal_end(struct sm_core *c, const char *why)
{
    struct sm_signal_input end = { .kind = SM_SIGNAL_END, .t_ns = c->in.t_ns, .why = why };

    (void)!sm_signal_feed(c->signal, &end);
    c->open_circuit = c->in_air = false;
}

/* "standard B4 TEXT" */
static void not_given(struct sm_core *c, const char *text)
{
    char name[SM_NAME_SIZE + 16];
    struct sm_text t;

    sm_text_init(&t, name, 90); /* so that the sentence has room */
    sm_item_title(&c->sheet->item[c->now->run.next], &t);
    sm_text_init(&t, c->immersion.why_not_given, sizeof c->immersion.why_not_given);
    sm_text_add(&t, name);
    sm_text_add(&t, text);
}

/* An immersion that began by itself or by a changed value opens no item. By itself, and nothing was
 * measured yet: where the probe stood when the sheet was handed over, which is not the first item
 * unless a mark says so. */
static void give_nothing(struct sm_core *c, enum sm_mark_by by)
{
    struct sm_immersion *im = &c->immersion;
    const struct sm_carried_run *run = &c->now->run;

    if (by == SM_MOVED_VALUE)
        sm_text_copy(im->why_not_given, sizeof im->why_not_given,
                     "the value changed without a transit: same beaker disturbed?");
    else if (run->next > 0 || run->left)
        sm_text_copy(im->why_not_given, sizeof im->why_not_given,
                     "nobody saw the probe being moved: press next when it is in the next item");
    else
        im->early = true;
}

/* Gives a new immersion to the item whose turn it is, if it may have it. */
static void give(struct sm_core *c, enum sm_mark_by by)
{
    struct sm_immersion *im = &c->immersion;
    struct sm_carried_run *run = &c->now->run;
    const bool marked = by == SM_MOVED_MARK;

    im->where.kind = SM_ITEM_NONE;
    im->marked = marked;
    if (!c->has_sheet || c->now->rest.has)
        return;
    if (run->next >= run->n_items) {
        (void)sm_run_enter(run, c->sheet, marked, im->why_not_given); /* says so */
    } else if (!marked && by != SM_MOVED_TRANSIT) {
        give_nothing(c, by);
    } else if (!marked && c->method->marks == SM_MARKS_REQUIRED) {
        not_given(c, " comes next: the method wants a mark, press next when the probe is in it");
    } else if (marked && c->mark_of == 0 &&
               run->left) { /* its key cannot know which one is meant */
        not_given(c, " was left before it settled: say next when the probe is in it, or skip it");
    } else if (sm_run_enter(run, c->sheet, marked, im->why_not_given)) {
        im->given = true;
        c->marked = c->marked || marked;
        sm_core_where(c, run->next, &im->where);
    }
}

/* The immersion so far is over. Without a capture, but longer than the dwell (it was told as not
 * settled), or given by a mark, moved since and marked again: it may have been item run.next. */
static void leave(struct sm_core *c, enum sm_mark_by by)
{
    const struct sm_immersion *im = &c->immersion;
    const bool could_be_it = im->given || im->why_not_given[0] != '\0';
    const bool again = by == SM_MOVED_MARK && c->mark_of == 0 && c->marked && !im->marked;

    if (im->begun && !im->captured && could_be_it && (im->not_settled || again))
        sm_core_unsure(c);
    else if (im->given && !im->captured)
        sm_run_left(&c->now->run, false);
}

/* A value that changes soon after a mark: the mark was said a little early, or something was
 * switched on. It opens nothing, and closes nothing either: the item stays open. */
static bool goes_on(const struct sm_immersion *im, enum sm_mark_by by)
{
    return by == SM_MOVED_VALUE && im->given && im->marked && !im->captured && !im->not_settled;
}

static void on_moved(struct sm_core *c, const struct sm_signal_event *e)
{
    struct sm_immersion *im = &c->immersion;
    struct sm_event *event;

    if (goes_on(im, e->by)) {
        im->began_t_ns = e->from_t_ns;
    } else {
        leave(c, e->by);
        memset(im, 0, sizeof *im);
        im->begun = true;
        im->began_t_ns = e->from_t_ns;
        give(c, e->by);
    }
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
