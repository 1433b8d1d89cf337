/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fits.h: can this meter be used with this method? Asked by --check for the meter's own method, and
 * for every method that a sheet names. */
#ifndef SM_BENCH_FITS_H
#define SM_BENCH_FITS_H
#include "base/status.h"
#include "bench/method.h"
#include "reading/profile.h"

/* The profile has the method's channels, in its units, and its signal raw where a curve is fitted.
 *   SM_EINVAL  ret_why */
SM_MUST_CHECK enum sm_status sm_method_fits(const struct sm_method *method,
                                            const struct sm_profile *profile,
                                            char ret_why[SM_REASON_SIZE]);
#endif
