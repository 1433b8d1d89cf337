/* SPDX-License-Identifier: GPL-3.0-or-later */
/* curve.c: the models, their fits, and readings taken off them. A model is a row of MODELS and,
 * where its x is not the variable of the fit, a case in `regressor`. */
#include "curve/curve.h"

#include <assert.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sort.h>

#include "curve/poly.h"

#define ZERO_C 273.15 /* 0 °C in K, exact (SI) */

/* k N_A and e N_A of the SI's exact constants (2019). */
#define GAS_CONSTANT 8.31446261815324 /* J/(mol K) */
#define FARADAY 96485.3321233100184   /* C/mol */
#define LN_10 2.302585092994045684
#define OFFSET_PH 7.0 /* the offset is the potential at pH 7.00 */

static const struct {
    const char *name;
    bool built;
    size_t coefficients;
    unsigned from, to; /* powers fitted, where built */
} MODELS[SM_MODEL_COUNT] = {
    [SM_MODEL_LINE] = { "line", true, 2, 0, 1 },
    [SM_MODEL_PROPORTIONAL] = { "proportional", true, 1, 1, 1 },
    [SM_MODEL_QUADRATIC] = { "quadratic", true, 3, 0, 2 },
    [SM_MODEL_LOG_LINE] = { "log-line", false, 2, 0, 1 },
    [SM_MODEL_LOG_OFFSET] = { "log-offset", false, 3, 0, 1 },
    [SM_MODEL_NERNST] = { "nernst", true, 2, 0, 1 },
    [SM_MODEL_AS_READ] = { "as-read", false, 0, 0, 0 },
};

const char *sm_model_name(enum sm_model m)
{
    return (size_t)m < SM_MODEL_COUNT ? MODELS[m].name : "unknown";
}

bool sm_model_known(const char *name, enum sm_model *ret_model)
{
    for (size_t i = 0; i < SM_MODEL_COUNT; i++)
        if (strcmp(name, MODELS[i].name) == 0) {
            *ret_model = (enum sm_model)i;
            return true;
        }
    return false;
}

bool sm_model_built(enum sm_model m)
{
    return (size_t)m < SM_MODEL_COUNT && MODELS[m].built;
}

size_t sm_model_coefficients(enum sm_model m)
{
    return (size_t)m < SM_MODEL_COUNT ? MODELS[m].coefficients : 0;
}

double sm_nernst_mv(double t_c)
{
    return 1000 * LN_10 * GAS_CONSTANT * (t_c + ZERO_C) / FARADAY;
}

/* Different numbers among v[n], which is sorted by it. */
static size_t distinct(double *v, size_t n)
{
    size_t levels = n > 0 ? 1 : 0;

    gsl_sort(v, 1, n);
    for (size_t i = 1; i < n; i++)
        if (v[i] > v[i - 1])
            levels++;
    return levels;
}

size_t sm_curve_levels(const struct sm_point *p, size_t n)
{
    double few[SM_POINTS_MAX];
    double *x = n <= SM_POINTS_MAX ? few : malloc(n * sizeof *x);
    size_t levels;

    if (x == NULL)
        return 0;
    for (size_t i = 0; i < n; i++)
        x[i] = p[i].x;
    levels = distinct(x, n);
    if (x != few)
        free(x);
    return levels;
}

/* The variable that y is straight in. */
static double regressor(enum sm_model m, const struct sm_point *p, double ph_iso)
{
    return m == SM_MODEL_NERNST ? sm_nernst_mv(p->t_c) * (p->x - ph_iso) : p->x;
}

static bool usable(enum sm_model m, const struct sm_point *p)
{
    return isfinite(p->x) && isfinite(p->y) &&
           (m != SM_MODEL_NERNST || (isfinite(p->t_c) && p->t_c > -ZERO_C));
}

/* The points as the two lists that poly.h fits, in storage the caller frees. */
static enum sm_status spread_out(enum sm_model m, const struct sm_point *p, size_t n, double ph_iso,
                                 double **ret_u, double **ret_y)
{
    double *u;

    for (size_t i = 0; i < n; i++)
        if (!usable(m, &p[i]))
            return SM_EVALUE;
    u = malloc(2 * n * sizeof *u);
    if (u == NULL)
        return SM_ENOMEM;
    for (size_t i = 0; i < n; i++) {
        u[i] = regressor(m, &p[i], ph_iso);
        u[n + i] = p[i].y;
    }
    *ret_u = u;
    *ret_y = u + n;
    return SM_OK;
}

/* From Eiso and -s over u = kN(t) (pH - pHiso) to the line at the mean temperature, E over pH. */
static void finish_nernst(struct sm_curve *c, const struct sm_poly *f, double ph_iso, double t_c)
{
    const double k = sm_nernst_mv(t_c), j = -k * ph_iso;
    const double vee = f->covariance[0][0], ves = f->covariance[0][1], vss = f->covariance[1][1];

    c->ph_iso = ph_iso;
    c->e_iso = f->coefficient[0];
    c->slope_fraction = 0 - f->coefficient[1]; /* never -0 */
    c->t_c = t_c;
    c->coefficient[0].value = f->coefficient[0] + j * f->coefficient[1];
    c->coefficient[1].value = k * f->coefficient[1];
    c->covariance[0][0] = vee + 2 * j * ves + j * j * vss;
    c->covariance[0][1] = c->covariance[1][0] = k * (ves + j * vss);
    c->covariance[1][1] = k * k * vss;
    c->coefficient[0].standard_error = sqrt(fmax(0, c->covariance[0][0]));
    c->coefficient[1].standard_error = k * f->standard_error[1];
    c->x_mean = ph_iso + f->u_mean / k;
    c->sxx = f->suu / (k * k);
    c->offset_mv = c->e_iso - c->slope_fraction * k * (OFFSET_PH - ph_iso);
    c->zero_point =
        c->slope_fraction != 0 ? ph_iso + c->e_iso / (c->slope_fraction * k) : (double)NAN;
}

static void finish(struct sm_curve *c, const struct sm_poly *f, const struct sm_point *p,
                   double ph_iso)
{
    static const char *const names[] = { "intercept", "slope", "quadratic" };
    double t_c = 0;

    c->n = f->n;
    c->dof = f->dof;
    c->n_coefficients = f->n_coefficients;
    c->residual_sd = f->residual_sd;
    c->r_squared = f->r_squared;
    c->x_mean = f->u_mean;
    c->sxx = f->suu;
    memcpy(c->covariance, f->covariance, sizeof c->covariance);
    for (size_t i = 0; i < f->n_coefficients; i++)
        c->coefficient[i] = (struct sm_coefficient){ names[i + MODELS[c->model].from],
                                                     f->coefficient[i], f->standard_error[i] };
    c->x_from = c->x_to = p[0].x;
    for (size_t i = 0; i < f->n; i++) {
        c->x_from = fmin(c->x_from, p[i].x);
        c->x_to = fmax(c->x_to, p[i].x);
        t_c += p[i].t_c / (double)f->n;
    }
    if (c->model == SM_MODEL_NERNST)
        finish_nernst(c, f, ph_iso, t_c);
}

enum sm_status sm_curve_fit(enum sm_model m, const struct sm_point *p, size_t n, double ph_iso,
                            struct sm_curve *ret_curve)
{
    struct sm_curve c = { .model = m };
    struct sm_poly f;
    double *u, *y;
    enum sm_status status;

    if (!sm_model_built(m) || (m == SM_MODEL_NERNST && !isfinite(ph_iso)))
        return SM_EINVAL;
    if (n > SM_FIT_POINTS_MAX)
        return SM_EFULL;
    if (n <= MODELS[m].coefficients)
        return SM_ESHORT;
    status = spread_out(m, p, n, ph_iso, &u, &y);
    if (status != SM_OK)
        return status;
    c.levels = sm_curve_levels(p, n);
    status = SM_ESHORT;
    if (c.levels > MODELS[m].coefficients)
        status = sm_poly_fit(u, y, n, MODELS[m].from, MODELS[m].to, &f);
    if (status == SM_OK) {
        finish(&c, &f, p, ph_iso);
        *ret_curve = c;
    }
    free(u);
    return status;
}

double sm_curve_y(const struct sm_curve *c, double x, double t_c)
{
    if (c->model == SM_MODEL_NERNST)
        return c->e_iso - c->slope_fraction * sm_nernst_mv(t_c) * (x - c->ph_iso);
    double y = 0;
    for (size_t i = c->n_coefficients; i-- > 0;)
        y = y * x + c->coefficient[i].value;
    return c->model == SM_MODEL_PROPORTIONAL ? y * x : y;
}

/* Source of the uncertainties: Miller and Miller, Statistics and Chemometrics for Analytical
 * Chemistry, ch. 5 (line); its general form for the others, u^2(x) = (s^2 / m + u^2(f(x))) /
 * f'(x)^2 (JCGM 100). */
static enum sm_status put_together(const struct sm_curve *c, double x, double slope,
                                   double variance_of_y, unsigned m, struct sm_read_off *ret_read)
{
    struct sm_read_off r = { .x = x };

    if (!(fabs(slope) > 0) || !isfinite(x))
        return SM_EVALUE;
    r.curve_uncertainty = sqrt(fmax(0, variance_of_y)) / fabs(slope);
    r.standard_uncertainty =
        sqrt(fmax(0, variance_of_y) + c->residual_sd * c->residual_sd / m) / fabs(slope);
    if (!isfinite(r.curve_uncertainty) || !isfinite(r.standard_uncertainty))
        return SM_EVALUE;
    *ret_read = r;
    return SM_OK;
}

static enum sm_status read_straight(const struct sm_curve *c, double y, unsigned m,
                                    struct sm_read_off *ret_read)
{
    const bool constant = c->n_coefficients == 2;
    const double intercept = constant ? c->coefficient[0].value : 0;
    const double slope = c->coefficient[c->n_coefficients - 1].value;
    double x, away;

    if (!(fabs(slope) > 0))
        return SM_EVALUE;
    x = (y - intercept) / slope;
    away = (constant ? 1 / (double)c->n : 0) + (x - c->x_mean) * (x - c->x_mean) / c->sxx;
    return put_together(c, x, slope, c->residual_sd * c->residual_sd * away, m, ret_read);
}

/* The x of a quadratic for y: the one between the standards, where there is just one; else the one
 * on that side of the turning point where all the standards are. */
static enum sm_status quadratic_x(const struct sm_curve *c, double y, double *ret_x)
{
    const double a2 = c->coefficient[2].value;
    const double a1 = c->coefficient[1].value + 2 * a2 * c->x_mean;
    const double a0 = sm_curve_y(c, c->x_mean, 0) - y;
    const double discriminant = a1 * a1 - 4 * a2 * a0;
    double x[2], q;
    bool in[2];

    if (!(discriminant >= 0))
        return SM_EVALUE;
    q = -0.5 * (a1 + copysign(sqrt(discriminant), a1)); /* no cancellation */
    x[0] = a2 != 0 ? c->x_mean + q / a2 : (double)NAN;
    x[1] = q != 0 ? c->x_mean + a0 / q : x[0];
    if (!isfinite(x[0]))
        x[0] = x[1];
    if (!isfinite(x[0]) || !isfinite(x[1]))
        return SM_EVALUE;
    for (size_t i = 0; i < 2; i++)
        in[i] = x[i] >= c->x_from && x[i] <= c->x_to;
    if (in[0] != in[1] || x[0] == x[1]) {
        *ret_x = in[0] ? x[0] : x[1];
        return SM_OK;
    }
    if (in[0])
        return SM_EVALUE;
    const double turn = c->x_mean - 0.5 * a1 / a2; /* a2 = 0 gave two equal x above */
    if (turn > c->x_from && turn < c->x_to)
        return SM_EVALUE;
    const bool below = turn >= c->x_to; /* the standards lie below the turning point */
    *ret_x = below ? fmin(x[0], x[1]) : fmax(x[0], x[1]);
    return SM_OK;
}

static enum sm_status read_quadratic(const struct sm_curve *c, double y, unsigned m,
                                     struct sm_read_off *ret_read)
{
    double x, variance = 0;
    const enum sm_status status = quadratic_x(c, y, &x);

    if (status != SM_OK)
        return status;
    const double power[SM_COEFFICIENTS_MAX] = { 1, x, x * x };
    for (size_t i = 0; i < SM_COEFFICIENTS_MAX; i++)
        for (size_t j = 0; j < SM_COEFFICIENTS_MAX; j++)
            variance += power[i] * power[j] * c->covariance[i][j];
    return put_together(c, x, c->coefficient[1].value + 2 * x * c->coefficient[2].value, variance,
                        m, ret_read);
}

enum sm_status sm_curve_read(const struct sm_curve *c, double y, unsigned m, double t_c,
                             struct sm_read_off *ret_read)
{
    struct sm_read_off r;
    enum sm_status status;

    if (m == 0)
        return SM_EINVAL;
    if (!isfinite(y))
        return SM_EVALUE;
    if (c->model == SM_MODEL_QUADRATIC)
        status = read_quadratic(c, y, m, &r);
    else
        status = read_straight(c, y, m, &r);
    if (status != SM_OK)
        return status;
    if (c->model == SM_MODEL_NERNST) { /* read at the mean temperature; now at the sample's */
        if (!isfinite(t_c) || !(t_c > -ZERO_C))
            return SM_EVALUE;
        const double ratio = sm_nernst_mv(c->t_c) / sm_nernst_mv(t_c);
        r.x = c->ph_iso + (r.x - c->ph_iso) * ratio;
        r.standard_uncertainty *= ratio;
        r.curve_uncertainty *= ratio;
    }
    r.between_standards = r.x >= c->x_from && r.x <= c->x_to;
    *ret_read = r;
    return SM_OK;
}

/* Mandel's F: what the quadratic takes off the sum of squares, against its residual variance.
 * Source: ISO 8466-1 and DIN 38402-51, F(0.99; 1; n - 3). */
static struct sm_linearity mandel(const struct sm_poly *line, const struct sm_poly *bent)
{
    struct sm_linearity l = { .test = "mandel" };
    const double nu = (double)bent->dof;
    const double ratio = line->residual_sd / fmax(bent->residual_sd, bent->rounding);

    l.statistic = fmax(0, ratio * ratio * (double)line->dof - nu);
    l.critical = gsl_cdf_fdist_Pinv(0.99, 1, nu);
    l.p = gsl_cdf_fdist_Q(l.statistic, 1, nu);
    l.pass = l.statistic <= l.critical;
    l.has = isfinite(l.statistic) && isfinite(l.critical) && isfinite(l.p);
    return l;
}

void sm_curve_linearity(enum sm_model m, const struct sm_point *p, size_t n, double ph_iso,
                        struct sm_linearity *ret_linearity)
{
    struct sm_poly line, bent;
    double *u, *y;

    *ret_linearity = (struct sm_linearity){ .test = "mandel" };
    if ((m != SM_MODEL_LINE && m != SM_MODEL_NERNST) || n < 4 || n > SM_FIT_POINTS_MAX ||
        sm_curve_levels(p, n) < 3 || spread_out(m, p, n, ph_iso, &u, &y) != SM_OK)
        return;
    if (sm_poly_fit(u, y, n, 0, 1, &line) == SM_OK && sm_poly_fit(u, y, n, 0, 2, &bent) == SM_OK &&
        line.residual_sd > line.rounding)
        *ret_linearity = mandel(&line, &bent);
    free(u);
}

double sm_t95(size_t dof)
{
    assert(dof >= 1);
    return gsl_cdf_tdist_Pinv(0.975, (double)dof);
}
