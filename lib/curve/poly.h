/* SPDX-License-Identifier: GPL-3.0-or-later */
/* poly.h: least squares of y on the powers of one variable, with the statistics of the fit. Every
 * model that is linear in its coefficients is turned into this. */
#ifndef SM_CURVE_POLY_H
#define SM_CURVE_POLY_H
#include <stddef.h>

#include "base/status.h"

#define SM_POLY_MAX 3

struct sm_poly {
    size_t n, n_coefficients, dof;
    double coefficient[SM_POLY_MAX]; /* rising power of u, from the lowest fitted */
    double standard_error[SM_POLY_MAX];
    double covariance[SM_POLY_MAX][SM_POLY_MAX];
    double residual_sd;
    double r_squared; /* about the mean of y; without a constant about zero. NaN: all y are alike */
    double u_mean;    /* 0 without a constant */
    double suu;       /* sum of (u - u_mean)^2 */
    double rounding;  /* what the rounding of u and y alone may make of residual_sd */
};

/* y = sum of b[k] u^k for k = from … to, with from 0 or 1 and to at most 2. QR (Householder, GSL)
 * of the data centred, unless from is 1, and scaled to ±1. Allocates for the time of the call.
 *   SM_EINVAL  powers other than those
 *   SM_ESHORT  n <= coefficients, or u has too few different values for them
 *   SM_EVALUE  the numbers are not finite, or too far apart for a double
 *   SM_ENOMEM  no memory */
SM_MUST_CHECK enum sm_status sm_poly_fit(const double *u, const double *y, size_t n, unsigned from,
                                         unsigned to, struct sm_poly *ret_poly);
#endif
