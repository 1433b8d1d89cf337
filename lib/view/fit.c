/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fit.c: a fitted curve as JSON or as plain text. */
#include "view/fit.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "base/number.h"

#define HEAD_SIZE 8192 /* everything but the lines of points and readings */
#define LINE_SIZE 400  /* one point or one reading */
#define CELL_SIZE 64

size_t sm_fit_view_size(const struct sm_fit_view *v)
{
    return HEAD_SIZE + LINE_SIZE * (v->n_points + v->n_readings);
}

/* y that the curve gives at a standard. */
static double curve_at(const struct sm_fit_view *v, const struct sm_point *p)
{
    return sm_curve_y(v->curve, p->x, p->t_c);
}

/* The standard read back from the curve it helped to make. */
static bool back_calculated(const struct sm_fit_view *v, const struct sm_point *p, double *ret_x)
{
    struct sm_read_off r;

    if (sm_curve_read(v->curve, p->y, 1, p->t_c, &r) != SM_OK)
        return false;
    *ret_x = r.x;
    return true;
}

/* ---- JSON ---- */

/* `"key":v`, with a comma in front unless it is the first of its object; nothing where v is
 * unknown. */
static void pair(struct sm_text *t, const char *key, double v)
{
    char number[SM_NUMBER_SIZE];

    if (!isfinite(v))
        return;
    sm_number_write(number, v);
    if (t->len > 0 && t->buf[t->len - 1] != '{')
        sm_text_add(t, ",");
    sm_text_addf(t, "\"%s\":%s", key, number);
}

static void flag(struct sm_text *t, const char *key, bool v)
{
    sm_text_addf(t, ",\"%s\":%s", key, v ? "true" : "false");
}

static void json_curve(const struct sm_curve *c, struct sm_text *t)
{
    sm_text_addf(t, "{\"model\":\"%s\",\"n\":%zu,\"dof\":%zu,\"coefficients\":[",
                 sm_model_name(c->model), c->n, c->dof);
    for (size_t i = 0; i < c->n_coefficients; i++) {
        sm_text_addf(t, "%s{\"name\":\"%s\"", i > 0 ? "," : "", c->coefficient[i].name);
        pair(t, "value", c->coefficient[i].value);
        pair(t, "standard_error", c->coefficient[i].standard_error);
        sm_text_add(t, "}");
    }
    sm_text_add(t, "]");
    pair(t, "residual_sd", c->residual_sd);
    pair(t, "r_squared", c->r_squared);
}

static void json_linearity(const struct sm_linearity *l, struct sm_text *t)
{
    if (!l->has)
        return;
    sm_text_addf(t, ",\"linearity\":{\"test\":\"%s\"", l->test);
    pair(t, "statistic", l->statistic);
    pair(t, "critical", l->critical);
    pair(t, "p", l->p);
    flag(t, "pass", l->pass);
    sm_text_add(t, "}");
}

static void json_reading(const struct sm_fit_view *v, const struct sm_fit_reading *r,
                         struct sm_text *t)
{
    const double k = sm_t95(v->curve->dof);

    sm_text_add(t, "{");
    pair(t, "y", r->y);
    if (r->has) {
        pair(t, "x", r->read.x);
        pair(t, "standard_uncertainty", r->read.standard_uncertainty);
        pair(t, "expanded_uncertainty", k * r->read.standard_uncertainty);
    }
    pair(t, "coverage_factor", k);
    flag(t, "between_standards", r->has && r->read.between_standards);
    pair(t, "replicates", r->m);
    sm_text_add(t, "}");
}

void sm_fit_view_json(const struct sm_fit_view *v, struct sm_text *t)
{
    json_curve(v->curve, t);
    json_linearity(v->linearity, t);
    sm_text_add(t, ",\"points\":[");
    for (size_t i = 0; i < v->n_points; i++) {
        const struct sm_point *p = &v->points[i];
        double x;
        sm_text_add(t, i > 0 ? ",{" : "{");
        pair(t, "x", p->x);
        pair(t, "y", p->y);
        pair(t, "residual", p->y - curve_at(v, p));
        if (back_calculated(v, p, &x))
            pair(t, "back_calculated", x);
        sm_text_add(t, "}");
    }
    sm_text_add(t, "],\"readings\":[");
    for (size_t i = 0; i < v->n_readings; i++) {
        sm_text_add(t, i > 0 ? "," : "");
        json_reading(v, &v->readings[i], t);
    }
    sm_text_add(t, "]");
    if (v->curve->model == SM_MODEL_NERNST) {
        pair(t, "temperature_c", v->curve->t_c);
        pair(t, "slope_percent", 100 * v->curve->slope_fraction);
        pair(t, "offset_mv", v->curve->offset_mv);
        pair(t, "zero_point_ph", v->curve->zero_point);
    }
    sm_text_add(t, "}\n");
}

/* ---- plain text ---- */

/* The last word of a row is not padded. */
static void row(struct sm_text *t, const char *a, const char *b, const char *c, const char *d,
                const char *e)
{
    sm_text_addf(t, "  %12s  %12s  %12s  %12s%s%s\n", a, b, c, d, e[0] != '\0' ? "  " : "", e);
}

__attribute__((format(printf, 2, 3))) static const char *cell(char out[CELL_SIZE], const char *fmt,
                                                              ...)
{
    va_list args;

    va_start(args, fmt);
    vsnprintf(out, CELL_SIZE, fmt, args);
    va_end(args);
    return out;
}

static const char *exact(char out[CELL_SIZE], double v)
{
    return sm_number_write(out, v) > 0 ? out : "";
}

static void name_of(struct sm_text *t, const char *name, const char *otherwise)
{
    if (name[0] == '\0')
        sm_text_add(t, otherwise);
    else
        sm_text_add_safe(t, name, strlen(name));
}

static void text_title(const struct sm_fit_view *v, struct sm_text *t)
{
    const struct sm_curve *c = v->curve;

    sm_text_addf(t, "%s: ", sm_model_name(c->model));
    name_of(t, v->y_name, "y");
    sm_text_add(t, " against ");
    name_of(t, v->x_name, "x");
    if (c->model == SM_MODEL_NERNST)
        sm_text_addf(t, ", at %g °C", c->t_c);
    sm_text_addf(t, "\n%zu points at %zu levels, %zu degrees of freedom\n\n", c->n, c->levels,
                 c->dof);
}

static void text_points(const struct sm_fit_view *v, struct sm_text *t)
{
    char a[CELL_SIZE], b[CELL_SIZE], c[CELL_SIZE], d[CELL_SIZE], e[CELL_SIZE];

    sm_text_add(t, "Standards, read back from the curve\n");
    row(t, "x", "y", "residual", "read back", "    off by");
    for (size_t i = 0; i < v->n_points; i++) {
        const struct sm_point *p = &v->points[i];
        double x;
        const bool has = back_calculated(v, p, &x);
        row(t, exact(a, p->x), exact(b, p->y), cell(c, "%+.3g", p->y - curve_at(v, p)),
            has ? cell(d, "%.6g", x) : "none", has ? cell(e, "%+10.3g", x - p->x) : "");
    }
    sm_text_add(t, "\n");
}

static void text_readings(const struct sm_fit_view *v, struct sm_text *t)
{
    const double k = sm_t95(v->curve->dof);
    char a[CELL_SIZE], b[CELL_SIZE], c[CELL_SIZE], d[CELL_SIZE];

    if (v->n_readings == 0)
        return;
    sm_text_addf(t, "Readings (U: expanded, 95 %%, k = %.3g)\n", k);
    row(t, "y", "x", "u", "U", "");
    for (size_t i = 0; i < v->n_readings; i++) {
        const struct sm_fit_reading *r = &v->readings[i];
        const struct sm_read_off *o = &r->read;
        const bool inside = r->has && o->between_standards;
        char remark[CELL_SIZE] = "";
        if (!r->has)
            cell(remark, "no result: no single x gives it");
        else if (!inside)
            cell(remark, "no result: %s standard, %.6g",
                 o->x < v->curve->x_from ? "below the lowest" : "above the highest",
                 o->x < v->curve->x_from ? v->curve->x_from : v->curve->x_to);
        else if (r->m > 1)
            cell(remark, "mean of %u", r->m);
        row(t, cell(a, "%.8g", r->y), inside ? cell(b, "%.6g", o->x) : "",
            inside ? cell(c, "%.3g", o->standard_uncertainty) : "",
            inside ? cell(d, "%.3g", k * o->standard_uncertainty) : "", remark);
    }
    sm_text_add(t, "\n");
}

static void text_curve(const struct sm_fit_view *v, struct sm_text *t)
{
    const struct sm_curve *c = v->curve;

    sm_text_add(t, "Curve (± standard error)\n");
    for (size_t i = 0; i < c->n_coefficients; i++)
        sm_text_addf(t, "  %-14s%.8g ± %.3g\n", c->coefficient[i].name, c->coefficient[i].value,
                     c->coefficient[i].standard_error);
    if (c->model == SM_MODEL_NERNST) {
        sm_text_addf(t, "  %-14s%.2f %% of Nernst at %g °C\n", "slope", 100 * c->slope_fraction,
                     c->t_c);
        sm_text_addf(t, "  %-14s%.3g mV at pH 7.00 and %g °C\n", "offset", c->offset_mv, c->t_c);
        if (isfinite(c->zero_point))
            sm_text_addf(t, "  %-14spH %.3f\n", "zero point", c->zero_point);
    }
    sm_text_addf(t, "  %-14s%.4g\n", "residual SD", c->residual_sd);
}

static void text_verdict(const struct sm_fit_view *v, struct sm_text *t)
{
    const struct sm_linearity *l = v->linearity;
    const struct sm_curve *c = v->curve;

    if (l->has)
        sm_text_addf(t, "  %-14s%s: F = %.4g, limit %.4g at 99 %%, p = %.2g\n", "linearity",
                     l->pass ? "no bend found" : "the points bend", l->statistic, l->critical,
                     l->p);
    if (isfinite(c->r_squared))
        sm_text_addf(t, "  %-14s%.6f%s\n", "R squared", c->r_squared,
                     c->model == SM_MODEL_PROPORTIONAL ? " (about zero, not about the mean)" : "");
    else
        sm_text_addf(t, "  %-14snone: all y are alike\n", "R squared");
}

void sm_fit_view_text(const struct sm_fit_view *v, struct sm_text *t)
{
    text_title(v, t);
    text_points(v, t);
    text_readings(v, t);
    text_curve(v, t);
    text_verdict(v, t);
}
