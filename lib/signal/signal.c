/* SPDX-License-Identifier: GPL-3.0-or-later */
/* signal.c: the seam: inputs checked and handed on, events queued and given out. */
#include "signal/signal.h"

#include <assert.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "signal/inside.h"

#define SETTLING_EVERY_NS (SM_NS_PER_S / 4)
#define SPAN_MOST_NS (INT64_C(366) * 86400 * SM_NS_PER_S) /* of any time in a rule */
#define CLOCKS 32
#define AWAY_MOST_STRAY 3 /* so many readings beside the captured value may be stray */
#define AWAY_TOLERANCES 3.0
#define AWAY_NOISE 6.0
#define AWAY_TOLERANCES_MOST 10.0
#define USUAL_WEIGHT 0.25 /* of a new wait in the usual one */

#define VALUE_MOST 1e150 /* squares of more are no numbers any more; no meter shows it */

static bool span_ok(int64_t ns, int64_t least_ns)
{
    return ns >= least_ns && ns <= SPAN_MOST_NS;
}

static bool rule_ok(const struct sm_rule *r)
{
    if (!sm_rule_built(r->kind) || !span_ok(r->dwell_ns, 0))
        return false;
    for (unsigned c = 0; c < SM_CLASS_COUNT; c++) {
        if (!(r->tolerance[c] > 0) || !isfinite(r->tolerance[c]) ||
            !(r->doubt[c] >= 0 && r->doubt[c] <= 1) || !(r->drift_allowed_per_s[c] >= 0) ||
            !isfinite(r->drift_allowed_per_s[c]) || !span_ok(r->longest_wait_ns[c], 1))
            return false;
    }
    if (r->kind == SM_RULE_SPREAD && !span_ok(r->over_ns, 1))
        return false;
    return !r->has_plausible || r->plausible_from < r->plausible_to;
}

static bool memory_ok(const struct sm_channel_memory *m)
{
    return m->noise >= 0 && isfinite(m->noise) && m->step >= 0 && isfinite(m->step);
}

static bool start_ok(const struct sm_signal_start *s)
{
    return (s->place == SM_PLACE_NEW || s->place == SM_PLACE_STILL || s->place == SM_PLACE_LEFT) &&
           (s->place != SM_PLACE_STILL || (isfinite(s->value) && isfinite(s->u95)));
}

enum sm_status sm_signal_create(const struct sm_rule *rule, size_t n_others,
                                const struct sm_channel_memory *memory,
                                const struct sm_signal_start *start, struct sm_signal **ret_signal)
{
    const size_t n_groups = SM_WINDOW_GROUPS * n_others;
    struct sm_signal *s;
    struct sm_other_group *other;

    if (!rule_ok(rule) || n_others > SM_OTHERS_MAX || !memory_ok(memory) || !start_ok(start))
        return SM_EINVAL;
    s = calloc(1, sizeof *s);
    other = calloc(n_groups > 0 ? 2 * n_groups : 1, sizeof *other);
    if (s == NULL || other == NULL) {
        free(s);
        free(other);
        return SM_ENOMEM;
    }
    for (unsigned i = 0; i < 2; i++) {
        s->stay[i].window.n_others = n_others;
        s->stay[i].window.other = other + i * n_groups;
    }
    s->rule = *rule;
    s->memory = *memory;
    s->pace = sm_pace_of(rule->dwell_ns);
    sm_front_init(&s->front, s->pace, memory->noise, memory->step);
    sm_way_start(s, start);
    *ret_signal = s;
    return SM_OK;
}

void sm_signal_destroy(struct sm_signal *s)
{
    if (s == NULL)
        return;
    free(s->stay[0].window.other);
    free(s);
}

struct sm_signal_event *sm_signal_push(struct sm_signal *s, enum sm_signal_kind kind)
{
    struct sm_signal_event *e;

    assert(s->n_events < SM_SIGNAL_EVENTS);
    e = &s->event[s->n_events++];
    memset(e, 0, sizeof *e);
    e->kind = kind;
    e->t_ns = s->t_ns;
    e->clock = s->clock;
    return e;
}

bool sm_signal_next(struct sm_signal *s, struct sm_signal_event *ret_event)
{
    if (s->next_event == s->n_events)
        return false;
    *ret_event = s->event[s->next_event++];
    return true;
}

/* Waiting for the stay `now` to settle? */
static bool is_waiting(const struct sm_signal *s)
{
    const struct sm_stay *stay = &s->stay[s->now];

    return !s->rest && s->where == SM_STAYING && !stay->captured && !stay->given_up;
}

int64_t sm_signal_deadline(const struct sm_signal *s)
{
    const struct sm_stay *stay = &s->stay[s->now];
    const int64_t wait_ns = s->rule.longest_wait_ns[s->class];

    if (!is_waiting(s) || stay->moved_t_ns > SM_NEVER - wait_ns)
        return SM_NEVER;
    return stay->moved_t_ns + wait_ns;
}

/* What the passing of time alone brings. A way is told only up to the first reading whose meaning
 * is not known yet. */
static void on_time(struct sm_signal *s, int64_t t_ns)
{
    struct sm_signal_event *e;

    if (s->rest)
        return;
    sm_way_tell(s, s->front.n_odd > 0 ? s->front.odd[0].t_ns : t_ns);
    if (sm_signal_deadline(s) > t_ns)
        return;
    e = sm_signal_push(s, SM_SIGNAL_NOT_SETTLED);
    e->from_t_ns = sm_stay_now(s)->moved_t_ns;
    e->to_t_ns = t_ns;
    sm_text_copy(e->why, sizeof e->why, "longest wait");
    sm_stay_now(s)->given_up = true;
}

/* A captured value that the signal leaves without a step. */
static void watch_captured(struct sm_signal *s, const struct sm_signal_reading *r)
{
    const double tolerance = sm_tolerance(s);
    const double far = fmax(AWAY_TOLERANCES * tolerance,
                            fmin(AWAY_NOISE * s->front.noise.sd, AWAY_TOLERANCES_MOST * tolerance));

    if (!(fabs(r->value - sm_stay_now(s)->value) > far)) {
        s->away.n = 0;
        return;
    }
    if (s->away.n++ == 0)
        s->away.since_t_ns = r->t_ns;
    if (s->away.n > AWAY_MOST_STRAY && r->t_ns - s->away.since_t_ns >= s->pace.away_ns)
        sm_way_away(s, s->away.since_t_ns, r->value);
}

static void add(struct sm_signal *s, const struct sm_signal_reading *r)
{
    if (s->where == SM_STAYING && sm_stay_now(s)->captured)
        watch_captured(s, r);
    if (s->where == SM_STAYING && sm_stay_now(s)->captured)
        return;
    sm_stay_add(sm_stay_now(s), r, sm_judge_over_ns(&s->rule));
    if (s->front.swift_t_ns == r->t_ns)
        sm_stay_now(s)->swift_t_ns = r->t_ns;
    sm_way_look_on(s, r);
    sm_way_look_back(s);
}

static void remember_wait(struct sm_signal *s, int64_t since_moved_ns)
{
    double *usual_s = &s->memory.usual_wait_s[s->class];
    const double wait_s = 1e-9 * (double)since_moved_ns;

    *usual_s = *usual_s > 0 ? *usual_s + USUAL_WEIGHT * (wait_s - *usual_s) : wait_s;
    s->memory.captures++;
}

/* A reading was added: settled now? */
static void judge(struct sm_signal *s, const struct sm_signal_reading *r)
{
    const struct sm_judge j = { .rule = &s->rule,
                                .class = s->class,
                                .stay = sm_stay_now(s),
                                .t_ns = r->t_ns,
                                .sd = s->front.noise.sd,
                                .step = sm_step_now(&s->front.step) };
    struct sm_settled settled;

    if (sm_judge_settled(&j, &settled)) {
        sm_stay_now(s)->captured = true;
        sm_stay_now(s)->value = settled.value;
        sm_stay_now(s)->u95 = settled.u95;
        s->away.n = 0;
        remember_wait(s, settled.since_moved_ns);
        sm_signal_push(s, SM_SIGNAL_SETTLED)->settled = settled;
        s->clock = 0;
    } else if (!s->settling_told || r->t_ns - s->settling_t_ns >= SETTLING_EVERY_NS) {
        sm_signal_push(s, SM_SIGNAL_SETTLING)->latest = r->value;
        s->settling_told = true;
        s->settling_t_ns = r->t_ns;
    }
}

static void on_good(struct sm_signal *s, const struct sm_signal_reading *r)
{
    struct sm_departure d;
    bool departed;

    if (!s->rest)
        sm_way_arrived(s, r->t_ns);
    departed = sm_front_reading(&s->front, r, sm_tolerance(s), &d);
    if (s->rest)
        return;
    if (departed) {
        if (d.t_ns < sm_stay_now(s)->anchor_t_ns)
            d.t_ns = sm_stay_now(s)->anchor_t_ns; /* a block may have begun before a mark */
        sm_way_departed(s, &d);
    }
    for (size_t i = 0; i < s->front.n_taken; i++)
        add(s, &s->front.taken[i]);
    if (s->front.n_odd == 0)
        sm_way_tell(s, r->t_ns);
    if (s->front.n_odd == 0 && is_waiting(s))
        judge(s, r);
}

static void on_open(struct sm_signal *s, int64_t t_ns, enum sm_transit_how how)
{
    /* what was kept back just before was the way out */
    const int64_t from_t_ns = s->front.n_odd > 0 ? s->front.odd[0].t_ns : t_ns;

    if (!s->rest)
        sm_way_open(s, from_t_ns, how);
    sm_front_forget(&s->front);
}

static void on_reading(struct sm_signal *s, const struct sm_signal_reading *r)
{
    on_time(s, r->t_ns);
    switch (r->flag) {
    case SM_FLAG_OK:
        if (fabs(r->value) > VALUE_MOST ||
            (s->rule.has_plausible &&
             (r->value < s->rule.plausible_from || r->value > s->rule.plausible_to)))
            on_open(s, r->t_ns, SM_TRANSIT_PLAUSIBLE);
        else
            on_good(s, r);
        break;
    case SM_FLAG_OPEN:
        on_open(s, r->t_ns, SM_TRANSIT_OPEN);
        break;
    case SM_FLAG_OVER:
    case SM_FLAG_UNDER:
        on_open(s, r->t_ns, SM_TRANSIT_WORD);
        break;
    case SM_FLAG_UNUSABLE:
        break;
    }
}

static void on_mark(struct sm_signal *s, const struct sm_signal_input *in)
{
    s->class = in->class;
    if (s->rest)
        return;
    on_time(s, in->t_ns);
    s->clock = in->clock;
    sm_front_drop(&s->front);
    sm_way_mark(s, in->t_ns);
}

enum sm_status sm_signal_feed(struct sm_signal *s, const struct sm_signal_input *in)
{
    if (s->next_event < s->n_events)
        return SM_EBUSY;
    if (s->fed && in->t_ns < s->t_ns)
        return SM_EORDER;
    if (in->kind == SM_SIGNAL_READING && in->reading.flag == SM_FLAG_OK &&
        !isfinite(in->reading.value))
        return SM_EVALUE;
    if (in->kind == SM_SIGNAL_MARK &&
        ((unsigned)in->class >= SM_CLASS_COUNT || in->clock >= CLOCKS))
        return SM_EINVAL;
    s->n_events = s->next_event = 0;
    s->t_ns = in->t_ns;
    s->fed = true;
    switch (in->kind) {
    case SM_SIGNAL_READING: {
        struct sm_signal_reading r = in->reading;

        r.t_ns = in->t_ns;
        on_reading(s, &r);
        break;
    }
    case SM_SIGNAL_MARK:
        on_mark(s, in);
        break;
    case SM_SIGNAL_TICK:
        on_time(s, in->t_ns);
        break;
    case SM_SIGNAL_END:
        if (!s->rest)
            on_time(s, in->t_ns);
        sm_way_end(s, in->why != NULL ? in->why : "ended");
        s->clock = 0;
        break;
    }
    return SM_OK;
}

void sm_signal_class(struct sm_signal *s, enum sm_class c)
{
    assert((unsigned)c < SM_CLASS_COUNT);
    s->class = c;
}

enum sm_status sm_signal_rule(struct sm_signal *s, const struct sm_rule *rule)
{
    if (!rule_ok(rule))
        return SM_EINVAL;
    s->rule = *rule;
    s->pace = sm_pace_of(rule->dwell_ns);
    sm_way_drop(s);
    sm_front_pace(&s->front, s->pace);
    return SM_OK;
}

void sm_signal_rest(struct sm_signal *s, bool rest)
{
    if (rest == s->rest)
        return;
    s->rest = rest;
    sm_way_drop(s);
}

bool sm_signal_open(const struct sm_signal *s)
{
    return s->where == SM_STAYING ? !s->stay[s->now].captured
                                  : s->where == SM_LEAVING && s->way.kept;
}

bool sm_signal_undecided(const struct sm_signal *s)
{
    return s->front.n_odd > 0 || s->away.n > 0;
}

void sm_signal_place(const struct sm_signal *s, struct sm_signal_start *ret_start)
{
    const struct sm_stay *stay = &s->stay[s->now];

    memset(ret_start, 0, sizeof *ret_start);
    ret_start->place = s->where == SM_LEAVING && !s->way.kept ? SM_PLACE_LEFT : SM_PLACE_NEW;
    if (s->where == SM_STAYING && stay->captured) {
        ret_start->place = SM_PLACE_STILL;
        ret_start->value = stay->value;
        ret_start->u95 = stay->u95;
    }
}

void sm_signal_memory(const struct sm_signal *s, struct sm_channel_memory *ret_memory)
{
    *ret_memory = s->memory;
    ret_memory->noise = s->front.noise.sd;
    ret_memory->step = sm_step_now(&s->front.step);
}
