/* SPDX-License-Identifier: GPL-3.0-or-later */
/* core.c: start, feed, drain. One input is worked through in small steps, each of which brings at
 * most a handful of events, so that no queue can overflow. */
#include "core/inside.h"

#include <assert.h>
#include <stdlib.h>
#include <string.h>

/* Bytes of the union that an event of a kind uses: what is cleared when it is made. */
static size_t part_size(enum sm_event_kind k)
{
    struct sm_event *e = NULL;

    switch (k) {
    case SM_EVENT_CAPTURE:
        return sizeof e->u.capture;
    case SM_EVENT_CURVE:
        return sizeof e->u.curve;
    case SM_EVENT_CHECK:
        return sizeof e->u.check;
    case SM_EVENT_RESULT:
        return sizeof e->u.result;
    case SM_EVENT_HOLD:
    case SM_EVENT_RELEASE:
        return sizeof e->u.change;
    case SM_EVENT_QUESTION:
        return sizeof e->u.question;
    case SM_EVENT_ANSWER:
        return sizeof e->u.answer;
    case SM_EVENT_UNREAD:
        return sizeof e->u.unread;
    case SM_EVENT_READING:
        return sizeof e->u.reading;
    default:
        return sizeof e->u.moved > sizeof e->u.not_settled ? sizeof e->u.moved
                                                           : sizeof e->u.not_settled;
    }
}

struct sm_event *sm_core_push(struct sm_core *c, enum sm_event_kind kind)
{
    struct sm_event *e;

    assert(c->q_n < SM_QUEUE);
    e = &c->queue[(c->q_head + c->q_n++) % SM_QUEUE];
    memset(&e->u, 0, part_size(kind));
    e->kind = kind;
    e->n = sm_event_class(kind) == SM_LIVE ? 0 : ++c->last_n;
    e->t_ns = c->in.t_ns;
    e->utc_us = c->in.utc_us;
    return e;
}

enum sm_status sm_core_use_method(struct sm_core *c, size_t i)
{
    const struct sm_method *m;
    int signal_at;
    enum sm_status s;

    if (i >= c->setup->n_methods)
        return SM_EINVAL;
    m = &c->setup->method[i];
    signal_at = sm_profile_channel(c->setup->profile, m->signal);
    if (signal_at < 0)
        return SM_EINVAL;
    if (c->signal != NULL) {
        s = sm_signal_rule(c->signal, &m->rule);
        if (s != SM_OK)
            return s;
    }
    c->method = m;
    c->signal_at = signal_at;
    c->temperature_at = m->temperature_from == SM_TEMPERATURE_CHANNEL
                            ? sm_profile_channel(c->setup->profile, m->temperature)
                            : -1;
    return SM_OK;
}

static enum sm_status begin_method(struct sm_core *c, size_t i, char ret_why[SM_REASON_SIZE])
{
    const enum sm_status s = sm_core_use_method(c, i);

    if (s != SM_OK)
        sm_text_copy(ret_why, SM_REASON_SIZE, "the method is not possible with this meter");
    return s;
}

/* Takes over the sheet in force and what carried says of its run. */
static enum sm_status begin_sheet(struct sm_core *c, const struct sm_sheet *sheet,
                                  char ret_why[SM_REASON_SIZE])
{
    const char *sensor = c->setup->sensor;

    if (sheet != NULL && sheet->sensor[0] != '\0')
        sensor = sheet->sensor;
    if (sensor[0] != '\0' && c->now->sensor[0] != '\0') /* the setup may name another one now */
        sm_text_copy(c->now->sensor, sizeof c->now->sensor, sensor);
    if (sheet == NULL) {
        memset(&c->now->run, 0, sizeof c->now->run);
        return begin_method(c, c->setup->own_method, ret_why);
    }
    if (!c->now->run.has || c->now->run.n_items != sheet->n || sheet->method < 0 ||
        (size_t)sheet->method >= c->setup->n_methods) {
        sm_text_copy(ret_why, SM_REASON_SIZE,
                     "the sheet is not the one that the run was carried with");
        return SM_EINVAL;
    }
    *c->sheet = *sheet;
    c->has_sheet = true;
    return begin_method(c, (size_t)sheet->method, ret_why);
}

static enum sm_status begin_signal(struct sm_core *c)
{
    struct sm_signal_start start;

    memset(&start, 0, sizeof start);
    start.place = SM_PLACE_NEW;
    if (c->now->last.has && c->now->last.place == SM_AT_STILL)
        start.place = SM_PLACE_STILL;
    else if (c->now->last.has && c->now->last.place == SM_AT_LEFT)
        start.place = SM_PLACE_LEFT;
    else if (c->now->last.has)
        sm_core_lost_track(c);
    start.value = c->now->last.value;
    start.u95 = c->now->last.u95;
    return sm_signal_create(&c->method->rule, c->setup->profile->n_channels - 1, &c->now->channel,
                            &start, &c->signal);
}

/* When it began, before this file. */
static int64_t born(int64_t age_ns)
{
    return -(age_ns < SM_T_MOST_NS ? age_ns : SM_T_MOST_NS);
}

/* The newest that an act's sender must have seen. */
static int64_t newest_change(const struct sm_carried *now)
{
    int64_t n = now->last.has ? now->last.capture : 0;

    for (size_t i = 0; i < now->n_questions; i++)
        n = now->question[i].n > n ? now->question[i].n : n;
    return n;
}

static enum sm_status begin(struct sm_core *c, const struct sm_carried *carried,
                            const struct sm_sheet *sheet, char ret_why[SM_REASON_SIZE])
{
    enum sm_status s;

    *c->now = *carried;
    s = begin_sheet(c, sheet, ret_why);
    if (s != SM_OK)
        return s;
    s = sm_parser_create(c->setup->profile, &c->parser, ret_why);
    if (s != SM_OK)
        return s;
    s = begin_signal(c);
    if (s != SM_OK) {
        sm_text_copy(ret_why, SM_REASON_SIZE, "the rule for settled is not possible");
        return s;
    }
    if (c->now->rest.has)
        sm_signal_rest(c->signal, true);
    c->curve_born_t_ns = born(c->now->curve.age_ns);
    c->rest_born_t_ns = born(c->now->rest.age_ns);
    c->temperature_born_t_ns = born(c->now->temperature.age_ns);
    c->change_n = newest_change(c->now);
    if (c->now->curve.has && c->now->curve.n != 0 && c->now->curve.accepted)
        sm_core_refit(c);
    sm_framer_init(&c->framer, &c->setup->profile->framing, true);
    sm_asker_init(&c->asker, c->setup->profile);
    sm_flood_init(&c->flood);
    return SM_OK;
}

enum sm_status sm_core_start(const struct sm_core_setup *setup, const struct sm_carried *carried,
                             const struct sm_sheet *sheet, struct sm_core **ret_core,
                             char ret_why[SM_REASON_SIZE])
{
    struct sm_core *c = calloc(1, sizeof *c);
    enum sm_status s = SM_ENOMEM;

    sm_text_copy(ret_why, SM_REASON_SIZE, "no memory");
    if (c == NULL)
        return s;
    c->setup = setup;
    c->sheet = calloc(1, sizeof *c->sheet);
    c->now = calloc(1, sizeof *c->now);
    c->shown = calloc(1, sizeof *c->shown);
    c->queue = calloc(SM_QUEUE, sizeof *c->queue);
    c->last_reading_t_ns = SM_NEVER;
    c->in.t_ns = 0;
    if (c->sheet != NULL && c->now != NULL && c->shown != NULL && c->queue != NULL)
        s = begin(c, carried, sheet, ret_why);
    if (s != SM_OK) {
        sm_core_destroy(c);
        return s;
    }
    *ret_core = c;
    return SM_OK;
}

void sm_core_destroy(struct sm_core *c)
{
    if (c == NULL)
        return;
    sm_signal_destroy(c->signal);
    sm_parser_destroy(c->parser);
    free(c->sheet);
    free(c->now);
    free(c->shown);
    free(c->queue);
    free(c);
}

enum sm_status sm_core_feed(struct sm_core *c, const struct sm_input *in)
{
    if (c->stage != SM_STAGE_IDLE || c->q_n > 0)
        return SM_EBUSY;
    if (in->n <= c->last_n || in->t_ns < c->in.t_ns)
        return SM_EORDER;
    if (in->t_ns > SM_T_MOST_NS || in->n > SM_N_MOST)
        return SM_EINVAL;
    if (in->kind == SM_INPUT_BYTES) {
        if (sm_framer_feed(&c->framer, &in->chunk) != SM_OK)
            return SM_EINVAL;
    }
    c->in = *in;
    c->last_n = in->n;
    c->stage = SM_STAGE_BEGIN;
    return SM_OK;
}

/* A tick: everything whose time has come, in a fixed order. */
static void on_tick(struct sm_core *c)
{
    struct sm_signal_input tick = { .kind = SM_SIGNAL_TICK, .t_ns = c->in.t_ns };
    struct sm_line line;
    uint64_t count;

    if (sm_framer_deadline(&c->framer) <= c->in.t_ns &&
        sm_framer_tick(&c->framer, c->in.t_ns, &line))
        sm_core_line(c, &line);
    sm_core_check_silence(c);
    if (sm_flood_deadline(&c->flood) <= c->in.t_ns &&
        sm_flood_tick(&c->flood, c->in.t_ns, &count)) {
        struct sm_event_unread *u = &sm_core_push(c, SM_EVENT_UNREAD)->u.unread;

        u->counted = true;
        u->count = count;
        sm_text_copy(u->why, sizeof u->why, "lines without a reading, more than ten in a minute");
    }
    if (sm_signal_deadline(c->signal) <= c->in.t_ns)
        (void)!sm_signal_feed(c->signal, &tick); /* busy: its turn comes with the next tick */
}

static void on_clock(struct sm_core *c)
{
    if (c->in.clock_what == SM_CLOCK_SUSPEND) {
        sm_core_signal_end(c, "the machine was suspended");
        sm_core_lost_track(c);
        c->dirty = true;
    }
}

static void on_roll(struct sm_core *c)
{
    const bool open = c->immersion.begun && !c->immersion.captured;
    uint64_t count;

    if (sm_flood_end(&c->flood, &count)) {
        struct sm_event_unread *u = &sm_core_push(c, SM_EVENT_UNREAD)->u.unread;

        u->counted = true;
        u->count = count;
        sm_text_copy(u->why, sizeof u->why, "lines without a reading, more than ten in a minute");
    }
    if (open && sm_signal_open(c->signal)) {
        sm_core_signal_end(c, "not captured: log changed");
        sm_core_lost_track(c);
    }
    if (!c->now->last.has && sm_core_place(c).place == SM_PLACE_LEFT)
        sm_core_unsure(c); /* `last` cannot say that the probe is on its way */
    c->dirty = true;
}

/* The stage that follows the first step of an input. */
static enum sm_stage stage_after(enum sm_input_kind kind)
{
    return kind == SM_INPUT_BYTES  ? SM_STAGE_LINES
           : kind == SM_INPUT_TICK ? SM_STAGE_ASK
                                   : SM_STAGE_END;
}

/* The first step of an input. */
static void take_up(struct sm_core *c)
{
    switch (c->in.kind) {
    case SM_INPUT_TICK:
        on_tick(c);
        break;
    case SM_INPUT_ACT:
        sm_core_act(c, &c->in.act);
        break;
    case SM_INPUT_LINK:
        sm_core_link(c, &c->in.link);
        break;
    case SM_INPUT_CLOCK:
        on_clock(c);
        break;
    case SM_INPUT_SENT:
        sm_asker_sent(&c->asker, c->in.t_ns);
        break;
    case SM_INPUT_ROLL:
        on_roll(c);
        break;
    case SM_INPUT_BYTES:
    case SM_INPUT_COUNT:
        break;
    }
}

/* One question that is due; false: none is. */
static bool ask_next(struct sm_core *c)
{
    bool timed_out = false;
    const enum sm_question_kind kind = sm_asker_tick(&c->asker, c->in.t_ns, &timed_out);

    if (kind == SM_ASK_NONE)
        return false;
    sm_core_ask(c, kind);
    return true;
}

/* What is told when an input is worked through: the answer to an act, then what is carried. */
static void finish(struct sm_core *c)
{
    if (c->answer_due) {
        c->answer_due = false;
        sm_core_push(c, SM_EVENT_ANSWER)->u.answer = c->answer;
    }
    if (c->dirty) {
        c->dirty = false;
        sm_core_carried(c, c->shown);
        sm_core_push(c, SM_EVENT_CARRIED)->u.carried = c->shown;
    }
    c->stage = SM_STAGE_IDLE;
}

/* One step of the input in hand. */
static void step(struct sm_core *c)
{
    struct sm_signal_event s;
    struct sm_line line;

    if (sm_signal_next(c->signal, &s)) {
        sm_core_signal_event(c, &s);
        return;
    }
    switch (c->stage) {
    case SM_STAGE_BEGIN:
        c->stage = stage_after(c->in.kind);
        take_up(c);
        break;
    case SM_STAGE_READING: /* the reading of a marked line, now that the mark is worked through */
        c->stage = SM_STAGE_LINES;
        sm_core_reading(c, &c->held_reading);
        break;
    case SM_STAGE_LINES:
        if (sm_framer_next(&c->framer, &line))
            sm_core_line(c, &line);
        else
            c->stage = SM_STAGE_ASK;
        break;
    case SM_STAGE_ASK:
        if (c->in.kind != SM_INPUT_TICK || !ask_next(c))
            c->stage = SM_STAGE_END;
        break;
    case SM_STAGE_END:
        finish(c);
        break;
    case SM_STAGE_IDLE:
        break;
    }
}

bool sm_core_next(struct sm_core *c, const struct sm_event **ret_event)
{
    while (c->q_n == 0 && c->stage != SM_STAGE_IDLE)
        step(c);
    if (c->q_n == 0)
        return false;
    *ret_event = &c->queue[c->q_head];
    c->q_head = (c->q_head + 1) % SM_QUEUE;
    c->q_n--;
    return true;
}

static int64_t silence_deadline(const struct sm_core *c)
{
    if (!c->link_up || c->silent || c->setup->silence_ns <= 0)
        return SM_NEVER;
    return (c->last_reading_t_ns == SM_NEVER ? c->link_t_ns : c->last_reading_t_ns) +
           c->setup->silence_ns;
}

int64_t sm_core_deadline(const struct sm_core *c)
{
    const int64_t all[] = { sm_framer_deadline(&c->framer), sm_asker_deadline(&c->asker),
                            sm_flood_deadline(&c->flood), sm_signal_deadline(c->signal),
                            silence_deadline(c) };
    int64_t first = SM_NEVER;

    for (size_t i = 0; i < sizeof all / sizeof all[0]; i++)
        first = all[i] < first ? all[i] : first;
    return first;
}

int64_t sm_core_last_n(const struct sm_core *c)
{
    return c->last_n;
}

bool sm_core_may_cut(const struct sm_core *c)
{
    return c->stage == SM_STAGE_IDLE && c->q_n == 0 && !sm_asker_open(&c->asker) &&
           !sm_framer_begun(&c->framer);
}

bool sm_core_may_roll(const struct sm_core *c)
{
    return sm_core_may_cut(c) && !sm_signal_open(c->signal) && !sm_signal_undecided(c->signal);
}

void sm_core_carried(const struct sm_core *c, struct sm_carried *ret_carried)
{
    const struct sm_signal_start place = sm_core_place(c);
    struct sm_carried *o = ret_carried;

    *o = *c->now;
    if (o->curve.has)
        o->curve.age_ns = c->in.t_ns - c->curve_born_t_ns;
    if (o->rest.has)
        o->rest.age_ns = c->in.t_ns - c->rest_born_t_ns;
    if (o->temperature.has)
        o->temperature.age_ns = c->in.t_ns - c->temperature_born_t_ns;
    sm_signal_memory(c->signal, &o->channel);
    if (o->last.has)
        o->last.place = place.place == SM_PLACE_STILL  ? SM_AT_STILL
                        : place.place == SM_PLACE_LEFT ? SM_AT_LEFT
                                                       : SM_AT_UNKNOWN;
}

const struct sm_sheet *sm_core_sheet(const struct sm_core *c)
{
    return c->has_sheet ? c->sheet : NULL;
}
