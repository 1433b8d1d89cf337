/* SPDX-License-Identifier: GPL-3.0-or-later */
/* outcome.c: see outcome.h. */
#include "outcome.h"

#include <math.h>
#include <string.h>

static struct outcome *add(struct outcomes *o, const struct sm_event *e,
                           const struct sm_whereabouts *where)
{
    struct outcome *x;

    if (o->n == OUTCOMES_MAX)
        fail_msg("more than %d outcomes", OUTCOMES_MAX);
    x = &o->list[o->n++];
    memset(x, 0, sizeof *x);
    x->kind = e->kind;
    x->n = e->n;
    if (where != NULL && where->has) {
        x->item = where->item;
        sm_text_copy(x->name, sizeof x->name, where->name);
    }
    return x;
}

static void take_curve(struct outcome *x, const struct sm_event_curve *c)
{
    x->good = c->accepted;
    for (size_t i = 0; c->fitted && i < 2; i++)
        x->coefficient[i] = c->curve.coefficient[i].value;
    for (size_t i = 0; i < c->n_judged && x->why[0] == '\0'; i++) {
        if (!c->judged[i].pass)
            sm_text_copy(x->why, sizeof x->why, c->judged[i].quantity);
    }
}

/* The state of the results named changes. */
static void take_change(struct outcomes *o, struct outcome *x, const struct sm_event *e)
{
    const struct sm_event_change *c = &e->u.change;

    x->value = (double)c->n;
    sm_text_copy(x->why, sizeof x->why, c->why);
    for (size_t i = 0; i < c->n; i++) {
        for (size_t k = 0; k < o->n; k++) {
            struct outcome *r = &o->list[k];

            if (r->kind != SM_EVENT_RESULT || r->n != c->result[i])
                continue;
            r->state = e->kind == SM_EVENT_HOLD ? SM_RESULT_HELD : SM_RESULT_RELEASED;
            sm_text_copy(r->why, sizeof r->why, e->kind == SM_EVENT_HOLD ? c->why : "");
            if (i == 0)
                x->item = r->item;
        }
    }
}

void outcomes_take(struct outcomes *o, const struct sm_event *e)
{
    struct outcome *x;

    switch (e->kind) {
    case SM_EVENT_CAPTURE:
        x = add(o, e, &e->u.capture.where);
        x->value = e->u.capture.value;
        x->u95 = e->u.capture.s.u95;
        x->tolerance = e->u.capture.tolerance;
        break;
    case SM_EVENT_CURVE:
        take_curve(add(o, e, NULL), &e->u.curve);
        break;
    case SM_EVENT_CHECK:
        x = add(o, e, &e->u.check.where);
        x->good = e->u.check.pass;
        x->value = e->u.check.computed ? e->u.check.found : 0;
        break;
    case SM_EVENT_RESULT:
        x = add(o, e, &e->u.result.where);
        x->good = e->u.result.has_value;
        x->value = e->u.result.has_value ? e->u.result.value : 0;
        x->state = e->u.result.state;
        sm_text_copy(x->why, sizeof x->why, e->u.result.why);
        break;
    case SM_EVENT_QUESTION:
        sm_text_copy(add(o, e, NULL)->why, SM_REASON_SIZE, e->u.question.text);
        break;
    case SM_EVENT_HOLD:
    case SM_EVENT_RELEASE:
        take_change(o, add(o, e, NULL), e);
        break;
    default:
        break;
    }
}

double outcomes_compare(const char *what, const struct outcomes *whole, const struct outcomes *cut,
                        double share, const double tolerance[SM_CLASS_COUNT])
{
    double most = 0;

    for (size_t i = 0; i < whole->n || i < cut->n; i++) {
        const struct outcome *a = &whole->list[i], *b = &cut->list[i];

        if (i >= whole->n || i >= cut->n)
            fail_msg("%s: %zu outcomes, whole %zu; the next is a %s of item %zu", what, cut->n,
                     whole->n, sm_event_kind_name((i < whole->n ? a : b)->kind),
                     (i < whole->n ? a : b)->item);
        if (a->kind != b->kind || a->item != b->item || a->good != b->good ||
            a->state != b->state || strcmp(a->why, b->why) != 0)
            fail_msg("%s: outcome %zu is %s of item %zu (good %d, %s) \"%s\", whole: %s of item "
                     "%zu (good %d, %s) \"%s\"",
                     what, i, sm_event_kind_name(b->kind), b->item, b->good,
                     sm_result_state_name(b->state), b->why, sm_event_kind_name(a->kind), a->item,
                     a->good, sm_result_state_name(a->state), a->why);
        const double within = share * (a->kind == SM_EVENT_CAPTURE ? a->tolerance
                                       : a->kind == SM_EVENT_CHECK ? tolerance[SM_CLASS_CHECK]
                                                                   : tolerance[SM_CLASS_SAMPLE]);
        if (!(fabs(a->value - b->value) <= within))
            fail_msg("%s: outcome %zu, %s of item %zu: %.17g, whole %.17g, may differ by %.3g",
                     what, i, sm_event_kind_name(a->kind), a->item, b->value, a->value, within);
        if (a->kind == SM_EVENT_CAPTURE)
            most = fmax(most, fabs(a->value - b->value) / a->tolerance);
    }
    return most;
}

const struct outcome *outcomes_find(const struct outcomes *o, enum sm_event_kind kind,
                                    const char *name)
{
    for (size_t i = o->n; i-- > 0;) {
        if (o->list[i].kind == kind && strcmp(o->list[i].name, name) == 0)
            return &o->list[i];
    }
    return NULL;
}

size_t outcomes_count(const struct outcomes *o, enum sm_event_kind kind)
{
    size_t n = 0;

    for (size_t i = 0; i < o->n; i++)
        n += o->list[i].kind == kind;
    return n;
}
