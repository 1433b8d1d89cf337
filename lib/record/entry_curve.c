/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_curve.c: the keys of a `curve` entry.
 *
 *   run, accepted, sensor, method, unit_x, unit_y
 *   fit {model, n, dof, levels, coefficients [{name, value, standard_error}],
 *        covariance [[…] …], residual_sd (dof > 0), r_squared, from, to (x of the lowest and
 * highest standard), x_mean, sxx; nernst also slope (1 = theory), offset (mV at pH 7.00),
 * zero_point (pH), ph_iso, e_iso, temperature (°C)}; left out where there was nothing to fit points
 * [{capture, item, name, x, y, temperature, residual, back_calculated}] judged [{quantity, value,
 * from, to, pass, text}] */
#include "record/event.h"
#include "record/json.h"

static void write_coefficients(struct sm_text *t, const struct sm_curve *c)
{
    sm_json_list(t, "coefficients");
    for (size_t i = 0; i < c->n_coefficients; i++) {
        sm_json_object(t, NULL);
        sm_json_text(t, "name", c->coefficient[i].name);
        sm_json_real(t, "value", c->coefficient[i].value);
        sm_json_real(t, "standard_error", c->coefficient[i].standard_error);
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
    sm_json_list(t, "covariance");
    for (size_t i = 0; i < c->n_coefficients; i++) {
        sm_json_list(t, NULL);
        for (size_t j = 0; j < c->n_coefficients; j++)
            sm_json_real(t, NULL, c->covariance[i][j]);
        sm_json_close_list(t);
    }
    sm_json_close_list(t);
}

static void write_fit(struct sm_text *t, const struct sm_curve *c)
{
    sm_json_object(t, "fit");
    sm_json_text(t, "model", sm_model_name(c->model));
    sm_json_size(t, "n", c->n);
    sm_json_size(t, "dof", c->dof);
    sm_json_size(t, "levels", c->levels);
    write_coefficients(t, c);
    if (c->dof > 0)
        sm_json_real(t, "residual_sd", c->residual_sd);
    sm_json_real(t, "r_squared", c->r_squared);
    sm_json_real(t, "from", c->x_from);
    sm_json_real(t, "to", c->x_to);
    sm_json_real(t, "x_mean", c->x_mean);
    sm_json_real(t, "sxx", c->sxx);
    if (c->model == SM_MODEL_NERNST) {
        sm_json_real(t, "slope", c->slope_fraction);
        sm_json_real(t, "offset", c->offset_mv);
        sm_json_real(t, "zero_point", c->zero_point);
        sm_json_real(t, "ph_iso", c->ph_iso);
        sm_json_real(t, "e_iso", c->e_iso);
        sm_json_real(t, "temperature", c->t_c);
    }
    sm_json_close_object(t);
}

static void write_points(struct sm_text *t, const struct sm_event_curve *c)
{
    sm_json_list(t, "points");
    for (size_t i = 0; i < c->n_points; i++) {
        sm_json_object(t, NULL);
        sm_json_int(t, "capture", c->point[i].capture);
        sm_json_some(t, "item", (int64_t)c->point[i].item);
        sm_json_words(t, "name", c->point[i].name);
        sm_json_real(t, "x", c->point[i].x);
        sm_json_real(t, "y", c->point[i].y);
        if (c->point[i].has_t)
            sm_json_real(t, "temperature", c->point[i].t_c);
        if (c->fitted) {
            sm_json_real(t, "residual", c->point[i].residual);
            sm_json_real(t, "back_calculated", c->point[i].back_calculated);
        }
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

static void write_judged(struct sm_text *t, const struct sm_event_curve *c)
{
    sm_json_list(t, "judged");
    for (size_t i = 0; i < c->n_judged; i++) {
        const struct sm_judged *j = &c->judged[i];

        sm_json_object(t, NULL);
        sm_json_text(t, "quantity", j->quantity);
        sm_json_real(t, "value", j->value);
        if (j->has_from)
            sm_json_real(t, "from", j->from);
        if (j->has_to)
            sm_json_real(t, "to", j->to);
        sm_json_bool(t, "pass", j->pass);
        sm_json_words(t, "text", j->text);
        sm_json_close_object(t);
    }
    sm_json_close_list(t);
}

void sm_event_curve_write(struct sm_text *t, const struct sm_event_curve *c)
{
    sm_json_int(t, "run", c->run);
    sm_json_bool(t, "accepted", c->accepted);
    sm_json_words(t, "sensor", c->sensor);
    sm_json_words(t, "method", c->method);
    sm_json_words(t, "unit_x", sm_unit_name(c->unit_x));
    sm_json_words(t, "unit_y", sm_unit_name(c->unit_y));
    if (c->fitted)
        write_fit(t, &c->curve);
    write_points(t, c);
    write_judged(t, c);
}
