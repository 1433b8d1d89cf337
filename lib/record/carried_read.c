/* SPDX-License-Identifier: GPL-3.0-or-later */
/* carried_read.c: `carried` out of a log, every count and index within its bounds. The keys are
 * listed in entry_carried.c. */
#include <math.h>
#include <string.h>

#include "record/carried.h"
#include "record/fields.h"

static void take_n(struct sm_fields *f, const char *key, int64_t *ret)
{
    sm_fields_int(f, key, 0, INT64_MAX, ret);
}

/* An item's number in a sheet, from 1; 0 none. */
static void take_item(struct sm_fields *f, size_t *ret)
{
    sm_fields_size(f, "item", SM_ITEMS_MAX, ret);
}

/* Left out: unknown. */
static void take_unknown(struct sm_fields *f, const char *key, double *ret)
{
    if (!sm_fields_real(f, key, ret))
        *ret = NAN;
}

static void take_needed(struct sm_fields *f, const char *key, double *ret)
{
    if (!sm_fields_real(f, key, ret))
        sm_taking_refuse(f->taking, "%s: %s is missing", f->where, key);
}

static void take_items(struct sm_fields *f, struct sm_carried_run *r)
{
    const json_t *list = sm_fields_list(f, "items", SM_ITEMS_MAX);

    r->n_items = list != NULL ? json_array_size(list) : 0;
    for (size_t i = 0; i < r->n_items; i++) {
        struct sm_carried_item *item = &r->item[i];
        struct sm_fields in;

        if (!sm_fields_begin(&in, f->taking, json_array_get(list, i), "run: item"))
            return;
        sm_fields_unsigned(&in, "captures", &item->captures);
        take_n(&in, "capture", &item->capture);
        sm_fields_bool(&in, "skipped", &item->skipped);
        sm_fields_end(&in);
    }
}

static void take_run(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_carried_run *r = &c->run;
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "run"))
        return;
    take_n(&f, "runs", &c->runs);
    take_n(&f, "captures", &c->captures);
    r->has = sm_fields_int(&f, "number", 0, INT64_MAX, &r->number);
    sm_fields_plain(&f, "sheet", r->sheet, sizeof r->sheet);
    take_items(&f, r);
    sm_fields_size(&f, "next", r->n_items, &r->next);
    sm_fields_bool(&f, "open", &r->open);
    sm_fields_bool(&f, "left", &r->left);
    sm_fields_end(&f);
    if (!r->has && (r->n_items > 0 || r->open || r->left))
        sm_taking_refuse(k, "run: items without a number");
    if ((r->open || r->left) && r->next >= r->n_items)
        sm_taking_refuse(k, "run: open beyond its last item");
}

static void take_point(struct sm_taking *k, const json_t *o, struct sm_carried_point *p)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "curve: point"))
        return;
    take_n(&f, "capture", &p->capture);
    take_item(&f, &p->item);
    sm_fields_plain(&f, "name", p->name, sizeof p->name);
    take_needed(&f, "x", &p->x);
    take_needed(&f, "y", &p->y);
    take_unknown(&f, "expanded_uncertainty", &p->u95_y);
    take_unknown(&f, "temperature", &p->t_c);
    sm_fields_end(&f);
}

static void take_curve(struct sm_taking *k, const json_t *o, struct sm_carried_curve *c)
{
    const json_t *list;
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "curve"))
        return;
    c->has = true;
    take_n(&f, "n", &c->n);
    sm_fields_bool(&f, "accepted", &c->accepted);
    sm_fields_bool(&f, "ended", &c->ended);
    sm_fields_text(&f, "why", c->why_ended, sizeof c->why_ended);
    sm_fields_plain(&f, "sensor", c->sensor, sizeof c->sensor);
    sm_fields_plain(&f, "method", c->method, sizeof c->method);
    take_n(&f, "age", &c->age_ns);
    list = sm_fields_list(&f, "points", SM_POINTS_MAX);
    c->n_points = list != NULL ? json_array_size(list) : 0;
    for (size_t i = 0; i < c->n_points; i++)
        take_point(k, json_array_get(list, i), &c->point[i]);
    sm_fields_end(&f);
}

static void take_result(struct sm_taking *k, const json_t *o, struct sm_carried_result *r)
{
    char state[24] = "";
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "results"))
        return;
    take_n(&f, "n", &r->n);
    take_n(&f, "run", &r->run);
    take_item(&f, &r->item);
    sm_fields_text(&f, "state", state, sizeof state);
    sm_fields_text(&f, "why", r->why, sizeof r->why);
    sm_fields_end(&f);
    if (strcmp(state, sm_result_state_name(SM_RESULT_PROVISIONAL)) == 0)
        r->state = SM_RESULT_PROVISIONAL;
    else if (strcmp(state, sm_result_state_name(SM_RESULT_HELD)) == 0)
        r->state = SM_RESULT_HELD;
    else
        sm_taking_refuse(k, "results: state: expected provisional or held");
}

static void take_results(struct sm_fields *f, struct sm_carried *c)
{
    const json_t *list = sm_fields_list(f, "results", SM_RESULTS_MAX);

    c->n_results = list != NULL ? json_array_size(list) : 0;
    for (size_t i = 0; i < c->n_results; i++)
        take_result(f->taking, json_array_get(list, i), &c->result[i]);
}

static void take_checks(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "checks"))
        return;
    c->checks.has = true;
    sm_fields_unsigned(&f, "since", &c->checks.since);
    take_n(&f, "last_good", &c->checks.last_good);
    take_n(&f, "last", &c->checks.last);
    sm_fields_end(&f);
}

static void take_questions(struct sm_fields *f, struct sm_carried *c)
{
    const json_t *list = sm_fields_list(f, "questions", SM_QUESTIONS_MAX);

    c->n_questions = list != NULL ? json_array_size(list) : 0;
    for (size_t i = 0; i < c->n_questions; i++) {
        struct sm_fields in;

        if (!sm_fields_begin(&in, f->taking, json_array_get(list, i), "questions"))
            return;
        take_n(&in, "n", &c->question[i].n);
        take_n(&in, "capture", &c->question[i].capture);
        sm_fields_end(&in);
    }
}

static void take_people(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "people"))
        return;
    sm_fields_plain(&f, "on_duty", c->on_duty, sizeof c->on_duty);
    sm_fields_end(&f);
}

static void take_last(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    static const enum sm_place places[] = { SM_AT_UNKNOWN, SM_AT_STILL, SM_AT_LEFT };
    char place[24] = "";
    bool known = false;
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "last"))
        return;
    c->last.has = true;
    take_n(&f, "capture", &c->last.capture);
    take_item(&f, &c->last.item);
    sm_fields_plain(&f, "name", c->last.name, sizeof c->last.name);
    take_needed(&f, "value", &c->last.value);
    take_unknown(&f, "expanded_uncertainty", &c->last.u95);
    sm_fields_text(&f, "place", place, sizeof place);
    sm_fields_end(&f);
    for (size_t i = 0; i < sizeof places / sizeof places[0] && !known; i++) {
        known = strcmp(place, sm_place_name(places[i])) == 0;
        c->last.place = places[i];
    }
    if (!known)
        sm_taking_refuse(k, "last: place: expected one of unknown, still in it, left");
}

static void take_rest(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "rest"))
        return;
    c->rest.has = true;
    take_n(&f, "age", &c->rest.age_ns);
    sm_fields_end(&f);
}

static void take_temperature(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "temperature"))
        return;
    c->temperature.has = true;
    take_needed(&f, "value", &c->temperature.value_c);
    sm_fields_plain(&f, "who", c->temperature.who, sizeof c->temperature.who);
    take_n(&f, "age", &c->temperature.age_ns);
    sm_fields_end(&f);
}

static void take_acts(struct sm_fields *f, struct sm_carried *c)
{
    const json_t *list = sm_fields_list(f, "acts", SM_ACT_IDS_MAX);

    c->n_acts = list != NULL ? json_array_size(list) : 0;
    for (size_t i = 0; i < c->n_acts; i++) {
        const json_t *id = json_array_get(list, i);
        const size_t n = json_string_length(id);

        if (!json_is_string(id) || n == 0 || n >= sizeof c->act[i] ||
            strlen(json_string_value(id)) != n) {
            sm_taking_refuse(f->taking, "acts: expected ids of 1 to %zu characters",
                             sizeof c->act[i] - 1);
            return;
        }
        memcpy(c->act[i], json_string_value(id), n + 1);
    }
}

static void take_channel(struct sm_taking *k, const json_t *o, struct sm_channel_memory *m)
{
    struct sm_fields f, waits;
    const json_t *usual;

    if (!sm_fields_begin(&f, k, o, "channel"))
        return;
    sm_fields_real(&f, "noise", &m->noise);
    sm_fields_real(&f, "long_noise", &m->long_noise);
    sm_fields_real(&f, "step", &m->step);
    sm_fields_unsigned(&f, "captures", &m->captures);
    usual = sm_fields_get(&f, "usual_wait");
    if (usual != NULL && sm_fields_begin(&waits, k, usual, "channel: usual_wait")) {
        for (size_t i = 0; i < SM_CLASS_COUNT; i++)
            sm_fields_real(&waits, sm_carried_class[i], &m->usual_wait_s[i]);
        sm_fields_end(&waits);
    }
    sm_fields_end(&f);
    if (m->noise < 0 || m->long_noise < 0 || m->step < 0)
        sm_taking_refuse(k, "channel: noise, long_noise and step are not negative");
}

static void take_meter(struct sm_taking *k, const json_t *o, struct sm_carried *c)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "meter"))
        return;
    sm_fields_text(&f, "identity", c->meter.identity, sizeof c->meter.identity);
    sm_fields_text(&f, "settings", c->meter.settings, sizeof c->meter.settings);
    sm_fields_text(&f, "adapter", c->meter.adapter, sizeof c->meter.adapter);
    sm_fields_end(&f);
}

static void take_sections(struct sm_fields *f, struct sm_carried *c)
{
    struct sm_taking *k = f->taking;
    const json_t *o;

    if ((o = sm_fields_get(f, "run")) != NULL)
        take_run(k, o, c);
    if ((o = sm_fields_get(f, "curve")) != NULL)
        take_curve(k, o, &c->curve);
    take_results(f, c);
    if ((o = sm_fields_get(f, "checks")) != NULL)
        take_checks(k, o, c);
    take_questions(f, c);
    if ((o = sm_fields_get(f, "people")) != NULL)
        take_people(k, o, c);
    if ((o = sm_fields_get(f, "last")) != NULL)
        take_last(k, o, c);
    if ((o = sm_fields_get(f, "rest")) != NULL)
        take_rest(k, o, c);
    if ((o = sm_fields_get(f, "temperature")) != NULL)
        take_temperature(k, o, c);
    take_acts(f, c);
    if ((o = sm_fields_get(f, "channel")) != NULL)
        take_channel(k, o, &c->channel);
    sm_fields_plain(f, "sensor", c->sensor, sizeof c->sensor);
    if ((o = sm_fields_get(f, "meter")) != NULL)
        take_meter(k, o, c);
}

/* In an entry the sections stand beside its head. */
static void pass_head(struct sm_fields *f)
{
    static const char *const head[] = { "n", "t", "utc", "k" };

    if (json_object_get(f->o, "k") == NULL)
        return;
    for (size_t i = 0; i < sizeof head / sizeof head[0]; i++)
        sm_fields_get(f, head[i]);
}

enum sm_status sm_carried_read(const json_t *o, struct sm_carried *ret_carried,
                               unsigned *ret_passed_over, char ret_why[SM_REASON_SIZE])
{
    struct sm_taking k;
    struct sm_fields f;

    sm_taking_begin(&k, ret_why);
    if (sm_fields_begin(&f, &k, o, "carried")) {
        sm_carried_init(ret_carried);
        pass_head(&f);
        take_sections(&f, ret_carried);
        sm_fields_end(&f);
    }
    if (k.bad)
        return SM_ESYNTAX;
    *ret_passed_over = k.passed_over;
    return SM_OK;
}
