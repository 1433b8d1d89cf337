/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sentence.c: states and events told to a person. */
#include "view/sentence.h"

#include <math.h>
#include <string.h>

static void safe(struct sm_text *t, const char *name)
{
    sm_text_add_safe(t, name, strlen(name));
}

/* "sample final", "standard B4", "duplicate of final". */
static void whereabouts(struct sm_text *t, const struct sm_whereabouts *w)
{
    if (w->kind == SM_ITEM_STANDARD || w->kind == SM_ITEM_CHECK || w->kind == SM_ITEM_BLANK ||
        w->kind == SM_ITEM_SAMPLE)
        sm_text_addf(t, "%s ", sm_item_kind_name(w->kind));
    safe(t, w->name);
}

/* "12 s", "4 min", "2 h 10 min". */
static void duration(struct sm_text *t, int64_t ns)
{
    const long long s = ns > 0 ? (long long)(ns / SM_NS_PER_S) : 0;

    if (s < 120)
        sm_text_addf(t, "%lld s", s);
    else if (s < 7200)
        sm_text_addf(t, "%lld min", s / 60);
    else
        sm_text_addf(t, "%lld h %lld min", s / 3600, s % 3600 / 60);
}

static void add_quantity(struct sm_text *t, double value, int decimals, enum sm_unit unit)
{
    sm_text_addf(t, "%.*f %s", decimals, value, sm_unit_name(unit));
}

/* Decimals that show an uncertainty to two figures. */
static int decimals_for(double u95)
{
    if (!(u95 > 0))
        return 3;
    const int d = 1 - (int)floor(log10(u95));

    return d < 0 ? 0 : d > 6 ? 6 : d;
}

static void with_u95(struct sm_text *t, double value, double u95, enum sm_unit unit)
{
    const int d = decimals_for(u95);

    sm_text_addf(t, "%.*f ± %.*f %s", d, value, d, u95, sm_unit_name(unit));
}

static void state_sentence(const struct sm_core_status *s, int64_t for_ns, struct sm_text *t)
{
    switch (s->state) {
    case SM_STATE_NO_LINK:
        sm_text_add(t, "No link to the meter: check its cable and power.");
        break;
    case SM_STATE_SILENT:
        sm_text_add(t, "The meter has said nothing for ");
        duration(t, for_ns);
        sm_text_add(t, ": check that it is on and sending.");
        break;
    case SM_STATE_WAITING:
        sm_text_add(t, "Waiting for the first reading.");
        break;
    case SM_STATE_OPEN:
        sm_text_add(t, "The probe is in air.");
        break;
    case SM_STATE_SETTLING:
    case SM_STATE_NOT_SETTLED:
        sm_text_add(t, s->state == SM_STATE_SETTLING ? "Settling" : "Not settled");
        if (s->now.has) {
            sm_text_add(t, " in ");
            whereabouts(t, &s->now);
        }
        sm_text_add(t, " for ");
        duration(t, for_ns);
        sm_text_add(t, s->state == SM_STATE_SETTLING
                           ? "."
                           : ": no value is taken. Measure it again, or skip it with a reason.");
        break;
    case SM_STATE_SETTLED:
        sm_text_add(t, "Settled: ");
        safe(t, s->last.name);
        sm_text_add(t, " ");
        with_u95(t, s->last.value, s->last.u95, s->signal_unit);
        sm_text_add(t, ". The probe may be moved.");
        break;
    case SM_STATE_RESTING:
        sm_text_add(t, "Resting for ");
        duration(t, for_ns);
        sm_text_add(t, ": nothing is captured until resumed.");
        break;
    }
}

static void sheet_sentence(const struct sm_core_status *s, struct sm_text *t)
{
    if (!s->has_sheet) {
        sm_text_add(t, " No bench sheet: what settles is captured and numbered.");
        return;
    }
    if (s->sheet_done)
        sm_text_addf(t, " The sheet is done, %zu of %zu items measured.", s->measured, s->items);
    else if (s->next.has) {
        sm_text_add(t, " Next: ");
        whereabouts(t, &s->next);
        sm_text_addf(t, " (%zu of %zu measured).", s->measured, s->items);
    }
}

void sm_sentence(const struct sm_core_status *s, int64_t now_t_ns, struct sm_text *t)
{
    state_sentence(s, now_t_ns - s->since_t_ns, t);
    sheet_sentence(s, t);
    if (s->curve_refused)
        sm_text_add(t, " The calibration curve was refused: calibrate again.");
    if (s->questions > 0)
        sm_text_add(t, " It is not certain which beaker the probe is in: press next when it is in the "
                       "next item.");
    if (s->held > 0)
        sm_text_addf(t, " %zu result%s held.", s->held, s->held == 1 ? " is" : "s are");
    if (s->provisional > 0)
        sm_text_addf(t, " %zu result%s for a check.", s->provisional,
                     s->provisional == 1 ? " waits" : "s wait");
}

static void capture_sentence(const struct sm_event_capture *c, struct sm_text *t)
{
    sm_text_add(t, "Settled: ");
    if (c->where.has)
        whereabouts(t, &c->where);
    else
        safe(t, c->name);
    sm_text_add(t, ", ");
    with_u95(t, c->value, c->s.u95, c->unit);
    sm_text_addf(t, " after %.0f s", 1e-9 * (double)c->s.since_moved_ns);
    for (size_t i = 0; i < c->n_remarks; i++)
        sm_text_addf(t, " (%s)", c->remark[i]);
}

static void curve_sentence(const struct sm_event_curve *c, struct sm_text *t)
{
    sm_text_add(t, c->accepted ? "Curve accepted: " : "Curve refused: ");
    if (c->accepted) {
        if (c->curve.model == SM_MODEL_NERNST)
            sm_text_addf(t, "slope %.1f %%, offset %.1f mV, ", 100 * c->curve.slope_fraction,
                         c->curve.offset_mv);
        sm_text_addf(t, "residual SD %.2g %s, R² %.5f", c->curve.residual_sd, sm_unit_name(c->unit_y),
                     c->curve.r_squared);
        return;
    }
    if (!c->fitted)
        sm_text_add(t, "no curve goes through these standards. ");
    for (size_t i = 0; i < c->n_judged; i++) {
        if (!c->judged[i].pass) {
            sm_text_add(t, c->judged[i].text);
            sm_text_add(t, ". ");
        }
    }
}

static void result_sentence(const struct sm_event_result *r, struct sm_text *t)
{
    safe(t, r->name);
    sm_text_add(t, ": ");
    if (r->has_value && r->has_u95)
        with_u95(t, r->value, r->u95, r->unit);
    else if (r->has_value)
        add_quantity(t, r->value, 3, r->unit);
    else if (r->shown[0] != '\0')
        sm_text_addf(t, "%s %s", r->shown, sm_unit_name(r->unit));
    else
        sm_text_add(t, "no value");
    sm_text_addf(t, ", %s: %s", sm_result_state_name(r->state), r->why);
}

bool sm_event_sentence(const struct sm_event *e, struct sm_text *t)
{
    switch (e->kind) {
    case SM_EVENT_CAPTURE:
        capture_sentence(&e->u.capture, t);
        return true;
    case SM_EVENT_CURVE:
        curve_sentence(&e->u.curve, t);
        return true;
    case SM_EVENT_CHECK:
        sm_text_add(t, e->u.check.pass ? "Check passed: " : "Check failed: ");
        safe(t, e->u.check.where.name);
        sm_text_addf(t, " %s", e->u.check.why);
        return true;
    case SM_EVENT_RESULT:
        result_sentence(&e->u.result, t);
        return true;
    case SM_EVENT_HOLD:
    case SM_EVENT_RELEASE:
        sm_text_addf(t, "%zu result%s %s: %s", e->u.change.n, e->u.change.n == 1 ? "" : "s",
                     e->kind == SM_EVENT_HOLD ? "held" : "released", e->u.change.why);
        return true;
    case SM_EVENT_QUESTION:
        sm_text_addf(t, "Question: %s", e->u.question.text);
        return true;
    case SM_EVENT_NOT_SETTLED:
        sm_text_add(t, "Not settled: ");
        safe(t, e->u.not_settled.where.has ? e->u.not_settled.where.name : "no item");
        sm_text_addf(t, ": %s", e->u.not_settled.why);
        return true;
    case SM_EVENT_SILENT:
        sm_text_add(t, "The meter has fallen silent: check that it is on and sending");
        return true;
    default:
        return false;
    }
}
