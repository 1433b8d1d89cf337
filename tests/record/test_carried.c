/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_carried.c: what is carried, to the log and back. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>

#include "made_up.h"
#include "record/entry.h"

static char storage[SM_ENTRY_MAX];

static size_t write_out(const struct sm_carried *c)
{
    struct sm_text t;

    sm_text_init(&t, storage, sizeof storage);
    sm_carried_write(&t, c);
    assert_false(t.cut);
    return t.len;
}

static struct sm_carried *read_back(const char *text, size_t n, unsigned *ret_passed_over,
                                    char why[SM_REASON_SIZE])
{
    struct sm_carried *c = calloc(1, sizeof *c);
    json_t *o = json_loadb(text, n, JSON_REJECT_DUPLICATES | JSON_ALLOW_NUL, NULL);
    enum sm_status st;

    assert_non_null(c);
    if (o == NULL)
        fail_msg("not JSON: %.200s", text);
    st = sm_carried_read(o, c, ret_passed_over, why);
    json_decref(o);
    if (st == SM_OK)
        return c;
    free(c);
    return NULL;
}

/* An unknown real (NaN) now and then. */
static double maybe_unknown(struct made_up *m)
{
    return made_up_below(m, 4) == 0 ? NAN : made_up_real(m);
}

static void make_run(struct made_up *m, struct sm_carried *c)
{
    struct sm_carried_run *r = &c->run;

    c->runs = made_up_int(m);
    c->captures = made_up_int(m);
    if (!(r->has = made_up_chance(m)))
        return;
    r->number = made_up_int(m);
    made_up_text(m, r->sheet, sizeof r->sheet, true);
    r->n_items = made_up_below(m, SM_ITEMS_MAX + 1);
    r->next = made_up_below(m, (unsigned)r->n_items + 1);
    r->open = r->next < r->n_items && made_up_chance(m);
    r->left = r->next < r->n_items && made_up_chance(m);
    for (size_t i = 0; i < r->n_items; i++) {
        r->item[i].captures = made_up_below(m, 3);
        r->item[i].capture = made_up_chance(m) ? made_up_int(m) : 0;
        r->item[i].skipped = made_up_chance(m);
    }
}

static void make_curve(struct made_up *m, struct sm_carried_curve *c)
{
    if (!(c->has = made_up_chance(m)))
        return;
    c->n = made_up_int(m);
    c->accepted = made_up_chance(m);
    c->ended = made_up_chance(m);
    made_up_text(m, c->why_ended, sizeof c->why_ended, false);
    made_up_text(m, c->sensor, sizeof c->sensor, true);
    made_up_text(m, c->method, sizeof c->method, true);
    c->age_ns = made_up_int(m);
    c->n_points = made_up_below(m, SM_POINTS_MAX + 1);
    for (size_t i = 0; i < c->n_points; i++) {
        struct sm_carried_point *p = &c->point[i];

        p->capture = made_up_int(m);
        p->item = made_up_below(m, SM_ITEMS_MAX + 1);
        made_up_text(m, p->name, sizeof p->name, true);
        p->x = made_up_real(m);
        p->y = made_up_real(m);
        p->u95_y = maybe_unknown(m);
        p->t_c = maybe_unknown(m);
    }
}

static void make_lists(struct made_up *m, struct sm_carried *c)
{
    c->n_results = made_up_below(m, 20);
    for (size_t i = 0; i < c->n_results; i++) {
        c->result[i].n = made_up_int(m);
        c->result[i].run = made_up_int(m);
        c->result[i].item = made_up_below(m, SM_ITEMS_MAX + 1);
        c->result[i].state = made_up_chance(m) ? SM_RESULT_HELD : SM_RESULT_PROVISIONAL;
        made_up_text(m, c->result[i].why, sizeof c->result[i].why, false);
    }
    c->n_questions = made_up_below(m, SM_QUESTIONS_MAX + 1);
    for (size_t i = 0; i < c->n_questions; i++) {
        c->question[i].n = made_up_int(m);
        c->question[i].capture = made_up_int(m);
    }
    c->n_acts = made_up_below(m, SM_ACT_IDS_MAX + 1);
    for (size_t i = 0; i < c->n_acts; i++)
        made_up_id(m, c->act[i], sizeof c->act[i]);
}

static void make_rest(struct made_up *m, struct sm_carried *c)
{
    if ((c->checks.has = made_up_chance(m))) {
        c->checks.since = made_up_below(m, 50);
        c->checks.last_good = made_up_int(m);
        c->checks.last = made_up_int(m);
    }
    made_up_text(m, c->on_duty, sizeof c->on_duty, true);
    if ((c->last.has = made_up_chance(m))) {
        c->last.capture = made_up_int(m);
        c->last.item = made_up_below(m, SM_ITEMS_MAX + 1);
        made_up_text(m, c->last.name, sizeof c->last.name, true);
        c->last.value = made_up_real(m);
        c->last.u95 = maybe_unknown(m);
        c->last.place = (enum sm_place)made_up_below(m, 3);
    }
    if ((c->rest.has = made_up_chance(m)))
        c->rest.age_ns = made_up_int(m);
    if ((c->temperature.has = made_up_chance(m))) {
        c->temperature.value_c = made_up_real(m);
        made_up_text(m, c->temperature.who, sizeof c->temperature.who, true);
        c->temperature.age_ns = made_up_int(m);
    }
    if (made_up_chance(m)) {
        c->channel.noise = fabs(made_up_real(m));
        c->channel.long_noise = fabs(made_up_real(m));
        c->channel.step = fabs(made_up_real(m));
        for (size_t i = 0; i < SM_CLASS_COUNT; i++)
            c->channel.usual_wait_s[i] = fabs(made_up_real(m));
        c->channel.captures = made_up_below(m, 1000);
    }
    made_up_text(m, c->sensor, sizeof c->sensor, true);
    made_up_text(m, c->meter.identity, sizeof c->meter.identity, false);
    made_up_text(m, c->meter.settings, sizeof c->meter.settings, false);
    made_up_text(m, c->meter.adapter, sizeof c->meter.adapter, false);
}

static void anything_carried_comes_back_bit_by_bit(void **state)
{
    struct sm_carried *c = calloc(1, sizeof *c);

    (void)state;
    assert_non_null(c);
    for (uint64_t seed = 1; seed <= 300; seed++) {
        struct made_up m = { seed };
        char why[SM_REASON_SIZE] = "";
        unsigned passed_over = 0;
        struct sm_carried *back;

        sm_carried_init(c);
        make_run(&m, c);
        make_curve(&m, &c->curve);
        make_lists(&m, c);
        make_rest(&m, c);
        back = read_back(storage, write_out(c), &passed_over, why);
        if (back == NULL)
            fail_msg("seed %llu: refused: %s", (unsigned long long)seed, why);
        if (passed_over != 0 || memcmp(c, back, sizeof *c) != 0)
            fail_msg("seed %llu: comes back differently, %u passed over", (unsigned long long)seed,
                     passed_over);
        free(back);
    }
    free(c);
}

static void what_is_empty_is_left_out(void **state)
{
    struct sm_carried *c = calloc(1, sizeof *c);

    (void)state;
    assert_non_null(c);
    sm_carried_init(c);
    write_out(c);
    assert_string_equal(storage, "{}");
    c->last.has = true;
    c->last.capture = 61878;
    c->last.value = -58.31;
    c->last.u95 = NAN;
    strcpy(c->sensor, "el-14");
    write_out(c);
    assert_string_equal(storage, "{\"last\":{\"capture\":61878,\"value\":-58.31,"
                                 "\"place\":\"unknown\"},\"sensor\":\"el-14\"}");
    free(c);
}

/* All lists full, names and sentences as long as they may be, of one byte a character. */
static void fill(struct sm_carried *c)
{
    const double x = -1.2345678901234567e-100;

    memset(c->run.sheet, 's', SM_NAME_SIZE - 1);
    c->run.has = true;
    c->run.number = INT64_MAX;
    c->run.n_items = SM_ITEMS_MAX;
    for (size_t i = 0; i < SM_ITEMS_MAX; i++)
        c->run.item[i] = (struct sm_carried_item){ 4000000000u, INT64_MAX, true };
    c->curve.has = true;
    c->curve.n_points = SM_POINTS_MAX;
    for (size_t i = 0; i < SM_POINTS_MAX; i++) {
        c->curve.point[i] = (struct sm_carried_point){ INT64_MAX, 400, "", x, x, x, x };
        memset(c->curve.point[i].name, 'n', 4 * SM_NAME_CHARS);
    }
    c->n_results = SM_RESULTS_MAX;
    for (size_t i = 0; i < SM_RESULTS_MAX; i++) {
        c->result[i] = (struct sm_carried_result){ INT64_MAX, INT64_MAX, 400, SM_RESULT_HELD, "" };
        memset(c->result[i].why, 'w', SM_REASON_SIZE - 1);
    }
    c->n_questions = SM_QUESTIONS_MAX;
    c->n_acts = SM_ACT_IDS_MAX;
    for (size_t i = 0; i < SM_ACT_IDS_MAX; i++)
        memset(c->act[i], 'a', 64);
}

static void the_fullest_carried_is_within_half_a_mebibyte(void **state)
{
    struct sm_carried *c = calloc(1, sizeof *c), *back;
    char why[SM_REASON_SIZE] = "";
    unsigned passed_over = 0;
    size_t n;
    char *text;

    (void)state;
    assert_non_null(c);
    fill(c);
    n = write_out(c);
    if (n > SM_CARRIED_MAX)
        fail_msg("%zu bytes, at most %u", n, SM_CARRIED_MAX);
    text = strdup(storage);
    assert_non_null(text);
    back = read_back(storage, n, &passed_over, why);
    if (back == NULL)
        fail_msg("refused: %s", why);
    assert_int_equal(write_out(back), n); /* what lies between the fields need not be the same */
    assert_string_equal(storage, text);
    free(text);
    free(back);
    free(c);
}

static void an_entry_carries_the_same_as_an_object(void **state)
{
    struct sm_carried *c = calloc(1, sizeof *c), *back;
    struct sm_event e = { .kind = SM_EVENT_CARRIED, .n = 7, .t_ns = 8, .u.carried = c };
    struct sm_text t;
    char why[SM_REASON_SIZE] = "";
    unsigned passed_over = 0;

    (void)state;
    assert_non_null(c);
    c->temperature.has = true;
    c->temperature.value_c = 21.5;
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_event(&t, &e);
    assert_string_equal(storage, "{\"n\":7,\"t\":8,\"utc\":\"1970-01-01T00:00:00.000000Z\","
                                 "\"k\":\"carried\",\"temperature\":{\"value\":21.5,\"age\":0}}\n");
    back = read_back(storage, t.len, &passed_over, why);
    assert_non_null(back);
    assert_int_equal(passed_over, 0);
    assert_memory_equal(c, back, sizeof *c);
    free(back);
    free(c);
}

static void unknown_sections_and_keys_are_passed_over_and_counted(void **state)
{
    static const char text[] =
        "{\"cups\":[],\"weather\":{\"rain\":1},\"rest\":{\"age\":5,\"x\":1}}";
    char why[SM_REASON_SIZE] = "";
    unsigned passed_over = 0;
    struct sm_carried *c = read_back(text, strlen(text), &passed_over, why);

    (void)state;
    assert_non_null(c);
    assert_int_equal(passed_over, 3);
    assert_true(c->rest.has);
    assert_int_equal(c->rest.age_ns, 5);
    free(c);
}

static void carried_out_of_bounds_is_refused_with_a_reason(void **state)
{
    static const char *const texts[] = {
        "{\"run\":7}",
        "{\"run\":{\"number\":-1}}",
        "{\"run\":{\"number\":1,\"next\":1}}",
        "{\"run\":{\"number\":1,\"items\":[{}],\"next\":2}}",
        "{\"run\":{\"number\":1,\"items\":[{}],\"next\":1,\"open\":true}}",
        "{\"run\":{\"number\":1,\"items\":[{}],\"next\":1,\"left\":true}}",
        "{\"run\":{\"number\":1,\"items\":[{}],\"open\":1}}",
        "{\"run\":{\"number\":1,\"items\":[7]}}",
        "{\"run\":{\"number\":1,\"items\":[{\"captures\":-1}]}}",
        "{\"run\":{\"number\":1,\"items\":[{\"captures\":4294967296}]}}",
        "{\"run\":{\"items\":[{}]}}",
        "{\"run\":{\"number\":1,\"sheet\":\"a\\u202eb\"}}",
        "{\"curve\":{\"points\":{}}}",
        "{\"curve\":{\"points\":[{\"x\":1}]}}",
        "{\"curve\":{\"points\":[{\"x\":1,\"y\":\"2\"}]}}",
        "{\"curve\":{\"points\":[{\"x\":1,\"y\":2,\"item\":401}]}}",
        "{\"curve\":{\"points\":[{\"x\":1,\"y\":2,\"name\":\"a\\u0007\"}]}}",
        "{\"curve\":{\"points\":[{\"x\":1,\"y\":2,\"name\":\"a\\u0000\"}]}}",
        "{\"curve\":{\"age\":-5}}",
        "{\"results\":7}",
        "{\"results\":[{\"n\":1,\"state\":\"released\"}]}",
        "{\"results\":[{\"n\":1}]}",
        "{\"results\":[{\"n\":1,\"state\":\"held\",\"item\":401}]}",
        "{\"checks\":{\"since\":-1}}",
        "{\"questions\":[[]]}",
        "{\"people\":{\"on_duty\":7}}",
        "{\"last\":{\"capture\":1,\"place\":\"left\"}}",
        "{\"last\":{\"capture\":1,\"value\":1,\"place\":\"abroad\"}}",
        "{\"rest\":[]}",
        "{\"temperature\":{\"age\":1}}",
        "{\"acts\":[\"\"]}",
        "{\"acts\":[7]}",
        "{\"acts\":[\"a\\u0000b\"]}",
        "{\"acts\":[\"aaaaaaaaaabbbbbbbbbbaaaaaaaaaabbbbbbbbbbaaaaaaaaaabbbbbbbbbbccccc\"]}",
        "{\"channel\":{\"noise\":-1}}",
        "{\"channel\":{\"usual_wait\":3}}",
        "{\"sensor\":\"\\u0085\"}",
        "{\"meter\":{\"identity\":false}}",
    };

    (void)state;
    for (size_t i = 0; i < COUNT(texts); i++) {
        char why[SM_REASON_SIZE] = "";
        unsigned passed_over = 0;

        if (read_back(texts[i], strlen(texts[i]), &passed_over, why) != NULL)
            fail_msg("%s: was taken", texts[i]);
        if (why[0] == '\0')
            fail_msg("%s: refused without a reason", texts[i]);
    }
}

static void lists_longer_than_their_storage_are_refused(void **state)
{
    static const struct {
        const char *head, *element, *tail;
        size_t most;
    } cases[] = {
        { "{\"run\":{\"number\":1,\"items\":[", "{}", "]}}", SM_ITEMS_MAX },
        { "{\"curve\":{\"points\":[", "{\"x\":1,\"y\":1}", "]}}", SM_POINTS_MAX },
        { "{\"results\":[", "{\"state\":\"held\"}", "]}", SM_RESULTS_MAX },
        { "{\"questions\":[", "{}", "]}", SM_QUESTIONS_MAX },
        { "{\"acts\":[", "\"a\"", "]}", SM_ACT_IDS_MAX },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        for (size_t over = 0; over < 2; over++) {
            struct sm_text t;
            struct sm_carried *c;
            char why[SM_REASON_SIZE] = "";
            unsigned passed_over = 0;

            sm_text_init(&t, storage, sizeof storage);
            sm_text_add(&t, cases[i].head);
            for (size_t k = 0; k < cases[i].most + over; k++)
                sm_text_addf(&t, "%s%s", k > 0 ? "," : "", cases[i].element);
            sm_text_add(&t, cases[i].tail);
            c = read_back(storage, t.len, &passed_over, why);
            if ((c == NULL) != (over == 1))
                fail_msg("%s: %zu elements: %s", cases[i].head, cases[i].most + over,
                         over == 1 ? "was taken" : why);
            free(c);
        }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(anything_carried_comes_back_bit_by_bit),
        cmocka_unit_test(what_is_empty_is_left_out),
        cmocka_unit_test(the_fullest_carried_is_within_half_a_mebibyte),
        cmocka_unit_test(an_entry_carries_the_same_as_an_object),
        cmocka_unit_test(unknown_sections_and_keys_are_passed_over_and_counted),
        cmocka_unit_test(carried_out_of_bounds_is_refused_with_a_reason),
        cmocka_unit_test(lists_longer_than_their_storage_are_refused),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
