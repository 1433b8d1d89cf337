/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Acts that no door should let through, ids that are remembered, and what the core refuses. */
#include "bench_day.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static struct day day;
static struct sm_input in;

static int begin(void **state)
{
    (void)state;
    day_setup(&day);
    day_usual_sheet(&day);
    day_start(&day, false);
    memset(&in, 0, sizeof in);
    in.kind = SM_INPUT_ACT;
    in.act.act = SM_ACT_NOTE;
    sm_text_copy(in.act.text, sizeof in.act.text, "a note");
    return 0;
}

static int end(void **state)
{
    (void)state;
    day_stop(&day);
    return 0;
}

static bool tell(const char *id)
{
    sm_text_copy(in.act.id, sizeof in.act.id, id);
    day_feed(&day, &in);
    return day_last(&day, SM_EVENT_ANSWER)->good;
}

static void an_act_without_a_good_id_is_refused_and_not_remembered(void **state)
{
    (void)state;
    assert_false(tell(""));
    assert_false(tell("a b"));
    assert_false(tell("\xff\xfe"));
    assert_false(tell("tab\there"));
    assert_int_equal(day.carried.n_acts, 0);
    assert_true(tell("good"));
    assert_int_equal(day.carried.n_acts, 1);
}

static void the_last_64_ids_are_remembered_over_a_change_of_file(void **state)
{
    char id[SM_ID_SIZE];

    (void)state;
    for (int i = 0; i < 65; i++) {
        snprintf(id, sizeof id, "%064d", i);
        assert_true(tell(id));
    }
    assert_int_equal(day.carried.n_acts, SM_ACT_IDS_MAX);
    day_roll(&day);
    snprintf(id, sizeof id, "%064d", 64);
    assert_false(tell(id));
    snprintf(id, sizeof id, "%064d", 1);
    assert_false(tell(id));
    snprintf(id, sizeof id, "%064d", 0); /* the 65th before: forgotten */
    assert_true(tell(id));
}

static void what_the_sender_has_not_seen_counts_over_a_change_of_file(void **state)
{
    (void)state;
    day_in(&day, 100, 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
    day_roll(&day);
    in.act.act = SM_ACT_NEXT;
    in.act.has_seen = true;
    in.act.seen = day_last(&day, SM_EVENT_CAPTURE)->n - 1;
    assert_false(tell("blind"));
    in.act.seen++;
    assert_true(tell("seeing"));
}

static void hostile_names_stay_out_of_what_is_carried(void **state)
{
    (void)state;
    in.act.act = SM_ACT_TEMPERATURE;
    in.act.has_temperature = true;
    in.act.temperature_c = 20;
    sm_text_copy(in.act.who, sizeof in.act.who, "\x1b[2Jme");
    assert_true(tell("t-1"));
    assert_string_equal(day.carried.temperature.who, "");
    in.act.temperature_c = (double)NAN;
    assert_false(tell("t-2"));
    in.act.act = SM_ACT_ANALYST;
    sm_text_copy(in.act.text, sizeof in.act.text, "\x1b[2Jme");
    assert_false(tell("t-3"));
    in.act.act = SM_ACT_SHEET;
    in.act.sheet = &day.sheet;
    sm_text_copy(day.sheet.file, sizeof day.sheet.file, "\n");
    assert_false(tell("t-4"));
}

static void a_sheet_whose_method_does_not_go_with_the_meter_is_refused(void **state)
{
    (void)state;
    in.act.act = SM_ACT_SHEET;
    in.act.sheet = &day.sheet;
    day.sheet.method = 1;
    assert_false(tell("s-1"));
    day.sheet.method = -1;
    assert_false(tell("s-2"));
    day.sheet.method = 0;
    day.method.signal_unit = SM_UNIT_A;
    assert_false(tell("s-3"));
    assert_non_null(strstr(day_last(&day, SM_EVENT_ANSWER)->why, "potential"));
    day.method.signal_unit = SM_UNIT_MV;
    assert_true(tell("s-4"));
}

static void what_is_refused_changes_nothing(void **state)
{
    static const uint16_t bad[] = { 3, 2 };
    struct sm_input bytes = { .kind = SM_INPUT_BYTES };
    const struct sm_event *e;

    (void)state;
    bytes.n = sm_core_last_n(day.core) + 1;
    bytes.t_ns = day.t_ns;
    bytes.chunk.bytes = (const unsigned char *)"+0001.00 20.0\r\n";
    bytes.chunk.n = 15;
    bytes.chunk.bad = bad;
    bytes.chunk.n_bad = 2;
    assert_int_equal(sm_core_feed(day.core, &bytes), SM_EINVAL);
    bytes.chunk.n_bad = 0;
    bytes.n--;
    assert_int_equal(sm_core_feed(day.core, &bytes), SM_EORDER);
    bytes.n++;
    bytes.t_ns = INT64_MAX;
    assert_int_equal(sm_core_feed(day.core, &bytes), SM_EINVAL);
    bytes.t_ns = day.t_ns;
    bytes.n = INT64_MAX;
    assert_int_equal(sm_core_feed(day.core, &bytes), SM_EINVAL);
    bytes.n = sm_core_last_n(day.core) + 1;
    assert_false(sm_core_next(day.core, &e));
    assert_int_equal(sm_core_last_n(day.core), bytes.n - 1);
    day_in(&day, 100, 6);
    assert_int_equal(day_count(&day, SM_EVENT_CAPTURE), 1);
}

int main(void)
{
#define TEST(name) cmocka_unit_test_setup_teardown(name, begin, end)
    const struct CMUnitTest tests[] = {
        TEST(an_act_without_a_good_id_is_refused_and_not_remembered),
        TEST(the_last_64_ids_are_remembered_over_a_change_of_file),
        TEST(what_the_sender_has_not_seen_counts_over_a_change_of_file),
        TEST(hostile_names_stay_out_of_what_is_carried),
        TEST(a_sheet_whose_method_does_not_go_with_the_meter_is_refused),
        TEST(what_is_refused_changes_nothing),
    };
#undef TEST
    return cmocka_run_group_tests(tests, NULL, NULL);
}
