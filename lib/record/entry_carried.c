/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_carried.c: what is carried, as JSON. A section is left out when empty, and so is a key
 * whose value is none, unknown or "no". Ages are ns.
 *
 *   run          runs, captures (counted ever), number, sheet, next (0 is the first item), open,
 *                left, items [{captures, capture, skipped}]
 *   curve        n, accepted, ended, why, sensor, method, age,
 *                points [{capture, item, name, x, y, expanded_uncertainty, temperature}]
 *   results      [{n, run, item, state, why}]
 *   checks       since, last_good, last
 *   questions    [{n, capture}]
 *   people       on_duty
 *   last         capture, item, name, value, expanded_uncertainty, place
 *   rest         age
 *   temperature  value (°C), who, age
 *   acts         [ids], oldest first
 *   channel      noise, long_noise, step, usual_wait {standard, check, sample} (s), captures
 *   sensor       its name
 *   meter        identity, settings, adapter
 *   cups         (not written yet) */
#include "record/carried.h"

#include "record/json.h"

const char *const sm_carried_class[SM_CLASS_COUNT] = { "standard", "check", "sample" };

/* Only where true. */
static void write_true(struct sm_text *t, const char *key, bool v)
{
    if (v)
        sm_json_bool(t, key, true);
}

/* Only where known: the channel's memory has 0 for unknown. */
static void write_known(struct sm_text *t, const char *key, double v)
{
    if (v != 0)
        sm_json_real(t, key, v);
}

static void write_items(struct sm_text *t, const struct sm_carried_run *r)
{
    sm_json_list(t, "items");
    for (size_t i = 0; i < r->n_items; i++) {
        const struct sm_carried_item *item = &r->item[i];

        sm_json_object(t, NULL);
        sm_json_some(t, "captures", item->captures);
        sm_json_some(t, "capture", item->capture);
        write_true(t, "skipped", item->skipped);
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

static void write_run(struct sm_text *t, const struct sm_carried *c)
{
    const struct sm_carried_run *r = &c->run;

    if (!r->has && c->runs == 0 && c->captures == 0)
        return;
    sm_json_object(t, "run");
    sm_json_some(t, "runs", c->runs);
    sm_json_some(t, "captures", c->captures);
    if (r->has) {
        sm_json_int(t, "number", r->number);
        sm_json_words(t, "sheet", r->sheet);
        sm_json_size(t, "next", r->next);
        write_true(t, "open", r->open);
        write_true(t, "left", r->left);
        write_items(t, r);
    }
    sm_json_close_object(t);
}

static void write_point(struct sm_text *t, const struct sm_carried_point *p)
{
    sm_json_object(t, NULL);
    sm_json_some(t, "capture", p->capture);
    sm_json_some(t, "item", (int64_t)p->item);
    sm_json_words(t, "name", p->name);
    sm_json_real(t, "x", p->x);
    sm_json_real(t, "y", p->y);
    sm_json_real(t, "expanded_uncertainty", p->u95_y);
    sm_json_real(t, "temperature", p->t_c);
    sm_json_close_object(t);
}

static void write_curve(struct sm_text *t, const struct sm_carried_curve *c)
{
    if (!c->has)
        return;
    sm_json_object(t, "curve");
    sm_json_some(t, "n", c->n);
    write_true(t, "accepted", c->accepted);
    write_true(t, "ended", c->ended);
    sm_json_words(t, "why", c->why_ended);
    sm_json_words(t, "sensor", c->sensor);
    sm_json_words(t, "method", c->method);
    sm_json_int(t, "age", c->age_ns);
    sm_json_list(t, "points");
    for (size_t i = 0; i < c->n_points; i++)
        write_point(t, &c->point[i]);
    sm_json_close_list(t);
    sm_json_close_object(t);
}

static void write_results(struct sm_text *t, const struct sm_carried *c)
{
    if (c->n_results == 0)
        return;
    sm_json_list(t, "results");
    for (size_t i = 0; i < c->n_results; i++) {
        const struct sm_carried_result *r = &c->result[i];

        sm_json_object(t, NULL);
        sm_json_int(t, "n", r->n);
        sm_json_some(t, "run", r->run);
        sm_json_some(t, "item", (int64_t)r->item);
        sm_json_text(t, "state", sm_result_state_name(r->state));
        sm_json_words(t, "why", r->why);
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

static void write_checks(struct sm_text *t, const struct sm_carried *c)
{
    if (!c->checks.has)
        return;
    sm_json_object(t, "checks");
    sm_json_int(t, "since", c->checks.since);
    sm_json_some(t, "last_good", c->checks.last_good);
    sm_json_some(t, "last", c->checks.last);
    sm_json_close_object(t);
}

static void write_questions(struct sm_text *t, const struct sm_carried *c)
{
    if (c->n_questions == 0)
        return;
    sm_json_list(t, "questions");
    for (size_t i = 0; i < c->n_questions; i++) {
        sm_json_object(t, NULL);
        sm_json_int(t, "n", c->question[i].n);
        sm_json_some(t, "capture", c->question[i].capture);
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

static void write_last(struct sm_text *t, const struct sm_carried *c)
{
    if (c->on_duty[0] != '\0') {
        sm_json_object(t, "people");
        sm_json_text(t, "on_duty", c->on_duty);
        sm_json_close_object(t);
    }
    if (!c->last.has)
        return;
    sm_json_object(t, "last");
    sm_json_int(t, "capture", c->last.capture);
    sm_json_some(t, "item", (int64_t)c->last.item);
    sm_json_words(t, "name", c->last.name);
    sm_json_real(t, "value", c->last.value);
    sm_json_real(t, "expanded_uncertainty", c->last.u95);
    sm_json_text(t, "place", sm_place_name(c->last.place));
    sm_json_close_object(t);
}

static void write_rest(struct sm_text *t, const struct sm_carried *c)
{
    if (c->rest.has) {
        sm_json_object(t, "rest");
        sm_json_int(t, "age", c->rest.age_ns);
        sm_json_close_object(t);
    }
    if (c->temperature.has) {
        sm_json_object(t, "temperature");
        sm_json_real(t, "value", c->temperature.value_c);
        sm_json_words(t, "who", c->temperature.who);
        sm_json_int(t, "age", c->temperature.age_ns);
        sm_json_close_object(t);
    }
}

static void write_acts(struct sm_text *t, const struct sm_carried *c)
{
    if (c->n_acts == 0)
        return;
    sm_json_list(t, "acts");
    for (size_t i = 0; i < c->n_acts; i++)
        sm_json_text(t, NULL, c->act[i]);
    sm_json_close_list(t);
}

static void write_channel(struct sm_text *t, const struct sm_channel_memory *m)
{
    bool waits = false, any;

    for (size_t i = 0; i < SM_CLASS_COUNT; i++)
        waits = waits || m->usual_wait_s[i] != 0;
    any = waits || m->noise != 0 || m->long_noise != 0 || m->step != 0 || m->captures != 0;
    if (!any)
        return;
    sm_json_object(t, "channel");
    write_known(t, "noise", m->noise);
    write_known(t, "long_noise", m->long_noise);
    write_known(t, "step", m->step);
    if (waits) {
        sm_json_object(t, "usual_wait");
        for (size_t i = 0; i < SM_CLASS_COUNT; i++)
            write_known(t, sm_carried_class[i], m->usual_wait_s[i]);
        sm_json_close_object(t);
    }
    sm_json_some(t, "captures", m->captures);
    sm_json_close_object(t);
}

static void write_meter(struct sm_text *t, const struct sm_carried *c)
{
    sm_json_words(t, "sensor", c->sensor);
    if (c->meter.identity[0] == '\0' && c->meter.settings[0] == '\0' && c->meter.adapter[0] == '\0')
        return;
    sm_json_object(t, "meter");
    sm_json_words(t, "identity", c->meter.identity);
    sm_json_words(t, "settings", c->meter.settings);
    sm_json_words(t, "adapter", c->meter.adapter);
    sm_json_close_object(t);
}

void sm_carried_sections(struct sm_text *t, const struct sm_carried *c)
{
    write_run(t, c);
    write_curve(t, &c->curve);
    write_results(t, c);
    write_checks(t, c);
    write_questions(t, c);
    write_last(t, c);
    write_rest(t, c);
    write_acts(t, c);
    write_channel(t, &c->channel);
    write_meter(t, c);
}

void sm_carried_write(struct sm_text *t, const struct sm_carried *c)
{
    sm_text_addn(t, "{", 1);
    sm_carried_sections(t, c);
    sm_text_addn(t, "}", 1);
}
