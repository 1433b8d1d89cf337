/* SPDX-License-Identifier: GPL-3.0-or-later */
/* acts.c: what the analyst tells the program, done or refused with the reason. */
#include "bench/fits.h"
#include "core/inside.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

__attribute__((format(printf, 2, 3))) static void refuse(struct sm_core *c, const char *fmt, ...);

static void refuse(struct sm_core *c, const char *fmt, ...)
{
    va_list ap;
    char why[SM_LINK_TEXT_SIZE];

    va_start(ap, fmt);
    vsnprintf(why, sizeof why, fmt, ap);
    va_end(ap);
    sm_text_copy(c->answer.why, sizeof c->answer.why, why);
    c->answer.done = false;
}

static bool repeated(const struct sm_core *c, const char *id)
{
    for (size_t i = 0; i < c->now->n_acts; i++) {
        if (strcmp(c->now->act[i], id) == 0)
            return true;
    }
    return false;
}

/* 1 to 64 printable ASCII characters. */
static bool id_ok(const char *id)
{
    const char *at = id;

    while (*at > 0x20 && *at < 0x7f)
        at++;
    return at > id && *at == '\0';
}

static void remember(struct sm_carried *now, const char *id)
{
    if (now->n_acts == SM_ACT_IDS_MAX) {
        memmove(now->act[0], now->act[1], (SM_ACT_IDS_MAX - 1) * sizeof now->act[0]);
        now->n_acts--;
    }
    sm_text_copy(now->act[now->n_acts++], sizeof now->act[0], id);
}

/* The act goes on from what its sender saw; false: refused, something is new. */
static bool up_to_date(struct sm_core *c, const struct sm_act *act)
{
    if (act->has_seen && act->seen >= c->change_n)
        return true;
    refuse(c, "something is new since entry %lld: entry %lld; look, then say it again",
           act->has_seen ? (long long)act->seen : 0LL, (long long)c->change_n);
    return false;
}

/* An expired lot is never used; too many standards have no place. False: refused. */
static bool sheet_is_possible(struct sm_core *c, const struct sm_sheet *sheet)
{
    size_t standards = 0;

    for (size_t i = 0; i < sheet->n; i++) {
        const struct sm_standard *s = sm_core_standard(c, &sheet->item[i]);

        standards += sheet->item[i].kind == SM_ITEM_STANDARD;
        if (s != NULL && sm_core_expired(c, s)) {
            refuse(c, "item %zu: lot %.60s of %.60s has expired: open a new one and enter its lot",
                   i + 1, s->lot, s->name);
            return false;
        }
    }
    if (standards > SM_POINTS_MAX) {
        refuse(c, "%zu standards on the sheet, at most %d are possible", standards, SM_POINTS_MAX);
        return false;
    }
    return true;
}

/* The sheet's method goes with the meter and is in force from now. False: refused. */
static bool method_is_possible(struct sm_core *c, int method)
{
    char why[SM_REASON_SIZE] = "the sheet's method is not possible with this meter";

    if (method >= 0 && (size_t)method < c->setup->n_methods &&
        sm_method_fits(&c->setup->method[method], c->setup->profile, why) == SM_OK &&
        sm_core_use_method(c, (size_t)method) == SM_OK)
        return true;
    refuse(c, "%s", why);
    return false;
}

static void on_sheet(struct sm_core *c, const struct sm_act *act)
{
    if (act->sheet == NULL) {
        refuse(c, "%s", act->sheet_why[0] != '\0' ? act->sheet_why : "there is no sheet in it");
        return;
    }
    if (!sm_name_ok(act->sheet->file, strlen(act->sheet->file))) {
        refuse(c, "a sheet needs a file's name of at most 64 characters");
        return;
    }
    if (!sheet_is_possible(c, act->sheet) || !method_is_possible(c, act->sheet->method))
        return;
    sm_core_hold_provisional(c, 0, "their run ended without a closing check");
    if (c->now->curve.n ==
        0) /* the standards of a row that was not finished are no part of a new */
        memset(&c->now->curve, 0, sizeof c->now->curve);
    *c->sheet = *act->sheet;
    c->has_sheet = true;
    sm_run_begin(&c->now->run, ++c->now->runs, c->sheet);
    sm_text_copy(c->now->sensor, sizeof c->now->sensor,
                 c->sheet->sensor[0] != '\0' ? c->sheet->sensor : c->setup->sensor);
    memset(&c->now->checks, 0, sizeof c->now->checks);
    c->now->n_questions = 0;
    memset(&c->immersion, 0, sizeof c->immersion);
    c->marked = false;
    c->change_n = c->in.n;
}

/* An item is open, and next would mean another beaker: it has been marked already and the probe has
 * moved since, or the probe has been in it for longer than the dwell. */
static bool next_is_ambiguous(const struct sm_core *c)
{
    const struct sm_immersion *im = &c->immersion;

    if (!im->begun || im->captured || im->not_settled || c->now->run.left)
        return false;
    return (c->marked && !im->marked) ||
           (im->given && c->in.t_ns - im->began_t_ns >= c->method->rule.dwell_ns);
}

static void on_next(struct sm_core *c, const struct sm_act *act)
{
    struct sm_signal_input mark = { .kind = SM_SIGNAL_MARK,
                                    .t_ns = c->in.t_ns,
                                    .class = SM_CLASS_SAMPLE };

    if (!up_to_date(c, act))
        return;
    if (!c->link_up) {
        refuse(c, "there is no link to the meter");
        return;
    }
    if (c->now->rest.has) {
        refuse(c, "the meter is resting: resume first");
        return;
    }
    if (c->has_sheet && c->now->run.next >= c->now->run.n_items) {
        refuse(c, "every item of the sheet has been measured");
        return;
    }
    if (c->has_sheet && next_is_ambiguous(c)) {
        refuse(c, "item %zu, %s, has no capture yet: wait for it, or skip it with a reason",
               c->now->run.next + 1, c->sheet->item[c->now->run.next].name);
        return;
    }
    c->mark_of = c->in.n;
    c->now->n_questions = 0; /* the mark says where the probe is: what was open is answered */
    (void)!sm_signal_feed(c->signal, &mark);
}

/* Surely not in item run.next, nor beyond it: in air, in what was measured last, or where it stood
 * when the sheet was handed over. */
static bool before_next(const struct sm_core *c)
{
    const struct sm_immersion *im = &c->immersion;
    const struct sm_signal_start place = sm_core_place(c);

    if (c->now->run.left)
        return false;
    if (place.place == SM_PLACE_LEFT)
        return c->in_air;
    if (place.place == SM_PLACE_STILL)
        return c->now->last.item != 0 || im->early;
    return sm_run_measured(&c->now->run) == 0 && !im->begun;
}

/* The item whose turn it is is passed over. Where the probe may be in it, or in the one after it
 * already, only a mark goes on. */
static void skip(struct sm_core *c)
{
    struct sm_immersion *im = &c->immersion;
    const size_t skipped = c->now->run.next;
    const bool sure = before_next(c);

    if (!im->captured && im->begun && !im->early) {
        im->given = false;
        memset(&im->where, 0, sizeof im->where);
        im->where.kind = SM_ITEM_NONE;
        sm_text_copy(im->why_not_given, sizeof im->why_not_given,
                     "an item was skipped: press next when the probe is in the next one");
    }
    (void)!sm_run_skip(&c->now->run); /* there is one: seen by the caller */
    c->marked = false;
    if (!sure)
        sm_core_unsure(c);
    c->change_n = c->in.n;
    sm_core_skipped(c, skipped);
}

static void on_skip(struct sm_core *c, const struct sm_act *act)
{
    if (!up_to_date(c, act))
        return;
    if (!c->has_sheet || c->now->run.next >= c->now->run.n_items) {
        refuse(c, "there is no item to skip");
        return;
    }
    if (act->why[0] == '\0') {
        refuse(c, "an item is skipped with a reason only: skip --why \"…\"");
        return;
    }
    skip(c);
}

static void on_analyst(struct sm_core *c, const struct sm_act *act)
{
    const struct sm_core_setup *s = c->setup;

    if (!sm_name_ok(act->text, strlen(act->text))) {
        refuse(c, "a name is needed, of at most 64 characters");
        return;
    }
    for (size_t i = 0; i < s->n_people; i++) {
        if (strcmp(s->people[i].who, act->text) == 0 && s->people[i].analyse) {
            sm_text_copy(c->now->on_duty, sizeof c->now->on_duty, act->text);
            return;
        }
    }
    if (s->n_people > 0)
        refuse(c, "%.64s is not among those who may analyse", act->text);
    else
        sm_text_copy(c->now->on_duty, sizeof c->now->on_duty, act->text);
}

static void on_temperature(struct sm_core *c, const struct sm_act *act)
{
    if (!act->has_temperature || !(act->temperature_c >= -20 && act->temperature_c <= 150)) {
        refuse(c, "a temperature between -20 °C and 150 °C is needed");
        return;
    }
    c->now->temperature.has = true;
    c->now->temperature.value_c = act->temperature_c;
    sm_text_copy(c->now->temperature.who, sizeof c->now->temperature.who,
                 sm_name_ok(act->who, strlen(act->who)) ? act->who : c->now->on_duty);
    c->temperature_born_t_ns = c->in.t_ns;
}

static void on_rest(struct sm_core *c, bool rest)
{
    if (c->now->rest.has == rest) {
        refuse(c, rest ? "the meter is resting already" : "the meter is not resting");
        return;
    }
    c->now->rest.has = rest;
    c->rest_born_t_ns = c->in.t_ns;
    if (rest)
        sm_core_lost_track(c);
    c->open_circuit = false;
    memset(&c->immersion, 0, sizeof c->immersion);
    sm_signal_rest(c->signal, rest);
}

static void on_note(struct sm_core *c, const struct sm_act *act)
{
    if (act->text[0] == '\0')
        refuse(c, "a note needs a text");
}

void sm_core_act(struct sm_core *c, const struct sm_act *act)
{
    memset(&c->answer, 0, sizeof c->answer);
    c->answer.act = c->in.n;
    sm_text_copy(c->answer.id, sizeof c->answer.id, act->id);
    c->answer.done = true;
    c->answer_due = true;
    if (!id_ok(act->id)) {
        refuse(c, "an act has an id of 1 to %d printable ASCII characters", SM_ID_SIZE - 1);
        return;
    }
    if (repeated(c, act->id)) {
        refuse(c, "an act with this id came before: ignored");
        return;
    }
    remember(c->now, act->id);
    c->dirty = true;
    if (!sm_act_built(act->act)) {
        refuse(c, "not possible yet");
        return;
    }
    switch (act->act) {
    case SM_ACT_SHEET:
        on_sheet(c, act);
        break;
    case SM_ACT_NEXT:
        on_next(c, act);
        break;
    case SM_ACT_SKIP:
        on_skip(c, act);
        break;
    case SM_ACT_NOTE:
        on_note(c, act);
        break;
    case SM_ACT_ANALYST:
        on_analyst(c, act);
        break;
    case SM_ACT_TEMPERATURE:
        on_temperature(c, act);
        break;
    case SM_ACT_PAUSE:
        on_rest(c, true);
        break;
    case SM_ACT_RESUME:
        on_rest(c, false);
        break;
    default:
        refuse(c, "not possible yet");
        break;
    }
}
