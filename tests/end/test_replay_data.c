/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The recorded sessions of replay-data/: each NAME/inputs.jsonl (open, files and inputs, unstamped)
 * is run through the core; the events that come out must be those of NAME/events.jsonl (numbers of
 * entries, names and times equal, derived reals within 1e-9: any machine's arithmetic will do), and
 * the facts of NAME/facts.csv must hold. Facts are what the simulator put into the beaker, or
 * figures of JOB.md; no program of ours ever writes them.
 *
 *   test_replay_data                    the test
 *   test_replay_data regenerate         writes every events.jsonl anew; the commit explains the
 * diff test_replay_data record NAME SETUP METER SCENARIO SHEET plays a scenario into a new
 * replay-data/NAME/inputs.jsonl */
#include "log_maker.h"

#include <dirent.h>
#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "base/number.h"
#include "record/head.h"
#include "record/replay.h"
#include "view/rerun.h"

#define UTC_US INT64_C(1796112000000000)
#define FOUND_MAX 400

/* --- what came out --- */

struct found {
    char item[SM_NAME_SIZE], quantity[40];
    bool is_number;
    double number;
    char word[64];
};

struct run {
    struct sm_text line;
    char *events; /* their entries */
    size_t n, cap;
    size_t n_found;
    struct found found[FOUND_MAX];
    struct {
        int64_t n;
        char name[SM_NAME_SIZE];
    } result[200];
    size_t n_results;
};

/* The newest counts: an item measured again, a result released. */
static struct found *find(struct run *r, const char *item, const char *quantity, bool make)
{
    struct found *f;

    for (size_t i = 0; i < r->n_found; i++) {
        f = &r->found[i];
        if (strcmp(f->item, item) == 0 && strcmp(f->quantity, quantity) == 0)
            return f;
    }
    if (!make)
        return NULL;
    assert_true(r->n_found < FOUND_MAX);
    f = &r->found[r->n_found++];
    sm_text_copy(f->item, sizeof f->item, item);
    sm_text_copy(f->quantity, sizeof f->quantity, quantity);
    return f;
}

static void number(struct run *r, const char *item, const char *quantity, double x)
{
    struct found *f = find(r, item, quantity, true);

    f->is_number = true;
    f->number = x;
}

static void word(struct run *r, const char *item, const char *quantity, const char *w)
{
    struct found *f = find(r, item, quantity, true);

    f->is_number = false;
    sm_text_copy(f->word, sizeof f->word, w);
}

static void on_curve(struct run *r, const struct sm_event_curve *c)
{
    word(r, "curve", "verdict", c->accepted ? "accepted" : "refused");
    if (!c->fitted)
        return;
    number(r, "curve", "slope_percent", 100 * c->curve.slope_fraction);
    number(r, "curve", "slope_mV_per_pH", c->curve.coefficient[1].value);
    number(r, "curve", "offset_mV", c->curve.offset_mv);
    number(r, "curve", "residual_sd_mV", c->curve.residual_sd);
    for (size_t i = 0; i < c->n_points; i++)
        number(r, c->point[i].name, "back_calculated_pH", c->point[i].back_calculated);
    for (size_t i = 0; i < c->n_judged; i++)
        word(r, "curve", c->judged[i].quantity, c->judged[i].pass ? "pass" : "fail");
}

static void on_check(struct run *r, const struct sm_event_check *c)
{
    char item[SM_NAME_SIZE + 16];

    snprintf(item, sizeof item, "%.200s%s", c->where.name, c->closing ? " closing" : "");
    word(r, item, "verdict", c->pass ? "pass" : "fail");
    if (c->computed)
        number(r, item, "found_pH", c->found);
}

static void on_result(struct run *r, const struct sm_event_result *e, int64_t n)
{
    assert_true(r->n_results < COUNT(r->result));
    r->result[r->n_results].n = n;
    sm_text_copy(r->result[r->n_results++].name, SM_NAME_SIZE, e->name);
    word(r, e->name, "state", sm_result_state_name(e->state));
    if (e->has_value)
        number(r, e->name, "result_pH", e->value);
    if (e->shown[0] != '\0')
        word(r, e->name, "shown", e->shown);
}

static void on_change(struct run *r, const struct sm_event_change *c, const char *state)
{
    for (size_t i = 0; i < c->n; i++) {
        for (size_t k = 0; k < r->n_results; k++) {
            if (r->result[k].n == c->result[i])
                word(r, r->result[k].name, "state", state);
        }
    }
}

static void on_event(void *arg, const struct sm_event *e, const struct sm_core_setup *setup)
{
    struct run *r = arg;

    (void)setup;
    if (sm_event_class(e->kind) == SM_LIVE)
        return;
    r->line.len = 0;
    sm_entry_event(&r->line, e);
    if (r->cap - r->n < r->line.len) {
        r->cap = 2 * (r->cap + r->line.len);
        r->events = realloc(r->events, r->cap);
        assert_non_null(r->events);
    }
    memcpy(r->events + r->n, r->line.buf, r->line.len);
    r->n += r->line.len;
    switch (e->kind) {
    case SM_EVENT_CAPTURE:
        number(r, e->u.capture.name, "capture_mV", e->u.capture.value);
        break;
    case SM_EVENT_CURVE:
        on_curve(r, &e->u.curve);
        break;
    case SM_EVENT_CHECK:
        on_check(r, &e->u.check);
        break;
    case SM_EVENT_RESULT:
        on_result(r, &e->u.result, e->n);
        break;
    case SM_EVENT_HOLD:
        on_change(r, &e->u.change, "held");
        break;
    case SM_EVENT_RELEASE:
        on_change(r, &e->u.change, "released");
        break;
    default:
        break;
    }
}

static struct run *run_inputs(const char *name)
{
    struct run *r = calloc(1, sizeof *r);
    char path[512], *line = malloc(SM_ENTRY_MAX);
    struct sm_rerun_ask ask = { .event = on_event, .event_arg = r };
    struct sm_rerun_told told;
    char *text;

    assert_true(r != NULL && line != NULL);
    sm_text_init(&r->line, line, SM_ENTRY_MAX);
    snprintf(path, sizeof path, "replay-data/%s/inputs.jsonl", name);
    text = check_read_file(path, &ask.n);
    ask.text = text;
    if (sm_rerun(&ask, &told) != SM_OK)
        fail_msg("%s: %s", path, told.why);
    if (told.passed_over > 0 || told.inputs < 100)
        fail_msg("%s: %zu inputs, %zu entries passed over", path, told.inputs, told.passed_over);
    free(told.last);
    free(text);
    return r;
}

static void run_free(struct run *r)
{
    free(r->line.buf);
    free(r->events);
    free(r);
}

/* --- the test --- */

static void compare_events(const char *name, const struct run *r)
{
    char path[512], why[SM_REASON_SIZE];
    size_t n, line = 0;
    char *want;
    const char *a, *b = r->events, *const b_end = r->events + r->n;

    snprintf(path, sizeof path, "replay-data/%s/events.jsonl", name);
    want = check_read_file(path, &n);
    for (a = want; a < want + n || b < b_end; line++) {
        const char *a_nl = a < want + n ? memchr(a, '\n', (size_t)(want + n - a)) : NULL;
        const char *b_nl = b < b_end ? memchr(b, '\n', (size_t)(b_end - b)) : NULL;

        if (a_nl == NULL || b_nl == NULL)
            fail_msg("%s: %zu lines are alike; then one has more: %.120s", path, line,
                     a_nl != NULL ? a : b);
        if (!sm_replay_agree(SM_COMPARE_TOLERANCE, a, (size_t)(a_nl - a), b, (size_t)(b_nl - b),
                             why))
            fail_msg("%s:%zu: %s", path, line + 1, why);
        a = a_nl + 1;
        b = b_nl + 1;
    }
    print_message("  %s: %zu events as recorded\n", name, line);
    free(want);
}

/* One row: item,quantity,want,tolerance,source. */
static void check_fact(struct run *r, const char *path, unsigned row, char *text)
{
    char *cell[5];
    const struct found *f;
    double want = 0, tolerance = 0;

    for (int i = 0; i < 5; i++) {
        cell[i] = text;
        text = i < 4 ? strchr(text, ',') : NULL;
        if (i < 4 && text == NULL)
            fail_msg("%s:%u: five cells are wanted", path, row);
        if (text != NULL)
            *text++ = '\0';
    }
    if (cell[4][0] == '\0')
        fail_msg("%s:%u: a fact without its source", path, row);
    f = find(r, cell[0], cell[1], false);
    if (f == NULL)
        fail_msg("%s:%u: %s of %s never came out", path, row, cell[1], cell[0]);
    if (cell[3][0] == '\0') {
        if (f->is_number || strcmp(f->word, cell[2]) != 0)
            fail_msg("%s:%u: %s of %s: got %s, want %s", path, row, cell[1], cell[0],
                     f->is_number ? "a number" : f->word, cell[2]);
        return;
    }
    if (!f->is_number || sm_number_parse(cell[2], strlen(cell[2]), &want) != SM_OK ||
        sm_number_parse(cell[3], strlen(cell[3]), &tolerance) != SM_OK)
        fail_msg("%s:%u: no number", path, row);
    if (!(fabs(f->number - want) <= tolerance))
        fail_msg("%s:%u: %s of %s: got %.6g, want %.6g +- %.3g (%s)", path, row, cell[1], cell[0],
                 f->number, want, tolerance, cell[4]);
}

static void check_facts(const char *name, struct run *r)
{
    char path[512], *text, *at, *next;
    unsigned row = 0;

    snprintf(path, sizeof path, "replay-data/%s/facts.csv", name);
    text = check_read_file(path, NULL);
    for (at = text; *at != '\0'; at = next) {
        next = strchr(at, '\n');
        if (next == NULL)
            fail_msg("%s: the last line has no end", path);
        *next++ = '\0';
        if (row++ == 0)
            assert_string_equal(at, "item,quantity,want,tolerance,source");
        else
            check_fact(r, path, row, at);
    }
    print_message("  %s: %u facts hold\n", name, row - 1);
    assert_true(row > 5);
    free(text);
}

static size_t each_session(void (*with)(const char *name))
{
    char path[1024];
    struct dirent *e;
    DIR *d;
    size_t n = 0;

    snprintf(path, sizeof path, "%s/replay-data", SM_SOURCE_DIR);
    d = opendir(path);
    assert_non_null(d);
    while ((e = readdir(d)) != NULL) {
        if (e->d_name[0] == '.' || strlen(e->d_name) > 100)
            continue;
        with(e->d_name);
        n++;
    }
    closedir(d);
    return n;
}

static void test_one(const char *name)
{
    struct run *r = run_inputs(name);

    compare_events(name, r);
    check_facts(name, r);
    run_free(r);
}

static void recorded_sessions_give_the_events_and_facts_they_gave(void **state)
{
    (void)state;
    assert_true(each_session(test_one) >= 3);
}

/* --- making them --- */

static void write_file(const char *name, const char *file, const char *text, size_t n)
{
    char path[1200];
    FILE *f;

    snprintf(path, sizeof path, "%s/replay-data/%s/%s", SM_SOURCE_DIR, name, file);
    f = fopen(path, "wb");
    if (f == NULL || fwrite(text, 1, n, f) != n || fclose(f) != 0)
        fail_msg("%s: %s", path, strerror(errno));
    print_message("  wrote %s\n", path);
}

static void regenerate_one(const char *name)
{
    struct run *r = run_inputs(name);

    write_file(name, "events.jsonl", r->events, r->n);
    run_free(r);
}

static void regenerate(void **state)
{
    (void)state;
    assert_true(each_session(regenerate_one) >= 1);
}

static char **arg; /* of `record`: NAME SETUP METER SCENARIO SHEET */

static void play(struct log_maker *m)
{
    struct sm_scenario sc;
    struct sm_sim *sim;
    struct sm_blame list[1];
    struct sm_blames b;
    size_t n, sheet_n;
    char *text = check_read_file(arg[3], &n), *sheet = check_read_file(arg[4], &sheet_n);
    const char *slash = strrchr(arg[4], '/');

    sm_blames_init(&b, list, 1);
    sm_scenario_init(&sc);
    if (sm_scenario_read(&sc, arg[3], text, n, &b) != SM_OK) {
        char line[1024];

        sm_blame_write(&b.list[0], line, sizeof line);
        fail_msg("%s", line);
    }
    assert_int_equal(sm_sim_create(&sc, &sim), SM_OK);
    log_maker_prepare(m, arg[1], arg[2], UTC_US);
    m->unstamped = true;
    log_maker_open(m);
    log_maker_act(m, SM_ACT_ANALYST, m->setup->people[0].who);
    log_maker_sheet(m, slash == NULL ? arg[4] : slash + 1, sheet, sheet_n);
    log_maker_play(m, sim, SM_NEVER);
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
    free(text);
    free(sheet);
}

/* Only what went in. */
static void record(void **state)
{
    static const char *const kinds[] = { "open", "file",  "bytes", "act", "tick",
                                         "link", "clock", "sent",  "roll" };
    struct log_maker m;
    char path[1200], *out;
    size_t n = 0;

    (void)state;
    play(&m);
    out = malloc(m.file[0].n);
    assert_non_null(out);
    for (const char *at = m.file[0].text, *end = at + m.file[0].n, *nl; at < end; at = nl + 1) {
        struct sm_head h;

        nl = memchr(at, '\n', (size_t)(end - at));
        assert_true(nl != NULL && sm_head_read(at, (size_t)(nl - at), &h));
        for (size_t i = 0; i < COUNT(kinds); i++) {
            if (!sm_head_is(&h, kinds[i]))
                continue;
            memcpy(out + n, at, (size_t)(nl - at) + 1);
            n += (size_t)(nl - at) + 1;
        }
    }
    snprintf(path, sizeof path, "%s/replay-data/%s", SM_SOURCE_DIR, arg[0]);
    if (mkdir(path, 0777) != 0)
        fail_msg("%s: %s: a recorded session is never replaced", path, strerror(errno));
    write_file(arg[0], "inputs.jsonl", out, n);
    free(out);
    log_maker_end(&m);
    log_maker_finish(&m);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(recorded_sessions_give_the_events_and_facts_they_gave),
    };
    const struct CMUnitTest regenerating[] = { cmocka_unit_test(regenerate) };
    const struct CMUnitTest recording[] = { cmocka_unit_test(record) };

    if (argc == 2 && strcmp(argv[1], "regenerate") == 0)
        return cmocka_run_group_tests(regenerating, NULL, NULL);
    if (argc == 7 && strcmp(argv[1], "record") == 0) {
        arg = argv + 2;
        return cmocka_run_group_tests(recording, NULL, NULL);
    }
    return cmocka_run_group_tests(tests, NULL, NULL);
}
