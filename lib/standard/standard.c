/* SPDX-License-Identifier: GPL-3.0-or-later */
/* standard.c: the value a standard has at a temperature. */
#include "standard/standard.h"

#include <math.h>
#include <string.h>

/* Values at some temperatures, rising; a NaN value is none. */
struct series {
    const double *t_c, *value;
    size_t n, stride; /* of value */
};

int sm_standards_find(const struct sm_standards *s, const char *name)
{
    for (size_t i = 0; i < s->n; i++)
        if (strcmp(s->list[i].name, name) == 0)
            return (int)i;
    return -1;
}

/* Linear between the nearest values on either side; the first and the last hold `beyond_c` further.
 */
static bool between(const struct series *s, double t_c, double beyond_c, double *ret_value)
{
    const double *below = NULL, *above = NULL, *below_value = NULL, *above_value = NULL;

    for (size_t i = 0; i < s->n; i++) {
        const double *value = &s->value[i * s->stride];
        if (isnan(*value))
            continue;
        if (s->t_c[i] <= t_c) {
            below = &s->t_c[i];
            below_value = value;
        }
        if (s->t_c[i] >= t_c && above == NULL) {
            above = &s->t_c[i];
            above_value = value;
        }
    }
    if (below != NULL && above != NULL) {
        const double part = *above > *below ? (t_c - *below) / (*above - *below) : 0;
        *ret_value = *below_value + part * (*above_value - *below_value);
        return true;
    }
    if (below != NULL && t_c - *below <= beyond_c) {
        *ret_value = *below_value;
        return true;
    }
    if (above != NULL && *above - t_c <= beyond_c) {
        *ret_value = *above_value;
        return true;
    }
    return false;
}

/* "from 19 °C to 26 °C" or "no temperature". */
static void say_span(const struct series *s, double beyond_c, struct sm_text *t)
{
    bool any = false;
    double from = 0, to = 0;

    for (size_t i = 0; i < s->n; i++)
        if (!isnan(s->value[i * s->stride])) {
            from = any ? from : s->t_c[i];
            to = s->t_c[i];
            any = true;
        }
    if (any)
        sm_text_addf(t, "from %g °C to %g °C", from - beyond_c, to + beyond_c);
    else
        sm_text_add(t, "at no temperature");
}

enum sm_status sm_standard_value(const struct sm_standards *s, size_t i, double t_c,
                                 double *ret_value, char ret_why[SM_REASON_SIZE])
{
    const struct sm_standard *d;
    const struct sm_table *b = &s->table;
    struct series values = { .stride = 1 };
    double beyond_c = 0;
    char name[64]; /* cut where long, so that the reason has room */
    struct sm_text why;

    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    if (i >= s->n) {
        sm_text_add(&why, "there is no such standard");
        return SM_EINVAL;
    }
    d = &s->list[i];
    sm_text_copy(name, sizeof name, d->name);
    if (d->n_values == 1 && isnan(d->t_c[0])) {
        *ret_value = d->value[0];
        return SM_OK;
    }
    if (d->n_values > 0) {
        values = (struct series){ d->t_c, d->value, d->n_values, 1 };
        beyond_c = SM_CERTIFICATE_WITHIN_C;
    } else if (d->table_column >= 0 && (size_t)d->table_column < b->n_columns) {
        values = (struct series){ b->t_c, &b->value[0][d->table_column], b->n_rows,
                                  SM_TABLE_COLUMNS_MAX };
    } else {
        sm_text_addf(&why, "%s has neither a certificate value nor a table column", name);
        return SM_EINVAL;
    }
    if (isfinite(t_c) && between(&values, t_c, beyond_c, ret_value))
        return SM_OK;
    sm_text_addf(&why, "%s has a value ", name);
    say_span(&values, beyond_c, &why);
    if (isfinite(t_c))
        sm_text_addf(&why, ", not at %.1f °C", t_c);
    else
        sm_text_add(&why, "; the temperature is not known");
    return SM_EINVAL;
}
