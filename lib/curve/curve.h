/* SPDX-License-Identifier: GPL-3.0-or-later */
/* curve.h: a calibration function fitted to standards, its statistics, and readings taken off it.
 */
#ifndef SM_CURVE_CURVE_H
#define SM_CURVE_CURVE_H
#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"
#include "base/text.h"

#define SM_POINTS_MAX 128       /* standards of one curve at the bench */
#define SM_FIT_POINTS_MAX 20000 /* points of `stillmark fit` */
#define SM_COEFFICIENTS_MAX 3

enum sm_model {
    SM_MODEL_LINE,
    SM_MODEL_PROPORTIONAL,
    SM_MODEL_QUADRATIC,
    SM_MODEL_LOG_LINE,
    SM_MODEL_LOG_OFFSET,
    SM_MODEL_NERNST,
    SM_MODEL_AS_READ,
    SM_MODEL_COUNT
};
const char *sm_model_name(enum sm_model m);
bool sm_model_known(const char *name, enum sm_model *ret_model);
bool sm_model_built(enum sm_model m);
size_t sm_model_coefficients(enum sm_model m);

/* ln(10) R T / F in mV per unit of pH, R and F exact (SI 2019). t_c in °C. */
double sm_nernst_mv(double t_c);

struct sm_coefficient {
    const char *name; /* "intercept", "slope", "quadratic" */
    double value, standard_error;
};

/* y = f(x). For NERNST at the bench each point has its own temperature: see sm_curve_fit. */
struct sm_curve {
    enum sm_model model;
    size_t n, dof, n_coefficients, levels;
    struct sm_coefficient coefficient[SM_COEFFICIENTS_MAX]; /* rising power of x */
    double covariance[SM_COEFFICIENTS_MAX][SM_COEFFICIENTS_MAX];
    double residual_sd;  /* of y; dof > 0 */
    double r_squared;    /* uncentred for PROPORTIONAL; NaN where all y are alike */
    double x_from, x_to; /* lowest and highest standard */
    double x_mean, sxx;  /* mean of x and sum of (x - x_mean)^2. PROPORTIONAL: 0 and sum of x^2;
                          * NERNST: of the pH that each standard would have at t_c */
    /* NERNST only */
    double slope_fraction; /* s: 1 = theory */
    double offset_mv;      /* E at pH 7.00 and t_c */
    double zero_point;     /* pH at 0 mV and t_c; NaN for a flat line */
    double ph_iso, e_iso;  /* isopotential point */
    double t_c;            /* mean temperature of the standards */
};

struct sm_linearity {
    bool has; /* it could be computed */
    const char *test;
    double statistic, critical, p;
    bool pass;
};

/* One calibration point. */
struct sm_point {
    double x, y;
    double t_c; /* NERNST; else ignored */
};

/* Least squares by QR or SVD on centred data (GSL). NERNST: E = Eiso - s kN(t) (pH - pHiso), each
 * point at its own temperature; `coefficient` is then the line at the mean temperature: intercept
 * (mV at pH 0) and slope (mV/pH). Allocates for the time of the call (a curve is fitted once per
 * set of standards).
 *   SM_ESHORT  fewer points, or fewer distinct x, than coefficients + 1 (equal numbers fit without
 *              statistics are refused too)
 *   SM_EVALUE  a point that is not finite, or numbers too far apart for a double
 *   SM_EINVAL  a model that is not built
 *   SM_EFULL   more than SM_FIT_POINTS_MAX
 *   SM_ENOMEM  no memory */
SM_MUST_CHECK enum sm_status sm_curve_fit(enum sm_model m, const struct sm_point *p, size_t n,
                                          double ph_iso, struct sm_curve *ret_curve);

/* The curve's y at x (NERNST: at t_c). */
double sm_curve_y(const struct sm_curve *c, double x, double t_c);

struct sm_read_off {
    double x;
    double standard_uncertainty; /* textbook inverse prediction: curve and reading, m replicates */
    double curve_uncertainty;    /* of position alone: without the 1/m term */
    bool between_standards;      /* x_from <= x <= x_to */
};

/* x for a mean y of m replicates (NERNST: at t_c).
 *   SM_EVALUE  no x, or no single one within reach, gives this y. QUADRATIC: within reach is what
 *              lies between the standards, else what lies on their side of the turning point
 *   SM_EINVAL  m is 0 */
SM_MUST_CHECK enum sm_status sm_curve_read(const struct sm_curve *c, double y, unsigned m,
                                           double t_c, struct sm_read_off *ret_read);

/* Line against quadratic at 99 % (Mandel): for LINE and NERNST, from four points at three levels
 * up. has = false where it cannot be computed; so too where the points lie on the line to the last
 * digit. */
void sm_curve_linearity(enum sm_model m, const struct sm_point *p, size_t n, double ph_iso,
                        struct sm_linearity *ret_linearity);

/* Number of distinct x among p[n]. Above SM_POINTS_MAX it allocates; 0: no memory. */
size_t sm_curve_levels(const struct sm_point *p, size_t n);

/* Student's t, two-sided at 95 %; dof >= 1. */
double sm_t95(size_t dof);
#endif
