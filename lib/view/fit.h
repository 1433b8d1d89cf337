/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fit.h: a fitted curve and what was read off it, as one JSON object for programs or as a page of
 * plain text for the analyst: the standards first, R² last. Pure. */
#ifndef SM_VIEW_FIT_H
#define SM_VIEW_FIT_H
#include <stdbool.h>
#include <stddef.h>

#include "base/text.h"
#include "curve/curve.h"

struct sm_fit_reading {
    double y;   /* mean of the replicates */
    unsigned m; /* how many */
    bool has;   /* the curve has one x for it */
    struct sm_read_off read;
};

struct sm_fit_view {
    const char *x_name, *y_name; /* the file's own headings; "" where it has none */
    const struct sm_curve *curve;
    const struct sm_linearity *linearity;
    const struct sm_point *points;
    size_t n_points;
    const struct sm_fit_reading *readings;
    size_t n_readings;
};

/* Bytes that hold either form. */
size_t sm_fit_view_size(const struct sm_fit_view *v);

/* Keys as in the manual, in that order; what is not known is left out. A newline at the end. */
void sm_fit_view_json(const struct sm_fit_view *v, struct sm_text *t);

void sm_fit_view_text(const struct sm_fit_view *v, struct sm_text *t);
#endif
