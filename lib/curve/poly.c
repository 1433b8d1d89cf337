/* SPDX-License-Identifier: GPL-3.0-or-later */
/* poly.c: least squares by QR of centred and scaled data.
 * Source: ordinary least squares, QR form (NIST/SEMATECH e-Handbook of Statistical Methods, ch. 4);
 * checked against NIST's certified values and a long double twin in tests/curve/. */
#include "curve/poly.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>

#include <gsl/gsl_linalg.h>
#include <gsl/gsl_matrix.h>
#include <gsl/gsl_vector.h>

/* The data as they are solved: z = (u - u0) / h and (y - y0) / g, both within ±1. */
struct scaling {
    double u0, h, y0, g;
    double u_most, y_most; /* largest |u| and |y| */
};

struct storage {
    gsl_matrix *a;
    gsl_vector *tau, *y, *solution, *residual;
};

/* In two passes, so that equal numbers give exactly that number. */
static double mean_of(const double *v, size_t n)
{
    double mean = 0, rest = 0;

    for (size_t i = 0; i < n; i++)
        mean += v[i] / (double)n;
    for (size_t i = 0; i < n; i++)
        rest += v[i] - mean;
    return mean + rest / (double)n;
}

static double largest(const double *v, size_t n, double from)
{
    double most = 0;

    for (size_t i = 0; i < n; i++)
        most = fmax(most, fabs(v[i] - from));
    return most;
}

static enum sm_status scale(const double *u, const double *y, size_t n, bool constant,
                            struct scaling *ret_scaling)
{
    struct scaling s = { 0 };

    for (size_t i = 0; i < n; i++)
        if (!isfinite(u[i]) || !isfinite(y[i]))
            return SM_EVALUE;
    if (constant) {
        s.u0 = mean_of(u, n);
        s.y0 = mean_of(y, n);
    }
    s.h = largest(u, n, s.u0);
    s.g = largest(y, n, s.y0);
    s.u_most = largest(u, n, 0);
    s.y_most = largest(y, n, 0);
    if (!isfinite(s.h) || !isfinite(s.g))
        return SM_EVALUE;
    if (!(s.h > 0))
        return SM_ESHORT;
    if (!(s.g > 0))
        s.g = 1;
    *ret_scaling = s;
    return SM_OK;
}

static void release(struct storage *s)
{
    gsl_matrix_free(s->a);
    gsl_vector_free(s->tau);
    gsl_vector_free(s->y);
    gsl_vector_free(s->solution);
    gsl_vector_free(s->residual);
}

static enum sm_status allocate(size_t n, size_t p, struct storage *ret_storage)
{
    struct storage s = { gsl_matrix_alloc(n, p), gsl_vector_alloc(p), gsl_vector_alloc(n),
                         gsl_vector_alloc(p), gsl_vector_alloc(n) };

    if (s.a == NULL || s.tau == NULL || s.y == NULL || s.solution == NULL || s.residual == NULL) {
        release(&s);
        return SM_ENOMEM;
    }
    *ret_storage = s;
    return SM_OK;
}

/* Solves for the scaled coefficients. s->a then holds R above its diagonal. */
static enum sm_status solve(struct storage *s, const struct scaling *k, const double *u,
                            const double *y, size_t n, unsigned from, size_t p)
{
    for (size_t i = 0; i < n; i++) {
        const double z = (u[i] - k->u0) / k->h;
        double power = from == 0 ? 1 : z;
        for (size_t j = 0; j < p; j++, power *= z)
            gsl_matrix_set(s->a, i, j, power);
        gsl_vector_set(s->y, i, (y[i] - k->y0) / k->g);
    }
    if (gsl_linalg_QR_decomp(s->a, s->tau) != 0)
        return SM_EVALUE;
    for (size_t j = 0; j < p; j++) /* a column that the ones before it already hold */
        if (!(fabs(gsl_matrix_get(s->a, j, j)) > 64 * DBL_EPSILON * sqrt((double)n)))
            return SM_ESHORT;
    if (gsl_linalg_QR_lssolve(s->a, s->tau, s->y, s->solution, s->residual) != 0)
        return SM_EVALUE;
    return SM_OK;
}

/* Inverse of the upper triangle R. */
static void invert(const gsl_matrix *r, size_t p, double ret_inverse[SM_POLY_MAX][SM_POLY_MAX])
{
    for (size_t c = 0; c < p; c++)
        for (size_t i = p; i-- > 0;) {
            double v = i == c ? 1 : 0;
            for (size_t k = i + 1; k < p; k++)
                v -= gsl_matrix_get(r, i, k) * ret_inverse[k][c];
            ret_inverse[i][c] = v / gsl_matrix_get(r, i, i);
        }
}

/* b = J c: from coefficients of z = (u - u0) / h to coefficients of u, by the binomial theorem. */
static void uncentre(const struct scaling *s, unsigned from, size_t p,
                     double ret_j[SM_POLY_MAX][SM_POLY_MAX])
{
    static const double binomial[3][3] = { { 1, 0, 0 }, { 1, 1, 0 }, { 1, 2, 1 } };

    for (size_t k = 0; k < p; k++)
        for (size_t i = 0; i < p; i++) {
            double v = i <= k ? binomial[k + from][i + from] : 0;
            for (size_t q = i; q < k; q++)
                v *= -s->u0;
            for (size_t q = 0; q < k + from; q++)
                v /= s->h;
            ret_j[i][k] = v;
        }
}

static double sum_of_squares(const gsl_vector *v)
{
    double sum = 0;

    for (size_t i = 0; i < v->size; i++)
        sum += gsl_vector_get(v, i) * gsl_vector_get(v, i);
    return sum;
}

static void coefficients(const struct storage *s, const struct scaling *k, unsigned from,
                         struct sm_poly *p)
{
    double inverse[SM_POLY_MAX][SM_POLY_MAX] = { { 0 } }, j[SM_POLY_MAX][SM_POLY_MAX] = { { 0 } };
    double half[SM_POLY_MAX][SM_POLY_MAX] = { { 0 } }; /* J R^-1 sd: covariance = half half' */

    invert(s->a, p->n_coefficients, inverse);
    uncentre(k, from, p->n_coefficients, j);
    for (size_t a = 0; a < p->n_coefficients; a++) {
        double b = 0, square = 0;
        for (size_t c = 0; c < p->n_coefficients; c++)
            b += j[a][c] * gsl_vector_get(s->solution, c);
        p->coefficient[a] = k->g * b + (a + from == 0 ? k->y0 : 0);
        for (size_t c = 0; c < p->n_coefficients; c++) {
            double v = 0;
            for (size_t q = 0; q < p->n_coefficients; q++)
                v += j[a][q] * inverse[q][c];
            square += v * v;
            half[a][c] = v * p->residual_sd;
        }
        p->standard_error[a] = p->residual_sd * sqrt(square);
    }
    for (size_t a = 0; a < p->n_coefficients; a++)
        for (size_t b = 0; b < p->n_coefficients; b++)
            for (size_t c = 0; c < p->n_coefficients; c++)
                p->covariance[a][b] += half[a][c] * half[b][c];
}

static void statistics(const struct storage *s, const struct scaling *k, const double *u, size_t n,
                       unsigned from, struct sm_poly *p)
{
    const double rss = sum_of_squares(s->residual), tss = sum_of_squares(s->y);
    double szz = 0;

    for (size_t i = 0; i < n; i++) {
        const double z = (u[i] - k->u0) / k->h;
        szz += z * z;
    }
    p->u_mean = k->u0;
    p->suu = szz * k->h * k->h;
    p->residual_sd = k->g * sqrt(rss / (double)p->dof);
    p->r_squared = tss > 0 ? 1 - rss / tss : (double)NAN;
    coefficients(s, k, from, p);
    const size_t slope = 1 - from;
    p->rounding = 8 * DBL_EPSILON * (k->y_most + fabs(p->coefficient[slope]) * k->u_most);
}

static bool all_finite(const struct sm_poly *p)
{
    bool good = isfinite(p->suu) && p->suu > 0 && isfinite(p->residual_sd);

    for (size_t a = 0; a < p->n_coefficients; a++) {
        good = good && isfinite(p->coefficient[a]) && isfinite(p->standard_error[a]);
        for (size_t b = 0; b < p->n_coefficients; b++)
            good = good && isfinite(p->covariance[a][b]);
    }
    return good;
}

enum sm_status sm_poly_fit(const double *u, const double *y, size_t n, unsigned from, unsigned to,
                           struct sm_poly *ret_poly)
{
    struct sm_poly p = { 0 };
    struct scaling k;
    struct storage s;
    enum sm_status status;

    if (from > 1 || to < 1 || to > 2)
        return SM_EINVAL;
    p.n = n;
    p.n_coefficients = to - from + 1;
    if (n <= p.n_coefficients)
        return SM_ESHORT;
    p.dof = n - p.n_coefficients;
    status = scale(u, y, n, from == 0, &k);
    if (status != SM_OK)
        return status;
    status = allocate(n, p.n_coefficients, &s);
    if (status != SM_OK)
        return status;
    status = solve(&s, &k, u, y, n, from, p.n_coefficients);
    if (status == SM_OK) {
        statistics(&s, &k, u, n, from, &p);
        if (!all_finite(&p))
            status = SM_EVALUE;
    }
    release(&s);
    if (status == SM_OK)
        *ret_poly = p;
    return status;
}
