/* SPDX-License-Identifier: GPL-3.0-or-later */
/* acts.c: what the analyst tells the program, done or refused with the reason. */
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

static const struct sm_standard *standard_of(const struct sm_core *c, const struct sm_item *i)
{
    return i->standard < 0 || (size_t)i->standard >= c->setup->standards->n
               ? NULL
               : &c->setup->standards->list[i->standard];
}

/* An expired lot is never used; too many standards have no place. False: refused. */
static bool sheet_is_possible(struct sm_core *c, const struct sm_sheet *sheet)
{
    size_t standards = 0;

    for (size_t i = 0; i < sheet->n; i++) {
        const struct sm_standard *s = standard_of(c, &sheet->item[i]);

        standards += sheet->item[i].kind == SM_ITEM_STANDARD;
        if (s != NULL && s->has_expires && sm_utc_day(c->in.utc_us) > s->expires_day) {
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

static void on_sheet(struct sm_core *c, const struct sm_act *act)
{
    if (act->sheet == NULL) {
        refuse(c, "%s", act->sheet_why);
        return;
    }
    if (!sheet_is_possible(c, act->sheet))
        return;
    if (sm_core_use_method(c, (size_t)act->sheet->method) != SM_OK) {
        refuse(c, "the sheet's method is not possible with this meter's profile");
        return;
    }
    sm_core_hold_provisional(c, 0, "their run ended without a closing check");
    *c->sheet = *act->sheet;
    c->has_sheet = true;
    sm_run_begin(&c->now->run, ++c->now->runs, c->sheet);
    sm_text_copy(c->now->sensor, sizeof c->now->sensor,
                 c->sheet->sensor[0] != '\0' ? c->sheet->sensor : c->setup->sensor);
    memset(&c->now->checks, 0, sizeof c->now->checks);
    c->now->n_questions = 0;
    memset(&c->immersion, 0, sizeof c->immersion);
    c->change_n = c->in.n;
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
    c->mark_of = c->in.n;
    c->now->n_questions = 0; /* the mark says where the probe is: what was open is answered */
    (void)!sm_signal_feed(c->signal, &mark);
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
    if (c->immersion.given) {
        c->immersion.given = false;
        memset(&c->immersion.where, 0, sizeof c->immersion.where);
        c->immersion.where.kind = SM_ITEM_NONE;
    }
    (void)!sm_run_skip(&c->now->run); /* there is one: seen above */
    c->change_n = c->in.n;
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
                 act->who[0] != '\0' ? act->who : c->now->on_duty);
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
