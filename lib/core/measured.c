/* SPDX-License-Identifier: GPL-3.0-or-later */
/* measured.c: what a capture becomes: a point of the curve, a check's verdict, a result. */
#include "core/inside.h"

#include <assert.h>
#include <math.h>
#include <string.h>

/* Index among the signal's "other" channels of a channel of the profile. */
static size_t other_of(const struct sm_core *c, int channel)
{
    return (size_t)(channel < c->signal_at ? channel : channel - 1);
}

bool sm_core_temperature(const struct sm_core *c, const struct sm_settled *s, double *ret_c,
                         const char **ret_how)
{
    switch (c->method->temperature_from) {
    case SM_TEMPERATURE_CHANNEL:
        if (c->temperature_at < 0 || !s->other_mean[other_of(c, c->temperature_at)].has)
            return false;
        *ret_c = s->other_mean[other_of(c, c->temperature_at)].value;
        *ret_how = "measured";
        return true;
    case SM_TEMPERATURE_TYPED:
        if (!c->now->temperature.has)
            return false;
        *ret_c = c->now->temperature.value_c;
        *ret_how = "typed";
        return true;
    case SM_TEMPERATURE_ASSUMED:
        *ret_c = c->method->assumed_c;
        *ret_how = "assumed";
        return true;
    }
    return false;
}

/* Every provisional result of the run becomes what `kind` says. */
static void change_provisional(struct sm_core *c, enum sm_event_kind kind, int64_t check_n,
                               const char *why)
{
    struct sm_carried *now = c->now;
    struct sm_event_change *change = NULL;
    size_t kept = 0;

    for (size_t i = 0; i < now->n_results; i++) {
        struct sm_carried_result *r = &now->result[i];

        if (r->state == SM_RESULT_PROVISIONAL) {
            if (change == NULL)
                change = &sm_core_push(c, kind)->u.change;
            change->result[change->n++] = r->n;
            if (kind == SM_EVENT_RELEASE)
                continue; /* final: not carried any more */
            r->state = SM_RESULT_HELD;
            sm_text_copy(r->why, sizeof r->why, why);
        }
        now->result[kept++] = *r;
    }
    now->n_results = kept;
    if (change != NULL) {
        change->check = check_n;
        sm_text_copy(change->why, sizeof change->why, why);
    }
}

void sm_core_hold_provisional(struct sm_core *c, int64_t check_n, const char *why)
{
    change_provisional(c, SM_EVENT_HOLD, check_n, why);
}

/* Reads the check standard off the curve; false: ret_e->why says why it could not. */
static bool read_check(struct sm_core *c, const struct sm_event_capture *cap,
                       struct sm_event_check *ret_e)
{
    const struct sm_item *item = &c->sheet->item[cap->where.item - 1];
    const struct sm_curve *curve;
    struct sm_read_off read;
    double t_c = (double)NAN;
    const char *how;
    const bool has_t = sm_core_temperature(c, &cap->s, &t_c, &how);

    if (!sm_core_value(c, item, t_c, &ret_e->want, ret_e->why))
        return false;
    curve = sm_core_curve(c, ret_e->why);
    if (curve == NULL)
        return false;
    if ((!has_t && curve->model == SM_MODEL_NERNST) ||
        sm_curve_read(curve, cap->value, 1, t_c, &read) != SM_OK || !isfinite(read.x)) {
        sm_text_copy(ret_e->why, sizeof ret_e->why,
                     has_t ? "the curve gives no value for this reading"
                           : "the temperature of the check standard is not known");
        return false;
    }
    ret_e->found = read.x;
    ret_e->difference = read.x - ret_e->want;
    return true;
}

static void on_check(struct sm_core *c, const struct sm_event_capture *cap, int64_t n)
{
    struct sm_event *event = sm_core_push(c, SM_EVENT_CHECK);
    struct sm_event_check *e = &event->u.check;
    const int64_t check_n = event->n;

    e->capture = n;
    e->curve = c->now->curve.n;
    e->where = cap->where;
    e->unit = c->method->measures;
    e->within = c->method->check.has ? c->method->check.value : (double)NAN; /* NaN: unknown */
    e->want = (double)NAN;
    e->closing = sm_run_closing(c->sheet, cap->where.item - 1);
    e->computed = read_check(c, cap, e);
    if (e->computed)
        e->pass = sm_judge_check(c->method, e->want, e->found, e->why);
    c->now->checks.has = true;
    c->now->checks.last = check_n;
    if (e->pass) {
        c->now->checks.since = 0;
        c->now->checks.last_good = check_n;
        if (sm_run_checks_done(&c->now->run, c->sheet))
            change_provisional(c, SM_EVENT_RELEASE, check_n,
                               "the check that closes their bracket passed");
    } else {
        sm_core_hold_provisional(c, check_n,
                                 "the check after them failed: measure them again on a good curve");
    }
}

/* Puts a result that is not final where it is carried; the oldest held one makes room. */
static void carry_result(struct sm_core *c, int64_t n, const struct sm_event_result *e)
{
    struct sm_carried *now = c->now;
    struct sm_carried_result *r;

    if (now->n_results == SM_RESULTS_MAX) {
        size_t oldest = 0;

        while (oldest + 1 < now->n_results && now->result[oldest].state != SM_RESULT_HELD)
            oldest++;
        memmove(&now->result[oldest], &now->result[oldest + 1],
                (now->n_results - oldest - 1) * sizeof now->result[0]);
        now->n_results--;
    }
    r = &now->result[now->n_results++];
    r->n = n;
    r->run = e->where.run;
    r->item = e->where.item;
    r->state = e->state;
    sm_text_copy(r->why, sizeof r->why, e->why);
}

static void on_sample(struct sm_core *c, const struct sm_event_capture *cap, int64_t n)
{
    struct sm_event *event = sm_core_push(c, SM_EVENT_RESULT);
    struct sm_event_result *e = &event->u.result;
    const struct sm_curve *curve = sm_core_curve(c, e->why);
    struct sm_made_result made;
    const char *how = "";

    e->capture = n;
    e->where = cap->where;
    sm_text_copy(e->name, sizeof e->name, cap->name);
    e->unit = c->method->measures;
    e->has_temperature = sm_core_temperature(c, &cap->s, &e->temperature_c, &how);
    sm_text_copy(e->temperature_how, sizeof e->temperature_how, how);
    e->state = SM_RESULT_HELD;
    if (curve != NULL) {
        e->curve = c->now->curve.n;
        sm_result_make(c->method, curve, cap->value, cap->s.u95, e->has_temperature,
                       e->temperature_c, c->mean_u2, &made);
        e->has_value = made.has_value;
        e->value = made.value;
        e->has_u95 = made.has_value && isfinite(made.u95);
        e->u95 = made.u95;
        sm_text_copy(e->shown, sizeof e->shown, made.shown);
        sm_text_copy(e->why, sizeof e->why,
                     made.held ? made.why : "waits for the check that closes its bracket");
        if (!made.held)
            e->state = SM_RESULT_PROVISIONAL;
    }
    if (cap->where.kind != SM_ITEM_BLANK) {
        c->now->checks.has = true;
        c->now->checks.since++;
    }
    carry_result(c, event->n, e);
}

/* With a sheet under way, a capture that could not be given to an item is asked about; it may have
 * been item run.next, so that a transit alone does not go on from it. */
static void ask_which(struct sm_core *c, int64_t n)
{
    struct sm_carried *now = c->now;
    struct sm_event *event;

    if (!c->has_sheet || now->run.next >= now->run.n_items || c->immersion.why_not_given[0] == '\0')
        return;
    sm_core_unsure(c);
    if (now->n_questions == SM_QUESTIONS_MAX)
        return;
    event = sm_core_push(c, SM_EVENT_QUESTION);
    event->u.question.capture = n;
    sm_text_copy(event->u.question.asks, sizeof event->u.question.asks, "beaker");
    sm_text_copy(event->u.question.text, sizeof event->u.question.text, c->immersion.why_not_given);
    now->question[now->n_questions].n = event->n;
    now->question[now->n_questions].capture = n;
    now->n_questions++;
    c->change_n = event->n;
}

static void fill_others(const struct sm_core *c, struct sm_event_capture *e)
{
    const struct sm_profile *p = c->setup->profile;

    for (size_t i = 0; i < p->n_channels; i++) {
        size_t o;

        if ((int)i == c->signal_at)
            continue;
        o = other_of(c, (int)i);
        if (!e->s.other_mean[o].has)
            continue;
        sm_text_copy(e->other[e->n_others].name, sizeof e->other[0].name, p->channel[i].name);
        e->other[e->n_others].value = e->s.other_mean[o].value;
        e->other[e->n_others].range = e->s.other_range[o];
        e->n_others++;
    }
}

static void fill_capture(const struct sm_core *c, const struct sm_settled *s,
                         struct sm_event_capture *e)
{
    struct sm_text name;

    e->moved = c->immersion.moved_n;
    e->where = c->immersion.where;
    e->number = c->now->captures;
    sm_text_init(&name, e->name, sizeof e->name);
    if (e->where.has)
        sm_text_add(&name, e->where.name);
    else
        sm_text_addf(&name, "capture %lld", (long long)e->number);
    e->value = s->value;
    e->unit = c->setup->profile->channel[c->signal_at].unit;
    e->s = *s;
    e->tolerance = s->tolerance;
    fill_others(c, e);
    sm_text_copy(e->who, sizeof e->who, c->now->on_duty);
    if (c->immersion.early)
        sm_text_copy(e->remark[e->n_remarks++], SM_REASON_SIZE,
                     "no item: the probe was here when the sheet was handed over; press next if it "
                     "is in the first item already");
    else if (!e->where.has && c->immersion.why_not_given[0] != '\0')
        sm_text_copy(e->remark[e->n_remarks++], SM_REASON_SIZE, "beaker not confirmed");
}

/* A transit came before it, and it reads like the item before: within the larger of two tolerances
 * and that capture's U. It may be the same beaker again. A mark has said that it is not. */
static bool reads_like_the_last(const struct sm_core *c, const struct sm_settled *s)
{
    const struct sm_carried_run *run = &c->now->run;
    const size_t item = c->now->last.item;

    return c->immersion.given && !c->immersion.marked && c->now->last.has && item > 0 &&
           item <= run->n_items && run->item[item - 1].capture == c->now->last.capture &&
           fabs(s->value - c->now->last.value) <= fmax(2 * s->tolerance, c->now->last.u95);
}

/* What reads like the item before it is given to nobody and asked about, unless the method wants no
 * marks: then it is remarked on. */
static void doubt(struct sm_core *c, const struct sm_settled *s, struct sm_event_capture *e)
{
    struct sm_immersion *im = &c->immersion;
    struct sm_whereabouts last;
    struct sm_text t;

    if (!reads_like_the_last(c, s))
        return;
    sm_core_where(c, c->now->last.item - 1, &last);
    if (c->method->marks == SM_MARKS_NONE) {
        sm_text_init(&t, e->remark[e->n_remarks++], SM_REASON_SIZE);
        sm_text_addf(&t, "reads like %.100s before it", last.name);
        return;
    }
    sm_text_init(&t, im->why_not_given, sizeof im->why_not_given);
    sm_text_addf(
        &t,
        "reads like %.60s: a new beaker, or the same again? Press next when the probe is in "
        "%.60s",
        last.name, im->where.name);
    im->given = false;
    memset(&im->where, 0, sizeof im->where);
    im->where.kind = SM_ITEM_NONE;
}

void sm_core_captured(struct sm_core *c, const struct sm_settled *s)
{
    struct sm_immersion *im = &c->immersion;
    struct sm_event *event = sm_core_push(c, SM_EVENT_CAPTURE);
    struct sm_event_capture *e = &event->u.capture;
    const int64_t n = event->n;

    assert(im->begun);
    c->now->captures++;
    doubt(c, s, e);
    fill_capture(c, s, e);
    im->captured = true;
    im->settled_t_ns = c->in.t_ns;
    c->now->last.has = true;
    c->now->last.capture = n;
    c->now->last.item = e->where.has ? e->where.item : 0;
    sm_text_copy(c->now->last.name, sizeof c->now->last.name, e->name);
    c->now->last.value = s->value;
    c->now->last.u95 = s->u95;
    c->change_n = n;
    c->dirty = true;
    if (im->given) {
        sm_run_captured(&c->now->run, n);
        im->given = false;
        c->marked = false;
    }
    switch (e->where.kind) {
    case SM_ITEM_STANDARD:
        sm_core_on_standard(c, e, n);
        break;
    case SM_ITEM_CHECK:
        on_check(c, e, n);
        break;
    case SM_ITEM_SAMPLE:
    case SM_ITEM_DUPLICATE:
    case SM_ITEM_SPIKE:
    case SM_ITEM_BLANK:
        on_sample(c, e, n);
        break;
    case SM_ITEM_NONE:
        ask_which(c, n);
        break;
    }
}
