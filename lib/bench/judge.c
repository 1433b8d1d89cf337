/* SPDX-License-Identifier: GPL-3.0-or-later */
/* judge.c: the rules for a curve and for a check standard, each with its figure and its verdict. */
#include "bench/judge.h"

#include <assert.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* Starts a verdict on a quantity whose figure must lie from `from` to `to`. */
static struct sm_judged *judged(struct sm_judgement *j, const char *quantity, double value,
                                struct sm_limit from, struct sm_limit to)
{
    struct sm_judged *r;

    assert(j->n < SM_JUDGED_MAX);
    r = &j->judged[j->n++];
    memset(r, 0, sizeof *r);
    sm_text_copy(r->quantity, sizeof r->quantity, quantity);
    r->value = value;
    r->has_from = from.has;
    r->from = from.value;
    r->has_to = to.has;
    r->to = to.value;
    r->pass = (!from.has || value >= from.value) && (!to.has || value <= to.value);
    return r;
}

static const struct sm_limit no_limit = { false, 0 };

__attribute__((format(printf, 2, 3))) static void say(struct sm_judged *r, const char *fmt, ...);

static void say(struct sm_judged *r, const char *fmt, ...)
{
    va_list ap;
    char line[SM_REASON_SIZE];

    va_start(ap, fmt);
    vsnprintf(line, sizeof line, fmt, ap);
    va_end(ap);
    sm_text_copy(r->text, sizeof r->text, line);
}

static void judge_levels(const struct sm_method *m, const struct sm_point *p, size_t n,
                         struct sm_judgement *j)
{
    const size_t levels = n > 0 ? sm_curve_levels(p, n) : 0;
    const struct sm_limit least = { true, (double)m->levels };
    struct sm_judged *r = judged(j, "levels", (double)levels, least, no_limit);

    if (r->pass)
        say(r, "%zu distinct standards, %u are needed", levels, m->levels);
    else
        say(r, "%zu distinct standards, %u are needed: measure the missing ones", levels,
            m->levels);
}

static void judge_slope_and_offset(const struct sm_method *m, struct sm_judgement *j)
{
    struct sm_judged *r;
    const struct sm_curve *c = &j->curve;

    if (m->model != SM_MODEL_NERNST)
        return;
    if (m->slope.from.has || m->slope.to.has) {
        r = judged(j, "slope", 100 * c->slope_fraction, m->slope.from, m->slope.to);
        say(r, "slope %.1f %% of Nernst at %.1f °C%s", r->value, c->t_c,
            r->pass ? "" : ": clean or recondition the electrode, or replace it");
    }
    if (m->offset.from.has || m->offset.to.has) {
        r = judged(j, "offset", c->offset_mv, m->offset.from, m->offset.to);
        say(r, "offset %.1f mV at pH 7.00 and %.1f °C%s", r->value, c->t_c,
            r->pass ? "" : ": check the reference and its filling solution");
    }
}

double sm_judge_read_back(const struct sm_curve *c, const struct sm_point *p)
{
    struct sm_read_off read;

    return sm_curve_read(c, p->y, 1, p->t_c, &read) == SM_OK ? read.x : (double)NAN;
}

/* The standard that reads back furthest from its value. */
static void judge_back_calculated(const struct sm_method *m, const struct sm_point *p, size_t n,
                                  struct sm_judgement *j)
{
    double worst = -1;
    size_t at = 0;
    struct sm_judged *r;

    if (!m->back_calculated.has)
        return;
    for (size_t i = 0; i < n; i++) {
        const double off = fabs(sm_judge_read_back(&j->curve, &p[i]) - p[i].x);

        if (!(off <= worst)) { /* an unknown value is the worst */
            worst = isnan(off) ? HUGE_VAL : off;
            at = i;
        }
    }
    if (!isfinite(worst))
        worst = 1e300;
    r = judged(j, "back_calculated", worst, no_limit, m->back_calculated);
    say(r, "standard %.4g %s reads back %.3g %s off, %.3g is allowed%s", p[at].x,
        sm_unit_name(m->measures), worst, sm_unit_name(m->measures), m->back_calculated.value,
        r->pass ? "" : ": pour it fresh and calibrate again");
}

static void judge_fit(const struct sm_method *m, struct sm_judgement *j)
{
    struct sm_judged *r;

    if (m->residual_sd.has) {
        r = judged(j, "residual_sd", j->curve.residual_sd, no_limit, m->residual_sd);
        say(r, "residual standard deviation %.3g, %.3g is allowed%s", r->value,
            m->residual_sd.value, r->pass ? "" : ": one of the standards does not fit the others");
    }
    if (m->r_squared.has) {
        r = judged(j, "r_squared", j->curve.r_squared, m->r_squared, no_limit);
        say(r, "R² %.5f, at least %.3f; necessary, never enough", r->value, m->r_squared.value);
    }
}

void sm_judge_curve(const struct sm_method *m, const struct sm_point *p, size_t n,
                    struct sm_judgement *ret_judgement)
{
    struct sm_judgement *j = ret_judgement;

    memset(j, 0, sizeof *j);
    judge_levels(m, p, n, j);
    j->fitted = sm_curve_fit(m->model, p, n, m->ph_iso, &j->curve) == SM_OK;
    if (j->fitted) {
        judge_slope_and_offset(m, j);
        judge_back_calculated(m, p, n, j);
        judge_fit(m, j);
    }
    j->accepted = j->fitted;
    for (size_t i = 0; i < j->n; i++)
        j->accepted = j->accepted && j->judged[i].pass;
}

bool sm_judge_check(const struct sm_method *m, double want, double found,
                    char ret_why[SM_REASON_SIZE])
{
    const double off = found - want, shown = fabs(off) < 0.0005 ? 0 : off; /* no "-0.000" */
    const bool pass = m->check.has && fabs(off) <= m->check.value;
    const char *unit = sm_unit_name(m->measures);
    struct sm_text t;

    sm_text_init(&t, ret_why, SM_REASON_SIZE);
    sm_text_addf(&t, "reads %.3f %s, should read %.3f: %+.3f %s, ", found, unit, want, shown, unit);
    if (m->check.has)
        sm_text_addf(&t, "%.3g is allowed", m->check.value);
    else
        sm_text_add(&t, "and the method says no limit: no check passes");
    return pass;
}
