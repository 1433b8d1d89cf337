/* SPDX-License-Identifier: GPL-3.0-or-later */
/* row.c: cells of a CSV row. */
#include "view/row.h"

#include <math.h>
#include <stdint.h>

#include "base/csv.h"
#include "base/number.h"

#define CELL_SIZE 8192

void sm_row_begin(struct sm_row *r, char *buf)
{
    sm_text_init(&r->t, buf, SM_ROW_SIZE);
    r->first = true;
}

void sm_row_end(struct sm_row *r)
{
    sm_text_addn(&r->t, "\r\n", 2);
}

void sm_row_cell(struct sm_row *r, const char *text)
{
    if (!r->first)
        sm_text_addn(&r->t, ",", 1);
    r->first = false;
    sm_csv_cell(&r->t, text);
}

void sm_row_real(struct sm_row *r, double v)
{
    char digits[SM_NUMBER_SIZE] = "";

    if (isfinite(v))
        sm_number_write(digits, v);
    sm_row_cell(r, digits);
}

/* A single value as text: numbers as in the log. */
static void add_value(struct sm_text *t, const json_t *v)
{
    char digits[SM_NUMBER_SIZE];

    if (json_is_string(v))
        sm_text_addn(t, json_string_value(v), json_string_length(v));
    else if (json_is_integer(v))
        sm_text_addf(t, "%lld", (long long)json_integer_value(v));
    else if (json_is_real(v))
        sm_text_addn(t, digits, sm_number_write(digits, json_real_value(v)));
    else if (json_is_boolean(v))
        sm_text_add(t, json_is_true(v) ? "yes" : "no");
}

void sm_row_key(struct sm_row *r, const json_t *o, const char *key)
{
    char cell[CELL_SIZE];
    struct sm_text t;

    sm_text_init(&t, cell, sizeof cell);
    add_value(&t, json_object_get(o, key));
    sm_row_cell(r, cell);
}

void sm_row_seconds(struct sm_row *r, const json_t *ns)
{
    if (json_is_number(ns))
        sm_row_real(r, json_number_value(ns) / 1e9);
    else
        sm_row_cell(r, "");
}

void sm_row_joined(struct sm_row *r, const json_t *v)
{
    json_t *o = (json_t *)(uintptr_t)v; /* iterating changes nothing */
    char cell[CELL_SIZE];
    struct sm_text t;

    sm_text_init(&t, cell, sizeof cell);
    for (size_t i = 0; i < json_array_size(v); i++) {
        sm_text_add(&t, i > 0 ? "; " : "");
        add_value(&t, json_array_get(v, i));
    }
    for (void *it = json_object_iter(o); it != NULL; it = json_object_iter_next(o, it)) {
        sm_text_add(&t, t.len > 0 ? "; " : "");
        sm_text_addf(&t, "%s ", json_object_iter_key(it));
        add_value(&t, json_object_iter_value(it));
    }
    sm_row_cell(r, cell);
}
