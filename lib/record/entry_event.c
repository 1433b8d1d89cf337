/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_event.c: what the core said, as entries. Times are ns; numbers of entries that are none,
 * names and sentences that are empty, and numbers that are unknown are left out.
 *
 * "where" stands for run, item (from 1), name, kind ("standard", "sample" …); left out without one.
 *
 *   capture       moved, run, item, name, kind, title (where it differs from the name), number,
 *                 value, unit, expanded_uncertainty,
 *                 parts {noise, to_come, step, long_noise, drift}, window [from, to], readings,
 *                 lifts, sd, step, rule, prescribed, tolerance, since_moved, end_value, doubt,
 *                 with {channel: mean}, with_range {channel: largest less smallest}, who,
 *                 remarks [sentences]
 *   curve         see entry_curve.c
 *   check         capture, curve, where, want, found, difference, within, unit, closing, pass, why
 *   result        capture, curve, run, item, name, kind, title, value, unit, expanded_uncertainty,
 *                 shown ("< 1.68"), temperature (°C), temperature_how, state, why,
 *                 remarks [sentences]
 *   hold, release check, why, results [n …]
 *   question      capture, asks, text
 *   answer        act, id, done, why
 *   moved         by, of, where, began, why
 *   transit       from, to, how, returned
 *   not-settled   moved, where, why
 *   open-circuit
 *   silent        last_line
 *   unread        count | line (what was wrong with it), b, length (where b is not all of it), why
 *   ask           b, identity (only where true)
 *   carried       the sections, see entry_carried.c
 *   reading       values [{value, step, digits, flag (where not ok)} …], empty where absent; in
 *                 the profile's order
 *   settling      latest, unit, since_moved, to_come, wait_s
 *
 * The last two are live: they have no n and are never in a log. */
#include "record/event.h"

#include <string.h>

#include "base/time.h"
#include "record/carried.h"
#include "record/json.h"

static void write_maybe(struct sm_text *t, const char *key, struct sm_maybe m)
{
    if (m.has)
        sm_json_real(t, key, m.value);
}

/* name: what the entry itself calls it; NULL: the title is its name. */
static void write_where(struct sm_text *t, const struct sm_whereabouts *w, const char *name)
{
    if (w->has) {
        sm_json_int(t, "run", w->run);
        sm_json_size(t, "item", w->item);
    }
    if (name != NULL)
        sm_json_words(t, "name", name);
    else if (w->has)
        sm_json_words(t, "name", w->name);
    if (w->has) {
        sm_json_text(t, "kind", sm_item_kind_name(w->kind));
        if (name != NULL && strcmp(name, w->name) != 0)
            sm_json_words(t, "title", w->name);
    }
}

static void write_sentences(struct sm_text *t, const char (*s)[SM_REASON_SIZE], size_t n)
{
    sm_json_list(t, "remarks");
    for (size_t i = 0; i < n; i++)
        sm_json_text(t, NULL, s[i]);
    sm_json_close_list(t);
}

static void write_parts(struct sm_text *t, const struct sm_settled *s)
{
    sm_json_object(t, "parts");
    for (unsigned p = 0; p < SM_PART_COUNT; p++)
        write_maybe(t, sm_part_name((enum sm_part)p), s->part[p]);
    sm_json_close_object(t);
}

static void write_others(struct sm_text *t, const struct sm_event_capture *c)
{
    bool ranges = false;

    if (c->n_others == 0)
        return;
    sm_json_object(t, "with");
    for (size_t i = 0; i < c->n_others; i++) {
        sm_json_real(t, c->other[i].name, c->other[i].value);
        ranges = ranges || c->other[i].range.has;
    }
    sm_json_close_object(t);
    if (!ranges)
        return;
    sm_json_object(t, "with_range");
    for (size_t i = 0; i < c->n_others; i++)
        write_maybe(t, c->other[i].name, c->other[i].range);
    sm_json_close_object(t);
}

static void write_settled(struct sm_text *t, const struct sm_settled *s, double tolerance)
{
    sm_json_real(t, "expanded_uncertainty", s->u95);
    write_parts(t, s);
    sm_json_list(t, "window");
    sm_json_int(t, NULL, s->from_t_ns);
    sm_json_int(t, NULL, s->to_t_ns);
    sm_json_close_list(t);
    sm_json_int(t, "readings", s->readings);
    sm_json_int(t, "lifts", s->lifts);
    sm_json_real(t, "sd", s->sd);
    if (s->step != 0)
        sm_json_real(t, "step", s->step);
    sm_json_text(t, "rule", sm_rule_name(s->rule));
    sm_json_bool(t, "prescribed", s->prescribed);
    sm_json_real(t, "tolerance", tolerance);
    sm_json_int(t, "since_moved", s->since_moved_ns);
    write_maybe(t, "end_value", s->end_value);
    write_maybe(t, "doubt", s->doubt);
}

static void write_capture(struct sm_text *t, const struct sm_event_capture *c)
{
    sm_json_some(t, "moved", c->moved);
    write_where(t, &c->where, c->name);
    sm_json_int(t, "number", c->number);
    sm_json_real(t, "value", c->value);
    sm_json_words(t, "unit", sm_unit_name(c->unit));
    write_settled(t, &c->s, c->tolerance);
    write_others(t, c);
    sm_json_words(t, "who", c->who);
    write_sentences(t, c->remark, c->n_remarks);
}

static void write_check(struct sm_text *t, const struct sm_event_check *c)
{
    sm_json_int(t, "capture", c->capture);
    sm_json_some(t, "curve", c->curve);
    write_where(t, &c->where, NULL);
    sm_json_real(t, "want", c->want);
    if (c->computed) {
        sm_json_real(t, "found", c->found);
        sm_json_real(t, "difference", c->difference);
    }
    sm_json_real(t, "within", c->within);
    sm_json_words(t, "unit", sm_unit_name(c->unit));
    sm_json_bool(t, "closing", c->closing);
    sm_json_bool(t, "pass", c->pass);
    sm_json_words(t, "why", c->why);
}

static void write_result(struct sm_text *t, const struct sm_event_result *r)
{
    sm_json_int(t, "capture", r->capture);
    sm_json_some(t, "curve", r->curve);
    write_where(t, &r->where, r->name);
    if (r->has_value)
        sm_json_real(t, "value", r->value);
    sm_json_words(t, "unit", sm_unit_name(r->unit));
    if (r->has_u95)
        sm_json_real(t, "expanded_uncertainty", r->u95);
    sm_json_words(t, "shown", r->shown);
    if (r->has_temperature)
        sm_json_real(t, "temperature", r->temperature_c);
    sm_json_words(t, "temperature_how", r->temperature_how);
    sm_json_text(t, "state", sm_result_state_name(r->state));
    sm_json_words(t, "why", r->why);
    write_sentences(t, r->remark, r->n_remarks);
}

static void write_change(struct sm_text *t, const struct sm_event_change *c)
{
    sm_json_some(t, "check", c->check);
    sm_json_words(t, "why", c->why);
    sm_json_list(t, "results");
    for (size_t i = 0; i < c->n; i++)
        sm_json_int(t, NULL, c->result[i]);
    sm_json_close_list(t);
}

static void write_answer(struct sm_text *t, const struct sm_event_answer *a)
{
    sm_json_int(t, "act", a->act);
    sm_json_words(t, "id", a->id);
    sm_json_bool(t, "done", a->done);
    sm_json_words(t, "why", a->why);
}

static void write_moved(struct sm_text *t, const struct sm_event_moved *m)
{
    sm_json_text(t, "by", sm_moved_by_name(m->by));
    sm_json_some(t, "of", m->of);
    write_where(t, &m->where, NULL);
    sm_json_int(t, "began", m->began_t_ns);
    sm_json_words(t, "why", m->why);
}

static void write_unread(struct sm_text *t, const struct sm_event_unread *u)
{
    if (u->counted) {
        sm_json_int(t, "count", (int64_t)u->count);
        return;
    }
    sm_json_text(t, "line", sm_line_kind_name(u->kind));
    sm_json_bytes(t, "b", u->line, u->n);
    if (u->length != u->n)
        sm_json_size(t, "length", u->length);
    sm_json_words(t, "why", u->why);
}

static void write_reading(struct sm_text *t, const struct sm_reading *r)
{
    sm_json_list(t, "values");
    for (size_t i = 0; i < r->n; i++) {
        const struct sm_value *v = &r->channel[i];

        sm_json_object(t, NULL);
        if (v->present) {
            if (v->flag == SM_FLAG_OK) {
                sm_json_real(t, "value", v->value);
                if (v->step != 0)
                    sm_json_real(t, "step", v->step);
            }
            sm_json_words(t, "digits", v->digits);
            if (v->flag != SM_FLAG_OK)
                sm_json_text(t, "flag", sm_flag_name(v->flag));
        }
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

/* What is at most a line or two each. */
static void write_small(struct sm_text *t, const struct sm_event *e)
{
    switch (e->kind) {
    case SM_EVENT_QUESTION:
        sm_json_int(t, "capture", e->u.question.capture);
        sm_json_words(t, "asks", e->u.question.asks);
        sm_json_text(t, "text", e->u.question.text);
        break;
    case SM_EVENT_TRANSIT:
        sm_json_int(t, "from", e->u.transit.from_t_ns);
        sm_json_int(t, "to", e->u.transit.to_t_ns);
        sm_json_text(t, "how", sm_transit_how_name(e->u.transit.how));
        sm_json_bool(t, "returned", e->u.transit.returned);
        break;
    case SM_EVENT_NOT_SETTLED:
        sm_json_some(t, "moved", e->u.not_settled.moved);
        write_where(t, &e->u.not_settled.where, NULL);
        sm_json_words(t, "why", e->u.not_settled.why);
        break;
    case SM_EVENT_SILENT:
        if (e->u.silent.last_line_t_ns != SM_NEVER)
            sm_json_int(t, "last_line", e->u.silent.last_line_t_ns);
        break;
    case SM_EVENT_ASK:
        sm_json_bytes(t, "b", e->u.ask.text, e->u.ask.n);
        if (e->u.ask.identity)
            sm_json_bool(t, "identity", true);
        break;
    case SM_EVENT_SETTLING:
        sm_json_real(t, "latest", e->u.settling.latest);
        sm_json_words(t, "unit", sm_unit_name(e->u.settling.unit));
        sm_json_int(t, "since_moved", e->u.settling.since_moved_ns);
        write_maybe(t, "to_come", e->u.settling.to_come);
        write_maybe(t, "wait_s", e->u.settling.wait_s);
        break;
    default: /* open-circuit says it all by its kind */
        break;
    }
}

void sm_entry_event(struct sm_text *t, const struct sm_event *e)
{
    sm_json_head(t, e->n, e->t_ns, e->utc_us, sm_event_kind_name(e->kind));
    switch (e->kind) {
    case SM_EVENT_CAPTURE:
        write_capture(t, &e->u.capture);
        break;
    case SM_EVENT_CURVE:
        sm_event_curve_write(t, &e->u.curve);
        break;
    case SM_EVENT_CHECK:
        write_check(t, &e->u.check);
        break;
    case SM_EVENT_RESULT:
        write_result(t, &e->u.result);
        break;
    case SM_EVENT_HOLD:
    case SM_EVENT_RELEASE:
        write_change(t, &e->u.change);
        break;
    case SM_EVENT_ANSWER:
        write_answer(t, &e->u.answer);
        break;
    case SM_EVENT_MOVED:
        write_moved(t, &e->u.moved);
        break;
    case SM_EVENT_UNREAD:
        write_unread(t, &e->u.unread);
        break;
    case SM_EVENT_CARRIED:
        sm_carried_sections(t, e->u.carried);
        break;
    case SM_EVENT_READING:
        write_reading(t, &e->u.reading);
        break;
    default:
        write_small(t, e);
        break;
    }
    sm_json_end(t);
}
