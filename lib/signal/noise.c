/* SPDX-License-Identifier: GPL-3.0-or-later */
/* noise.c: noise from second differences, the display step. */
#include "signal/noise.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#define MAD_TO_SD 1.4826 /* sd of a normal variable over the median of its size */
#define RATIO_LEAST 0.2  /* spacings more uneven than this are taken as this */
#define RATIO_MOST 5.0
#define STEP_MOST 1e150 /* squares of more are no numbers any more */
#define SAME 1e-9       /* relative: differences below this are rounding, not a display step */

void sm_noise_init(struct sm_noise *n, double before)
{
    *n = (struct sm_noise){ .sd = before, .known = before > 0 };
    if (!n->known)
        return;
    for (unsigned i = 0; i < SM_NOISE_KEPT; i++) /* as if it had been seen so often */
        n->size[i] = before / MAD_TO_SD;
    n->n = SM_NOISE_KEPT;
}

static double median(const double *v, unsigned n)
{
    double s[SM_NOISE_KEPT] = { 0 };

    for (unsigned i = 0; i < n; i++) {
        unsigned k = i;

        for (; k > 0 && s[k - 1] > v[i]; k--)
            s[k] = s[k - 1];
        s[k] = v[i];
    }
    return n % 2 == 1 ? s[n / 2] : (s[n / 2 - 1] + s[n / 2]) / 2;
}

void sm_noise_add(struct sm_noise *n, double x, double dt, double x1, double dt1, double x2)
{
    const double r = fmin(fmax(dt / dt1, RATIO_LEAST), RATIO_MOST);
    const double d2 = (x - x1) - (x1 - x2) * r;

    n->size[n->next] = fabs(d2) / sqrt(1 + (1 + r) * (1 + r) + r * r);
    n->next = (n->next + 1) % SM_NOISE_KEPT;
    if (n->n < SM_NOISE_KEPT)
        n->n++;
    if (n->n >= SM_NOISE_LEAST) {
        n->sd = MAD_TO_SD * median(n->size, n->n);
        n->known = true;
    }
}

void sm_step_init(struct sm_step *s, double before)
{
    *s = (struct sm_step){ .learned = before };
}

void sm_step_see(struct sm_step *s, double value, double given)
{
    s->given = given > 0 && given < STEP_MOST ? given : 0;
    if (s->has_last) {
        const double change = fabs(value - s->last);

        if (change > SAME * fmax(fabs(value), fabs(s->last)) &&
            (s->learned <= 0 || change < s->learned))
            s->learned = change;
    }
    s->last = value;
    s->has_last = true;
}

double sm_step_now(const struct sm_step *s)
{
    return s->given > 0 ? s->given : s->learned;
}

double sm_step_uncertainty(double step, double sd)
{
    const double pi = 3.14159265358979323846;

    if (!(step > 0))
        return 0;
    return step / sqrt(12.0) * fmin(1.0, 1.4 * exp(-2 * pi * pi * (sd / step) * (sd / step)));
}
