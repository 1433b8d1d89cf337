/* SPDX-License-Identifier: GPL-3.0-or-later */
/* table.c: results, captures and curves out of the entries of logs. Readings are in
 * table_readings.c. */
#include "view/table.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "record/head.h"
#include "view/phrase.h"
#include "view/row.h"
#include "view/table_inside.h"

#define UTC_N 27

static const char RESULTS[] =
    "n,run,item,name,kind,value,unit,expanded_uncertainty,shown,state,temperature (\xc2\xb0"
    "C),temperature_how,captured_utc,why,remarks,capture,curve\r\n";
static const char CAPTURES[] =
    "n,run,item,name,kind,number,utc,value,unit,expanded_uncertainty,sd,readings,window_from (s),"
    "window_to (s),since_moved (s),lifts,rule,prescribed,tolerance,with,who,remarks\r\n";
static const char CURVE[] =
    "curve,utc,run,accepted,sensor,method,model,capture,item,name,x,unit_x,y,unit_y,temperature "
    "(\xc2\xb0"
    "C),residual,back_calculated,intercept,intercept_se,slope,slope_se,quadratic,quadratic_se,"
    "slope_of_theory (%),offset (mV),residual_sd,r_squared\r\n";

struct result {
    int64_t n, capture;
    json_t *entry; /* owned */
    char state[16];
    char why[SM_REASON_SIZE];
    char captured[UTC_N + 1];
};

struct capture {
    int64_t n;
    char utc[UTC_N + 1];
};

struct sm_export {
    struct sm_export_ask ask;
    char *line; /* [SM_ROW_SIZE] */
    size_t rows;
    struct result *result; /* n rising */
    size_t n_results, result_cap;
    struct capture *capture;
    size_t n_captures, capture_cap;
    struct sm_export_readings *readings;
};

enum sm_status sm_export_create(const struct sm_export_ask *ask, struct sm_export **ret_table)
{
    static const char *const heads[] = { RESULTS, CAPTURES, CURVE, "" };
    struct sm_export *t = calloc(1, sizeof *t);

    if (t == NULL)
        return SM_ENOMEM;
    t->ask = *ask;
    t->line = malloc(SM_ROW_SIZE);
    if (t->line == NULL) {
        free(t);
        return SM_ENOMEM;
    }
    ask->write(ask->arg, heads[ask->kind], strlen(heads[ask->kind]));
    *ret_table = t;
    return SM_OK;
}

void sm_export_destroy(struct sm_export *t)
{
    if (t == NULL)
        return;
    for (size_t i = 0; i < t->n_results; i++)
        json_decref(t->result[i].entry);
    free(t->result);
    free(t->capture);
    free(t->line);
    sm_export_readings_destroy(t->readings);
    free(t);
}

/* ---- helpers ---- */

static int64_t int_of(const json_t *o, const char *key)
{
    return (int64_t)json_integer_value(json_object_get(o, key));
}

static const char *string_of(const json_t *o, const char *key)
{
    const char *s = json_string_value(json_object_get(o, key));

    return s != NULL ? s : "";
}

static double real_of(const json_t *o, const char *key)
{
    const json_t *v = json_object_get(o, key);

    return json_is_number(v) ? json_number_value(v) : NAN;
}

static bool is_wanted(const struct sm_export *t, const json_t *o)
{
    return !t->ask.has_run || (json_object_get(o, "run") != NULL && int_of(o, "run") == t->ask.run);
}

static void put(struct sm_export *t, struct sm_row *r)
{
    sm_row_end(r);
    t->ask.write(t->ask.arg, r->t.buf, r->t.len);
    t->rows++;
}

/* Room for one more element of `size` bytes; NULL: no memory. */
static void *grow(void *list, size_t n, size_t *cap, size_t size)
{
    void *more = list;

    if (n == *cap) {
        const size_t want = *cap > 0 ? 2 * *cap : 64;

        more = realloc(list, want * size);
        if (more != NULL)
            *cap = want;
    }
    return more;
}

/* ---- captures ---- */

static void write_capture(struct sm_export *t, const json_t *o)
{
    static const char *const head[] = {
        "n",      "run",     "item",  "name", "kind",
        "number", "utc",     "value", "unit", "expanded_uncertainty",
        "sd",     "readings"
    };
    const json_t *window = json_object_get(o, "window");
    struct sm_row r;

    sm_row_begin(&r, t->line);
    for (size_t i = 0; i < sizeof head / sizeof head[0]; i++)
        sm_row_key(&r, o, head[i]);
    sm_row_seconds(&r, json_array_get(window, 0));
    sm_row_seconds(&r, json_array_get(window, 1));
    sm_row_seconds(&r, json_object_get(o, "since_moved"));
    sm_row_key(&r, o, "lifts");
    sm_row_key(&r, o, "rule");
    sm_row_key(&r, o, "prescribed");
    sm_row_key(&r, o, "tolerance");
    sm_row_joined(&r, json_object_get(o, "with"));
    sm_row_key(&r, o, "who");
    sm_row_joined(&r, json_object_get(o, "remarks"));
    put(t, &r);
}

/* ---- curves ---- */

/* Coefficient number i, and its standard error. */
static void add_coefficient(struct sm_row *r, const json_t *fit, size_t i)
{
    const json_t *c = json_array_get(json_object_get(fit, "coefficients"), i);
    static const char *const names[] = { "intercept", "slope", "quadratic" };

    for (size_t k = 0; k <= i; k++) { /* a proportional curve has a slope alone */
        const json_t *at = json_array_get(json_object_get(fit, "coefficients"), k);
        if (strcmp(string_of(at, "name"), names[i]) == 0)
            c = at;
    }
    if (strcmp(string_of(c, "name"), names[i]) != 0)
        c = NULL;
    sm_row_key(r, c, "value");
    sm_row_key(r, c, "standard_error");
}

static void write_point(struct sm_export *t, const json_t *o, const json_t *point)
{
    const json_t *fit = json_object_get(o, "fit");
    static const char *const head[] = { "n", "utc", "run", "accepted", "sensor", "method" };
    struct sm_row r;

    sm_row_begin(&r, t->line);
    for (size_t i = 0; i < sizeof head / sizeof head[0]; i++)
        sm_row_key(&r, o, head[i]);
    sm_row_key(&r, fit, "model");
    sm_row_key(&r, point, "capture");
    sm_row_key(&r, point, "item");
    sm_row_key(&r, point, "name");
    sm_row_key(&r, point, "x");
    sm_row_key(&r, o, "unit_x");
    sm_row_key(&r, point, "y");
    sm_row_key(&r, o, "unit_y");
    sm_row_key(&r, point, "temperature");
    sm_row_key(&r, point, "residual");
    sm_row_key(&r, point, "back_calculated");
    for (size_t i = 0; i < 3; i++)
        add_coefficient(&r, fit, i);
    sm_row_real(&r, 100 * real_of(fit, "slope"));
    sm_row_key(&r, fit, "offset");
    sm_row_key(&r, fit, "residual_sd");
    sm_row_key(&r, fit, "r_squared");
    put(t, &r);
}

static void write_curve(struct sm_export *t, const json_t *o)
{
    const json_t *points = json_object_get(o, "points");

    for (size_t i = 0; i < json_array_size(points); i++)
        write_point(t, o, json_array_get(points, i));
}

/* ---- results ---- */

static enum sm_status keep_capture(struct sm_export *t, const struct sm_head *h)
{
    struct capture *more = grow(t->capture, t->n_captures, &t->capture_cap, sizeof *more);

    if (more == NULL)
        return SM_ENOMEM;
    t->capture = more;
    more = &t->capture[t->n_captures++];
    more->n = h->n;
    memcpy(more->utc, h->when + h->when_n - UTC_N, UTC_N);
    more->utc[UTC_N] = '\0';
    return SM_OK;
}

static enum sm_status keep_result(struct sm_export *t, json_t *o)
{
    struct result *more = grow(t->result, t->n_results, &t->result_cap, sizeof *more);

    if (more == NULL)
        return SM_ENOMEM;
    t->result = more;
    more = &t->result[t->n_results++];
    memset(more, 0, sizeof *more);
    more->n = int_of(o, "n");
    more->capture = int_of(o, "capture");
    more->entry = json_incref(o);
    sm_text_copy(more->state, sizeof more->state, string_of(o, "state"));
    sm_text_copy(more->why, sizeof more->why, string_of(o, "why"));
    for (size_t i = t->n_captures; i > 0 && more->captured[0] == '\0'; i--)
        if (t->capture[i - 1].n == more->capture)
            memcpy(more->captured, t->capture[i - 1].utc, sizeof more->captured);
    return SM_OK;
}

/* A hold or a release: the results it names are in another state from here on. */
static void change_results(struct sm_export *t, const json_t *o, enum sm_result_state state)
{
    const json_t *list = json_object_get(o, "results");

    for (size_t i = 0; i < json_array_size(list); i++) {
        const int64_t n = (int64_t)json_integer_value(json_array_get(list, i));

        for (size_t k = 0; k < t->n_results; k++)
            if (t->result[k].n == n) {
                sm_text_copy(t->result[k].state, sizeof t->result[k].state,
                             sm_result_state_name(state));
                sm_text_copy(t->result[k].why, sizeof t->result[k].why, string_of(o, "why"));
            }
    }
}

/* What a person reads: "8.12 ± 0.10 pH", "< 1.68 pH"; no number but with its uncertainty. */
static void add_shown(struct sm_row *r, const json_t *o)
{
    const double value = real_of(o, "value"), u95 = real_of(o, "expanded_uncertainty");
    char cell[128];
    struct sm_text t;

    sm_text_init(&t, cell, sizeof cell);
    if (string_of(o, "shown")[0] != '\0')
        sm_text_addf(&t, "%s %s", string_of(o, "shown"), string_of(o, "unit"));
    else if (isfinite(value) && isfinite(u95))
        sm_phrase_with_u95(&t, value, u95, string_of(o, "unit"));
    sm_row_cell(r, cell);
}

static void write_result(struct sm_export *t, const struct result *result)
{
    static const char *const head[] = { "n",    "run",   "item", "name",
                                        "kind", "value", "unit", "expanded_uncertainty" };
    const json_t *o = result->entry;
    struct sm_row r;

    sm_row_begin(&r, t->line);
    for (size_t i = 0; i < sizeof head / sizeof head[0]; i++)
        sm_row_key(&r, o, head[i]);
    add_shown(&r, o);
    sm_row_cell(&r, result->state);
    sm_row_key(&r, o, "temperature");
    sm_row_key(&r, o, "temperature_how");
    sm_row_cell(&r, result->captured);
    sm_row_cell(&r, result->why);
    sm_row_joined(&r, json_object_get(o, "remarks"));
    sm_row_key(&r, o, "capture");
    sm_row_key(&r, o, "curve");
    put(t, &r);
}

/* ---- entries ---- */

/* Does the table need this kind of entry? */
static bool is_needed(const struct sm_export *t, const struct sm_head *h, bool later)
{
    switch (t->ask.kind) {
    case SM_EXPORT_RESULTS:
        return sm_head_is(h, "hold") || sm_head_is(h, "release") ||
               (!later && sm_head_is(h, "result"));
    case SM_EXPORT_CAPTURES:
        return sm_head_is(h, "capture");
    case SM_EXPORT_CURVE:
        return sm_head_is(h, "curve");
    case SM_EXPORT_READINGS:
        break;
    }
    return false;
}

static enum sm_status take(struct sm_export *t, const struct sm_head *h, json_t *o)
{
    if (sm_head_is(h, "hold"))
        change_results(t, o, SM_RESULT_HELD);
    else if (sm_head_is(h, "release"))
        change_results(t, o, SM_RESULT_RELEASED);
    else if (!is_wanted(t, o))
        return SM_OK;
    else if (sm_head_is(h, "result"))
        return keep_result(t, o);
    else if (sm_head_is(h, "capture"))
        write_capture(t, o);
    else
        write_curve(t, o);
    return SM_OK;
}

static enum sm_status take_line(struct sm_export *t, const char *line, size_t n, bool later,
                                char ret_why[SM_REASON_SIZE])
{
    struct sm_entry_store store;
    struct sm_entry e;
    struct sm_head h;
    enum sm_status st;

    if (!sm_head_read(line, n, &h))
        return SM_OK; /* verify speaks of such */
    if (t->ask.kind == SM_EXPORT_RESULTS && sm_head_is(&h, "capture"))
        return keep_capture(t, &h);
    if (!is_needed(t, &h, later))
        return SM_OK;
    sm_entry_store_init(&store);
    st = sm_entry_read(line, n, &store, &e, ret_why);
    if (st != SM_OK)
        return st;
    st = take(t, &h, e.json);
    json_decref(e.json);
    sm_entry_store_finish(&store);
    return st;
}

static enum sm_status fail(char ret_why[SM_LINK_TEXT_SIZE], enum sm_status st, size_t line,
                           const char *why)
{
    struct sm_text t;

    sm_text_init(&t, ret_why, SM_LINK_TEXT_SIZE);
    sm_text_addf(&t, "line %zu: %s", line, st == SM_ENOMEM ? "no memory" : why);
    return st;
}

enum sm_status sm_export_add(struct sm_export *t, const char *text, size_t n, bool later,
                             char ret_why[SM_LINK_TEXT_SIZE])
{
    const char *at = text, *end = text + n;

    if (t->ask.kind == SM_EXPORT_READINGS)
        return later ? SM_OK
                     : sm_export_readings_add(&t->ask, &t->readings, text, n, &t->rows, ret_why);
    if (later && t->ask.kind != SM_EXPORT_RESULTS)
        return SM_OK;
    for (size_t line = 1; at < end; line++) {
        const char *newline = memchr(at, '\n', (size_t)(end - at));
        char why[SM_REASON_SIZE] = "";
        enum sm_status st;

        if (newline == NULL)
            break;
        st = take_line(t, at, (size_t)(newline - at), later, why);
        if (st != SM_OK)
            return fail(ret_why, st, line, why);
        at = newline + 1;
    }
    return SM_OK;
}

size_t sm_export_end(struct sm_export *t)
{
    for (size_t i = 0; i < t->n_results; i++)
        write_result(t, &t->result[i]);
    return t->rows;
}
