/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_table.c: tables out of entries that are made up here. */
#include "check.h"

#include <stdlib.h>
#include <string.h>

#include "view/table.h"

static char log_text[64 * 1024], csv[64 * 1024];
static struct sm_text log_t, csv_t;
static int64_t n;

static struct sm_event *event(enum sm_event_kind kind)
{
    static struct sm_event e;

    memset(&e, 0, sizeof e);
    e.kind = kind;
    e.n = n++;
    e.t_ns = e.n * 1000000000;
    e.utc_us = 1796112723000000 + e.n * 1000000;
    return &e;
}

static void log_begin(void)
{
    sm_text_init(&log_t, log_text, sizeof log_text);
}

/* A capture and its result, provisional; gives the result's n. */
static int64_t add_result(int64_t run, const char *name, double value, double u95)
{
    struct sm_event *e = event(SM_EVENT_CAPTURE);
    const int64_t capture = e->n;
    struct sm_event_result *r;

    strcpy(e->u.capture.name, name);
    sm_entry_event(&log_t, e);
    e = event(SM_EVENT_RESULT);
    r = &e->u.result;
    r->capture = capture;
    r->where.has = true;
    r->where.run = run;
    r->where.item = 3;
    r->where.kind = SM_ITEM_SAMPLE;
    strcpy(r->name, name);
    r->has_value = r->has_u95 = true;
    r->value = value;
    r->u95 = u95;
    r->unit = SM_UNIT_PH;
    r->has_temperature = true;
    r->temperature_c = 20.5;
    strcpy(r->temperature_how, "measured");
    strcpy(r->why, "waits");
    sm_entry_event(&log_t, e);
    return e->n;
}

static void add_change(enum sm_event_kind kind, int64_t result, const char *why)
{
    struct sm_event *e = event(kind);

    e->u.change.n = 1;
    e->u.change.result[0] = result;
    strcpy(e->u.change.why, why);
    sm_entry_event(&log_t, e);
}

static void take(void *arg, const char *bytes, size_t len)
{
    (void)arg;
    sm_text_addn(&csv_t, bytes, len);
}

static struct sm_export *begin(enum sm_export_kind kind, int64_t run)
{
    const struct sm_export_ask ask = {
        .kind = kind, .has_run = run > 0, .run = run, .write = take
    };
    struct sm_export *t;

    sm_text_init(&csv_t, csv, sizeof csv);
    assert_int_equal(sm_export_create(&ask, &t), SM_OK);
    return t;
}

static void add(struct sm_export *t, bool later)
{
    char why[SM_LINK_TEXT_SIZE] = "";

    if (sm_export_add(t, log_t.buf, log_t.len, later, why) != SM_OK)
        fail_msg("%s", why);
}

#define HEAD                                                                                       \
    "n,run,item,name,kind,value,unit,expanded_uncertainty,shown,state,temperature (\xc2\xb0"       \
    "C),temperature_how,captured_utc,why,remarks,capture,curve\r\n"

static void a_result_has_the_state_that_later_entries_gave_it(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_RESULTS, 0);
    int64_t first, second;

    (void)state;
    n = 10;
    log_begin();
    first = add_result(1, "final", 8.123456789, 0.1);
    second = add_result(1, "raw", 7.25, 0.05);
    add_change(SM_EVENT_HOLD, first, "check failed");
    add(t, false);
    log_begin(); /* the next file */
    add_change(SM_EVENT_RELEASE, second, "check passed");
    add_result(2, "not asked for", 1, 1);
    add(t, true);
    assert_int_equal(sm_export_end(t), 2);
    sm_export_destroy(t);
    assert_string_equal(csv, HEAD
                        "11,1,3,final,sample,8.123456789,pH,0.1,8.12 \xc2\xb1 0.10 pH,held,20.5,"
                        "measured,2026-12-01T08:12:13.000000Z,check failed,,10,\r\n"
                        "13,1,3,raw,sample,7.25,pH,0.05,7.250 \xc2\xb1 0.050 pH,released,20.5,"
                        "measured,2026-12-01T08:12:15.000000Z,check passed,,12,\r\n");
}

static void only_the_run_asked_for_is_shown(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_RESULTS, 2);

    (void)state;
    n = 10;
    log_begin();
    add_result(1, "of one", 8, 0.1);
    add_result(2, "of two", 7, 0.1);
    add(t, false);
    assert_int_equal(sm_export_end(t), 1);
    sm_export_destroy(t);
    assert_non_null(strstr(csv, "of two"));
    assert_null(strstr(csv, "of one"));
}

static void names_cannot_become_formulas_or_break_a_row(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_RESULTS, 0);

    (void)state;
    n = 10;
    log_begin();
    add_result(1, "=1+1", 8, 0.1);
    add_result(1, "a, \"b\"", 8, 0.1);
    add_result(1, "-58.3", 8, 0.1); /* a number may begin so */
    add(t, false);
    sm_export_end(t);
    sm_export_destroy(t);
    assert_non_null(strstr(csv, "11,1,3,'=1+1,sample"));
    assert_non_null(strstr(csv, "13,1,3,\"a, \"\"b\"\"\",sample"));
    assert_non_null(strstr(csv, "15,1,3,-58.3,sample"));
}

static void beyond_the_standards_there_is_no_number(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_RESULTS, 0);
    struct sm_event *e;

    (void)state;
    n = 10;
    log_begin();
    e = event(SM_EVENT_RESULT);
    e->u.result.capture = 9;
    e->u.result.unit = SM_UNIT_PH;
    e->u.result.state = SM_RESULT_HELD;
    strcpy(e->u.result.name, "lime water");
    strcpy(e->u.result.shown, "> 10.07");
    strcpy(e->u.result.why, "above the standards; dilute");
    e->u.result.n_remarks = 2;
    strcpy(e->u.result.remark[0], "late");
    strcpy(e->u.result.remark[1], "warm");
    sm_entry_event(&log_t, e);
    add(t, false);
    assert_int_equal(sm_export_end(t), 1);
    sm_export_destroy(t);
    assert_string_equal(csv, HEAD "10,,,lime water,,,pH,,> 10.07 pH,held,,,,"
                                  "\"above the standards; dilute\",\"late; warm\",9,\r\n");
}

static void a_curve_has_a_row_per_point_and_r_squared_comes_last(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_CURVE, 0);
    struct sm_event *e;
    struct sm_event_curve *c;

    (void)state;
    n = 10;
    log_begin();
    e = event(SM_EVENT_CURVE);
    c = &e->u.curve;
    c->run = 1;
    c->accepted = c->fitted = true;
    strcpy(c->sensor, "s");
    strcpy(c->method, "m");
    c->unit_x = SM_UNIT_MG_L;
    c->unit_y = SM_UNIT_A;
    c->curve = (struct sm_curve){ .model = SM_MODEL_PROPORTIONAL,
                                  .n = 5,
                                  .dof = 4,
                                  .n_coefficients = 1,
                                  .residual_sd = 0.5,
                                  .r_squared = 0.25 };
    c->curve.coefficient[0] = (struct sm_coefficient){ "slope", 2, 0.125 };
    c->n_points = 1;
    c->point[0].capture = 5;
    c->point[0].item = 1;
    strcpy(c->point[0].name, "S1");
    c->point[0].x = 1;
    c->point[0].y = 2.5;
    c->point[0].residual = 0.5;
    c->point[0].back_calculated = 1.25;
    sm_entry_event(&log_t, e);
    add(t, false);
    assert_int_equal(sm_export_end(t), 1);
    sm_export_destroy(t);
    assert_non_null(strstr(csv, ",residual_sd,r_squared\r\n"));
    assert_non_null(strstr(csv,
                           "10,2026-12-01T08:12:13.000000Z,1,yes,s,m,proportional,5,1,S1,1,mg/L,"
                           "2.5,A,,0.5,1.25,,,2,0.125,,,,,0.5,0.25\r\n"));
}

static void an_entry_that_cannot_be_read_is_named_by_its_line(void **state)
{
    struct sm_export *t = begin(SM_EXPORT_RESULTS, 0);
    char why[SM_LINK_TEXT_SIZE] = "";

    (void)state;
    n = 10;
    log_begin();
    add_result(1, "final", 8, 0.1);
    log_t.buf[log_t.len - 2] = 'x'; /* the closing brace of the result */
    assert_int_equal(sm_export_add(t, log_t.buf, log_t.len, false, why), SM_ESYNTAX);
    assert_int_equal(strncmp(why, "line 2: not an entry", 20), 0);
    sm_export_destroy(t);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_result_has_the_state_that_later_entries_gave_it),
        cmocka_unit_test(only_the_run_asked_for_is_shown),
        cmocka_unit_test(names_cannot_become_formulas_or_break_a_row),
        cmocka_unit_test(beyond_the_standards_there_is_no_number),
        cmocka_unit_test(a_curve_has_a_row_per_point_and_r_squared_comes_last),
        cmocka_unit_test(an_entry_that_cannot_be_read_is_named_by_its_line),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
