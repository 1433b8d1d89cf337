/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_event.c: events as lines of the log, as the samples show them. */
#include "check.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "record/entry.h"

static char storage[SM_ENTRY_MAX];

#define HEAD "{\"n\":61878,\"t\":1746731204511,\"utc\":\"2026-12-01T08:41:09.731205Z\",\"k\":"

static struct sm_event *event(enum sm_event_kind kind)
{
    static struct sm_event e;

    memset(&e, 0, sizeof e);
    e.kind = kind;
    e.n = 61878;
    e.t_ns = 1746731204511;
    e.utc_us = 1796114469731205;
    return &e;
}

static struct sm_whereabouts item_12(void)
{
    struct sm_whereabouts w = { .has = true, .run = 31, .item = 12, .kind = SM_ITEM_SAMPLE };

    strcpy(w.name, "final");
    return w;
}

/* want is without the newline; it must be JSON too. */
static void expect_line(const struct sm_event *e, const char *want)
{
    struct sm_text t;
    json_t *o;

    sm_text_init(&t, storage, sizeof storage);
    sm_entry_event(&t, e);
    assert_false(t.cut);
    assert_int_equal(t.buf[t.len - 1], '\n');
    t.buf[t.len - 1] = '\0';
    assert_string_equal(t.buf, want);
    o = json_loads(t.buf, JSON_REJECT_DUPLICATES | JSON_ALLOW_NUL, NULL);
    assert_non_null(o);
    json_decref(o);
}

static void a_capture_says_value_uncertainty_and_window(void **state)
{
    struct sm_event *e = event(SM_EVENT_CAPTURE);
    struct sm_event_capture *c = &e->u.capture;

    (void)state;
    c->moved = 61402;
    c->where = item_12();
    c->number = 17;
    strcpy(c->name, "final");
    c->value = -58.31;
    c->unit = SM_UNIT_MV;
    c->s = (struct sm_settled){ .value = -58.31,
                                .u95 = 1.1,
                                .from_t_ns = 1683000000000,
                                .to_t_ns = 1746731204511,
                                .readings = 63,
                                .sd = 0.05,
                                .step = 0.1,
                                .since_moved_ns = 63731204511,
                                .rule = SM_RULE_SPREAD,
                                .prescribed = true };
    c->s.part[SM_PART_NOISE] = (struct sm_maybe){ true, 0.0125 };
    c->s.part[SM_PART_STEP] = (struct sm_maybe){ true, 0.06 };
    c->tolerance = 1.2;
    c->n_others = 1;
    strcpy(c->other[0].name, "probe");
    c->other[0].value = 10.8;
    c->other[0].range = (struct sm_maybe){ true, 0.1 };
    strcpy(c->who, "bench-a");
    expect_line(e, HEAD
                "\"capture\",\"moved\":61402,\"run\":31,\"item\":12,\"name\":\"final\","
                "\"kind\":\"sample\",\"number\":17,\"value\":-58.31,\"unit\":\"mV\","
                "\"expanded_uncertainty\":1.1,\"parts\":{\"noise\":0.0125,\"step\":0.06},"
                "\"window\":[1683000000000,1746731204511],\"readings\":63,\"lifts\":0,\"sd\":0.05,"
                "\"step\":0.1,\"rule\":\"spread\",\"prescribed\":true,\"tolerance\":1.2,"
                "\"since_moved\":63731204511,\"with\":{\"probe\":10.8},\"with_range\":"
                "{\"probe\":0.1},\"who\":\"bench-a\",\"remarks\":[]}");
}

static void a_result_has_no_number_where_none_is_known(void **state)
{
    struct sm_event *e = event(SM_EVENT_RESULT);
    struct sm_event_result *r = &e->u.result;

    (void)state;
    r->capture = 61878;
    r->where = item_12();
    strcpy(r->where.name, "duplicate of final");
    strcpy(r->name, "final");
    r->has_value = r->has_u95 = true;
    r->value = 8.12;
    r->u95 = 0.1;
    r->unit = SM_UNIT_PH;
    r->has_temperature = true;
    r->temperature_c = 10.8;
    strcpy(r->temperature_how, "measured");
    strcpy(r->why, "waits for a check");
    r->n_remarks = 1;
    strcpy(r->remark[0], "late");
    expect_line(e, HEAD "\"result\",\"capture\":61878,\"run\":31,\"item\":12,\"name\":\"final\","
                        "\"kind\":\"sample\",\"title\":\"duplicate of final\",\"value\":8.12,"
                        "\"unit\":\"pH\",\"expanded_uncertainty\":0.1,\"temperature\":10.8,"
                        "\"temperature_how\":\"measured\",\"state\":\"provisional\","
                        "\"why\":\"waits for a check\",\"remarks\":[\"late\"]}");
    r->has_value = r->has_u95 = r->has_temperature = false;
    r->temperature_how[0] = '\0';
    strcpy(r->shown, "> 10.07");
    r->state = SM_RESULT_HELD;
    r->n_remarks = 0;
    r->curve = 61000;
    expect_line(e, HEAD "\"result\",\"capture\":61878,\"curve\":61000,\"run\":31,\"item\":12,"
                        "\"name\":\"final\",\"kind\":\"sample\",\"title\":\"duplicate of final\","
                        "\"unit\":\"pH\",\"shown\":\"> 10.07\",\"state\":\"held\","
                        "\"why\":\"waits for a check\",\"remarks\":[]}");
}

static void small_events_have_the_keys_of_the_samples(void **state)
{
    struct sm_event *e = event(SM_EVENT_MOVED);

    (void)state;
    e->u.moved.by = SM_MOVED_MARK;
    e->u.moved.of = 61882;
    e->u.moved.began_t_ns = 1751020118044;
    e->u.moved.where = item_12();
    expect_line(e, HEAD "\"moved\",\"by\":\"mark\",\"of\":61882,\"run\":31,\"item\":12,"
                        "\"name\":\"final\",\"kind\":\"sample\",\"began\":1751020118044}");
    e = event(SM_EVENT_ANSWER);
    e->u.answer.act = 61882;
    strcpy(e->u.answer.id, "7f2c-19");
    e->u.answer.done = true;
    expect_line(e, HEAD "\"answer\",\"act\":61882,\"id\":\"7f2c-19\",\"done\":true}");
    e = event(SM_EVENT_ASK);
    strcpy(e->u.ask.text, "R\r");
    e->u.ask.n = 2;
    expect_line(e, HEAD "\"ask\",\"b\":\"R\\u000d\"}");
    e = event(SM_EVENT_OPEN_CIRCUIT);
    expect_line(e, HEAD "\"open-circuit\"}");
    e = event(SM_EVENT_SILENT);
    e->u.silent.last_line_t_ns = SM_NEVER;
    expect_line(e, HEAD "\"silent\"}");
    e->u.silent.last_line_t_ns = 5;
    expect_line(e, HEAD "\"silent\",\"last_line\":5}");
    e = event(SM_EVENT_TRANSIT);
    e->u.transit.from_t_ns = 1;
    e->u.transit.to_t_ns = 2;
    e->u.transit.how = SM_TRANSIT_OPEN;
    expect_line(e, HEAD "\"transit\",\"from\":1,\"to\":2,\"how\":\"open circuit\","
                        "\"returned\":false}");
    e = event(SM_EVENT_NOT_SETTLED);
    e->u.not_settled.moved = 61402;
    strcpy(e->u.not_settled.why, "longest wait");
    expect_line(e, HEAD "\"not-settled\",\"moved\":61402,\"why\":\"longest wait\"}");
    e = event(SM_EVENT_QUESTION);
    e->u.question.capture = 7;
    strcpy(e->u.question.asks, "beaker");
    strcpy(e->u.question.text, "Reads like B4.");
    expect_line(e, HEAD "\"question\",\"capture\":7,\"asks\":\"beaker\","
                        "\"text\":\"Reads like B4.\"}");
}

static void unread_lines_keep_their_bytes_and_a_flood_is_a_count(void **state)
{
    struct sm_event *e = event(SM_EVENT_UNREAD);

    (void)state;
    e->u.unread.kind = SM_LINE_OVERLONG;
    memcpy(e->u.unread.line, "\x80\"x", 3);
    e->u.unread.n = 3;
    e->u.unread.length = 5000;
    strcpy(e->u.unread.why, "too long");
    expect_line(e, HEAD "\"unread\",\"line\":\"overlong\",\"b\":\"\\u0080\\\"x\",\"length\":5000,"
                        "\"why\":\"too long\"}");
    e->u.unread.counted = true;
    e->u.unread.count = 1234;
    expect_line(e, HEAD "\"unread\",\"count\":1234}");
}

static void a_check_without_a_curve_has_nothing_found(void **state)
{
    struct sm_event *e = event(SM_EVENT_CHECK);
    struct sm_event_check *c = &e->u.check;

    (void)state;
    c->capture = 7;
    c->want = 7.02;
    c->within = 0.1;
    c->unit = SM_UNIT_PH;
    c->closing = true;
    expect_line(e, HEAD "\"check\",\"capture\":7,\"want\":7.02,\"within\":0.1,\"unit\":\"pH\","
                        "\"closing\":true,\"pass\":false}");
    c->computed = c->pass = true;
    c->found = 7;
    c->difference = -0.02;
    expect_line(e, HEAD "\"check\",\"capture\":7,\"want\":7.02,\"found\":7,\"difference\":-0.02,"
                        "\"within\":0.1,\"unit\":\"pH\",\"closing\":true,\"pass\":true}");
}

static void holds_and_releases_list_their_results(void **state)
{
    struct sm_event *e = event(SM_EVENT_HOLD);

    (void)state;
    e->u.change.check = 90;
    strcpy(e->u.change.why, "check failed");
    e->u.change.n = 2;
    e->u.change.result[0] = 5;
    e->u.change.result[1] = 8;
    expect_line(e, HEAD "\"hold\",\"check\":90,\"why\":\"check failed\",\"results\":[5,8]}");
}

static void fill_curve(struct sm_event_curve *c)
{
    c->run = 31;
    c->accepted = c->fitted = true;
    strcpy(c->sensor, "el-14");
    strcpy(c->method, "ph-surface");
    c->unit_x = SM_UNIT_PH;
    c->unit_y = SM_UNIT_MV;
    c->curve = (struct sm_curve){ .model = SM_MODEL_LINE,
                                  .n = 5,
                                  .dof = 3,
                                  .n_coefficients = 2,
                                  .levels = 5,
                                  .residual_sd = 0.5,
                                  .r_squared = NAN,
                                  .x_from = 1,
                                  .x_to = 2,
                                  .x_mean = 1.5,
                                  .sxx = 4 };
    c->curve.coefficient[0] = (struct sm_coefficient){ "intercept", 400.25, 0.5 };
    c->curve.coefficient[1] = (struct sm_coefficient){ "slope", -58, 0.25 };
    c->curve.covariance[0][0] = 0.25;
    c->n_points = 1;
    c->point[0].capture = 70;
    c->point[0].item = 1;
    strcpy(c->point[0].name, "B4");
    c->point[0].x = 4.01;
    c->point[0].y = 170;
    c->point[0].residual = 0.125;
    c->point[0].back_calculated = NAN;
    c->n_judged = 1;
    strcpy(c->judged[0].quantity, "levels");
    c->judged[0].value = 5;
    c->judged[0].from = 5;
    c->judged[0].has_from = c->judged[0].pass = true;
}

static void a_curve_says_fit_points_and_verdicts(void **state)
{
    struct sm_event *e = event(SM_EVENT_CURVE);

    (void)state;
    fill_curve(&e->u.curve);
    expect_line(e, HEAD
                "\"curve\",\"run\":31,\"accepted\":true,\"sensor\":\"el-14\",\"method\":"
                "\"ph-surface\",\"unit_x\":\"pH\",\"unit_y\":\"mV\",\"fit\":{\"model\":\"line\","
                "\"n\":5,\"dof\":3,\"levels\":5,\"coefficients\":[{\"name\":\"intercept\","
                "\"value\":400.25,\"standard_error\":0.5},{\"name\":\"slope\",\"value\":-58,"
                "\"standard_error\":0.25}],\"covariance\":[[0.25,0],[0,0]],\"residual_sd\":0.5,"
                "\"from\":1,\"to\":2,\"x_mean\":1.5,\"sxx\":4},\"points\":[{\"capture\":70,"
                "\"item\":1,\"name\":\"B4\",\"x\":4.01,\"y\":170,\"residual\":0.125}],\"judged\":"
                "[{\"quantity\":\"levels\",\"value\":5,\"from\":5,\"pass\":true}]}");
}

static void the_fullest_curve_and_hold_fit_on_a_line(void **state)
{
    struct sm_event *e = event(SM_EVENT_CURVE);
    struct sm_event_curve *c = &e->u.curve;
    struct sm_text t;

    (void)state;
    fill_curve(c);
    c->n_points = SM_POINTS_MAX;
    for (size_t i = 0; i < SM_POINTS_MAX; i++) {
        memset(c->point[i].name, 'n', SM_NAME_SIZE - 1);
        c->point[i].x = c->point[i].y = c->point[i].t_c = -1.2345678901234567e-100;
        c->point[i].has_t = true;
    }
    c->n_judged = SM_JUDGED_MAX;
    for (size_t i = 0; i < SM_JUDGED_MAX; i++)
        memset(c->judged[i].text, '\x01', SM_REASON_SIZE - 1);
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_event(&t, e);
    assert_false(t.cut);
    e = event(SM_EVENT_HOLD);
    e->u.change.n = SM_RESULTS_MAX;
    for (size_t i = 0; i < SM_RESULTS_MAX; i++)
        e->u.change.result[i] = INT64_MAX;
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_event(&t, e);
    assert_false(t.cut);
}

static void live_events_have_no_number(void **state)
{
    struct sm_event *e = event(SM_EVENT_READING);

    (void)state;
    e->n = 0;
    e->u.reading.n = 3;
    e->u.reading.channel[0] =
        (struct sm_value){ .present = true, .value = -12.4, .step = 0.1, .digits = "-0012.4" };
    e->u.reading.channel[2] =
        (struct sm_value){ .present = true, .flag = SM_FLAG_OVER, .digits = "OVR" };
    expect_line(e, "{\"t\":1746731204511,\"utc\":\"2026-12-01T08:41:09.731205Z\",\"k\":\"reading\","
                   "\"values\":[{\"value\":-12.4,\"step\":0.1,\"digits\":\"-0012.4\"},{},"
                   "{\"digits\":\"OVR\",\"flag\":\"over\"}]}");
    e = event(SM_EVENT_SETTLING);
    e->n = 0;
    e->u.settling.latest = 7.5;
    e->u.settling.unit = SM_UNIT_PH;
    e->u.settling.since_moved_ns = 100;
    e->u.settling.wait_s = (struct sm_maybe){ true, 12 };
    expect_line(e, "{\"t\":1746731204511,\"utc\":\"2026-12-01T08:41:09.731205Z\",\"k\":"
                   "\"settling\",\"latest\":7.5,\"unit\":\"pH\",\"since_moved\":100,"
                   "\"wait_s\":12}");
}

static void what_does_not_fit_says_so(void **state)
{
    struct sm_event *e = event(SM_EVENT_OPEN_CIRCUIT);
    char small[40];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, small, sizeof small);
    sm_entry_event(&t, e);
    assert_true(t.cut);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_capture_says_value_uncertainty_and_window),
        cmocka_unit_test(a_result_has_no_number_where_none_is_known),
        cmocka_unit_test(small_events_have_the_keys_of_the_samples),
        cmocka_unit_test(unread_lines_keep_their_bytes_and_a_flood_is_a_count),
        cmocka_unit_test(a_check_without_a_curve_has_nothing_found),
        cmocka_unit_test(holds_and_releases_list_their_results),
        cmocka_unit_test(a_curve_says_fit_points_and_verdicts),
        cmocka_unit_test(the_fullest_curve_and_hold_fit_on_a_line),
        cmocka_unit_test(live_events_have_no_number),
        cmocka_unit_test(what_does_not_fit_says_so),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
