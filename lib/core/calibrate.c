/* SPDX-License-Identifier: GPL-3.0-or-later */
/* calibrate.c: captures of standards as points of a curve, the curve fitted, judged and kept. */
#include "core/inside.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#define K95 1.96 /* a capture's U95 over its standard uncertainty */

const struct sm_standard *sm_core_standard(const struct sm_core *c, const struct sm_item *i)
{
    return i->standard < 0 || (size_t)i->standard >= c->setup->standards->n
               ? NULL
               : &c->setup->standards->list[i->standard];
}

bool sm_core_expired(const struct sm_core *c, const struct sm_standard *s)
{
    return s->has_expires && sm_utc_day(c->in.utc_us) > s->expires_day;
}

bool sm_core_value(const struct sm_core *c, const struct sm_item *item, double t_c,
                   double *ret_value, char ret_why[SM_REASON_SIZE])
{
    const struct sm_standard *s = sm_core_standard(c, item);
    struct sm_text why;

    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    if (s == NULL) {
        sm_text_add(&why, "the setup has no such standard");
        return false;
    }
    if (sm_core_expired(c, s)) { /* since the sheet was handed over */
        sm_text_addf(&why, "lot %.60s of %.60s has expired: open a new one and enter its lot",
                     s->lot, s->name);
        return false;
    }
    return sm_standard_value(c->setup->standards, (size_t)item->standard, t_c, ret_value,
                             ret_why) == SM_OK;
}

static void points_of(const struct sm_carried_curve *curve, struct sm_point *p)
{
    for (size_t i = 0; i < curve->n_points; i++) {
        p[i].x = curve->point[i].x;
        p[i].y = curve->point[i].y;
        p[i].t_c = curve->point[i].t_c;
    }
}

static double mean_u2_of(const struct sm_carried_curve *curve)
{
    double sum = 0;

    for (size_t i = 0; i < curve->n_points; i++)
        sum += (curve->point[i].u95_y / K95) * (curve->point[i].u95_y / K95);
    return curve->n_points > 0 ? sum / (double)curve->n_points : 0;
}

/* By the rules of its own method, as they are now: another one may be in force. */
void sm_core_refit(struct sm_core *c)
{
    struct sm_carried_curve *curve = &c->now->curve;
    struct sm_point p[SM_POINTS_MAX];
    struct sm_judgement j;

    c->curve_good = false;
    c->mean_u2 = mean_u2_of(curve);
    points_of(curve, p);
    for (size_t i = 0; i < c->setup->n_methods; i++) {
        if (strcmp(c->setup->method[i].name, curve->method) != 0)
            continue;
        sm_judge_curve(&c->setup->method[i], p, curve->n_points, &j);
        c->curve_good = j.accepted;
        c->curve = j.curve;
        return;
    }
}

const struct sm_curve *sm_core_curve(const struct sm_core *c, char ret_why[SM_REASON_SIZE])
{
    const struct sm_carried_curve *curve = &c->now->curve;
    const char *why = NULL;

    if (!curve->has || curve->n == 0)
        why = "there is no calibration curve: measure the standards first";
    else if (!curve->accepted || !c->curve_good)
        why = "the calibration curve was refused: calibrate again";
    else if (curve->ended)
        why = curve->why_ended;
    else if (strcmp(curve->sensor, c->now->sensor) != 0)
        why = "the calibration curve belongs to another sensor: calibrate this one";
    else if (strcmp(curve->method, c->method->name) != 0)
        why = "the calibration curve was made by another method: calibrate again";
    else if (c->method->curve_valid_ns > 0 &&
             c->in.t_ns - c->curve_born_t_ns > c->method->curve_valid_ns)
        why = "the calibration curve is older than the method allows: calibrate again";
    if (why == NULL)
        return &c->curve;
    sm_text_copy(ret_why, SM_REASON_SIZE, why);
    return NULL;
}

static void fill_points(const struct sm_core *c, struct sm_event_curve *e)
{
    const struct sm_carried_curve *curve = &c->now->curve;
    struct sm_point p[SM_POINTS_MAX];

    points_of(curve, p);
    e->n_points = curve->n_points;
    for (size_t i = 0; i < curve->n_points; i++) {
        e->point[i].capture = curve->point[i].capture;
        e->point[i].item = curve->point[i].item;
        sm_text_copy(e->point[i].name, sizeof e->point[i].name, curve->point[i].name);
        e->point[i].x = p[i].x;
        e->point[i].y = p[i].y;
        e->point[i].t_c = p[i].t_c;
        e->point[i].has_t = isfinite(p[i].t_c);
        e->point[i].residual = e->point[i].back_calculated = (double)NAN;
        if (e->fitted) {
            e->point[i].residual = p[i].y - sm_curve_y(&e->curve, p[i].x, p[i].t_c);
            e->point[i].back_calculated = sm_judge_read_back(&e->curve, &p[i]);
        }
    }
}

static bool is_point(const struct sm_carried_curve *curve, int64_t capture)
{
    for (size_t i = 0; i < curve->n_points; i++) {
        if (curve->point[i].capture == capture)
            return true;
    }
    return false;
}

/* Standards of the row that ends with item `last` which were captured and gave no point: a line of
 * the judgement names them; the remark of each capture says why. */
static void judge_left_out(const struct sm_core *c, size_t last, struct sm_event_curve *e)
{
    struct sm_judged *j = &e->judged[e->n_judged];
    struct sm_text t;
    size_t n = 0;

    memset(j, 0, sizeof *j);
    sm_text_init(&t, j->text, sizeof j->text);
    for (size_t i = last + 1; i-- > 0 && c->sheet->item[i].kind == SM_ITEM_STANDARD;) {
        const struct sm_carried_item *item = &c->now->run.item[i];

        if (item->captures == 0 || is_point(&c->now->curve, item->capture))
            continue;
        sm_text_add(&t, n++ == 0 ? "without a point, see the remarks of their captures: " : ", ");
        sm_text_addf(&t, "item %zu, ", i + 1);
        sm_text_add(&t, c->sheet->item[i].name);
    }
    if (n == 0)
        return;
    sm_text_copy(j->quantity, sizeof j->quantity, "left_out");
    j->value = (double)n;
    j->pass = c->now->curve.n_points > 0 && /* enough levels are left all the same */
              e->curve.levels >= c->method->levels;
    e->n_judged++;
}

/* The row of standards that ends with item `last` is complete: fit and judge. */
static void fit(struct sm_core *c, size_t last)
{
    struct sm_carried_curve *curve = &c->now->curve;
    struct sm_point p[SM_POINTS_MAX];
    struct sm_judgement j;
    struct sm_event *event = sm_core_push(c, SM_EVENT_CURVE);
    struct sm_event_curve *e = &event->u.curve;

    points_of(curve, p);
    sm_judge_curve(c->method, p, curve->n_points, &j);
    e->run = c->now->run.number;
    e->accepted = j.accepted;
    e->fitted = j.fitted;
    e->curve = j.curve;
    e->unit_x = c->method->measures;
    e->unit_y = c->setup->profile->channel[c->signal_at].unit;
    sm_text_copy(e->sensor, sizeof e->sensor, c->now->sensor);
    sm_text_copy(e->method, sizeof e->method, c->method->name);
    judge_left_out(c, last, e);
    assert(e->n_judged + j.n <= SM_JUDGED_MAX);
    memcpy(&e->judged[e->n_judged], j.judged, j.n * sizeof j.judged[0]);
    e->n_judged += j.n;
    fill_points(c, e);
    curve->n = event->n;
    curve->accepted = j.accepted;
    sm_text_copy(curve->sensor, sizeof curve->sensor, c->now->sensor);
    sm_text_copy(curve->method, sizeof curve->method, c->method->name);
    c->curve = j.curve;
    c->curve_good = j.accepted;
    c->mean_u2 = mean_u2_of(curve);
    c->curve_born_t_ns = c->in.t_ns;
}

/* The first of a new row of standards: the curve so far ends, and no check can close its bracket
 * any more. */
static void begin_row(struct sm_core *c)
{
    struct sm_carried_curve *curve = &c->now->curve;

    sm_core_hold_provisional(
        c, 0,
        "the standards were measured anew before a check closed their bracket: "
        "measure them again");
    memset(curve, 0, sizeof *curve);
    curve->has = true;
    c->curve_good = false;
    c->curve_born_t_ns = c->in.t_ns;
}

void sm_core_on_standard(struct sm_core *c, struct sm_event_capture *cap, int64_t n)
{
    struct sm_carried_curve *curve = &c->now->curve;
    const size_t at = cap->where.item - 1;
    const struct sm_item *item = &c->sheet->item[at];
    double x = 0, t_c = (double)NAN;
    const char *how;
    char why[SM_REASON_SIZE] = "its temperature is not known";
    const bool has_t = sm_core_temperature(c, &cap->s, &t_c, &how);

    if (!curve->has || curve->n != 0)
        begin_row(c);
    if ((has_t || c->method->model != SM_MODEL_NERNST) && sm_core_value(c, item, t_c, &x, why)) {
        struct sm_carried_point *p;

        assert(curve->n_points < SM_POINTS_MAX); /* a sheet of more standards is refused */
        p = &curve->point[curve->n_points++];
        p->capture = n;
        p->item = cap->where.item;
        sm_text_copy(p->name, sizeof p->name, item->name);
        p->x = x;
        p->y = cap->value;
        p->u95_y = cap->s.u95;
        p->t_c = t_c;
    } else {
        struct sm_text t;

        sm_text_init(&t, cap->remark[cap->n_remarks++], SM_REASON_SIZE);
        sm_text_add(&t, "no point of the curve: ");
        sm_text_add(&t, why);
    }
    if (sm_run_standards_done(&c->now->run, c->sheet))
        fit(c, at);
}

void sm_core_skipped(struct sm_core *c, size_t i)
{
    if (c->sheet->item[i].kind == SM_ITEM_STANDARD && c->now->curve.has && c->now->curve.n == 0 &&
        sm_run_standards_done(&c->now->run, c->sheet))
        fit(c, i);
}
