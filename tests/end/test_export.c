/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_export.c: the demonstration's session as a log, verified, recovered and exported as each
 * table. */
#include "daemon/capture_output.h"
#include "daemon/scratch.h"
#include "log_maker.h"
#include "record/recover.h"
#include "sim/sim.h"
#include "stillmark_export.h"
#include "stillmark_verify.h"

static struct scratch scratch;
static char path[160];
static char *log_text;
static size_t log_n;

/* The demonstration's session; roll: the file is changed once 14 of its 15 items are measured, with
 * only the closing check to come. */
static void play(struct log_maker *m, bool roll)
{
    struct sm_scenario sc;
    struct sm_blame blame[8];
    struct sm_blames blames;
    struct sm_sim *sim;
    size_t n;
    char *text = check_read_file("tests/sim/scenarios/try.scn", &n);

    sm_blames_init(&blames, blame, COUNT(blame));
    sm_scenario_init(&sc);
    assert_int_equal(sm_scenario_read(&sc, "try.scn", text, n, &blames), SM_OK);
    free(text);
    assert_int_equal(sm_sim_create(&sc, &sim), SM_OK);
    log_maker_begin(m, "conf/try.yaml", "try", 1796112723000000);
    log_maker_act(m, SM_ACT_ANALYST, "try");
    text = check_read_file("conf/sheets/try.yaml", &n);
    log_maker_sheet(m, "conf/sheets/try.yaml", text, n);
    free(text);
    while (log_maker_step(m, sim, SM_NEVER)) {
        struct sm_core_status now;

        sm_core_status(m->core, &now);
        if (roll && now.measured == 14 && sm_core_may_roll(m->core)) {
            log_maker_roll(m);
            roll = false;
        }
    }
    log_maker_end(m);
    sm_sim_destroy(sim);
    sm_scenario_free(&sc);
}

static int make_log(void **state)
{
    static struct log_maker m;

    (void)state;
    play(&m, false);
    assert_int_equal(m.n_files, 1);
    log_n = m.file[0].n;
    log_text = malloc(log_n + 1);
    assert_non_null(log_text);
    memcpy(log_text, m.file[0].text, log_n);
    log_text[log_n] = '\0';
    log_maker_finish(&m);
    scratch_make(&scratch);
    snprintf(path, sizeof path, "%s/000001_2026-12-01T081203Z.jsonl", scratch.path);
    scratch_write(path, log_text);
    return 0;
}

static int drop_log(void **state)
{
    (void)state;
    free(log_text);
    scratch_remove(&scratch);
    return 0;
}

/* Field `column` (from 0) of line `row` (0: the header); cells of this log hold no quoted commas.
 */
static void cell(const char *csv, size_t row, size_t column, char out[256])
{
    const char *at = csv;
    size_t n;

    out[0] = '\0';
    for (; row > 0 && at != NULL; row--)
        at = (at = strstr(at, "\r\n")) != NULL ? at + 2 : NULL;
    for (; column > 0 && at != NULL; column--)
        at = (at = strpbrk(at, ",\r")) != NULL && *at == ',' ? at + 1 : NULL;
    if (at == NULL)
        return;
    n = strcspn(at, ",\r");
    snprintf(out, 256, "%.*s", (int)n, at);
}

static size_t column_of(const char *csv, const char *name)
{
    char head[256];

    for (size_t i = 0;; i++) {
        cell(csv, 0, i, head);
        if (strcmp(head, name) == 0)
            return i;
        if (head[0] == '\0')
            fail_msg("no column \"%s\" in: %.300s", name, csv);
    }
}

static double number_at(const char *csv, size_t row, const char *name)
{
    char text[256], *end;
    double v;

    cell(csv, row, column_of(csv, name), text);
    v = strtod(text, &end);
    if (text[0] == '\0' || *end != '\0')
        fail_msg("row %zu, %s: \"%s\" is no number", row, name, text);
    return v;
}

static size_t rows(const char *csv)
{
    size_t n = 0;

    for (const char *at = csv; (at = strstr(at, "\r\n")) != NULL; at += 2)
        n++;
    return n > 0 ? n - 1 : 0;
}

static char *export(int want, const char *option, const char *more)
{
    char *argv[] = { path, (char *)(uintptr_t)option, NULL, NULL, NULL }, *out, *err;
    char run[] = "--run";
    int got;

    if (more != NULL) {
        argv[2] = run;
        argv[3] = (char *)(uintptr_t)more;
    }
    got = capture_run(sm_stillmark_export, argv, &out, &err);
    if (got != want)
        fail_msg("export %s: exit %d, want %d: %s", option, got, want, err);
    free(err);
    return out;
}

static void the_log_verifies_and_can_be_begun_from(void **state)
{
    struct sm_recovered *r = malloc(sizeof *r);
    char *argv[] = { path, NULL }, *out, *err;

    (void)state;
    assert_non_null(r);
    assert_int_equal(sm_recover(log_text, log_n, r), SM_OK);
    assert_true(r->closed);
    assert_string_equal(r->sheet_file, "conf/sheets/try.yaml");
    assert_int_equal(r->carried.run.n_items, 15);
    assert_int_equal(r->carried.captures, 15);
    sm_recovered_finish(r);
    free(r);
    assert_int_equal(capture_run(sm_stillmark_verify, argv, &out, &err), 0);
    free(out);
    free(err);
}

/* The samples of tests/sim/scenarios/try.scn, in its order, and the pH that it says they have. */
static void results_are_released_and_are_what_the_scenario_says(void **state)
{
    static const struct {
        const char *name;
        double ph;
    } samples[] = { { "raw", 7.34 },           { "settled", 6.41 },       { "final", 8.12 },
                    { "filtered", 6.52 },      { "network north", 7.72 }, { "tank a", 7.95 },
                    { "network south", 7.69 }, { "tank b", 7.88 } };
    char *csv = export(0, "--results", NULL), text[256];

    (void)state;
    assert_int_equal(rows(csv), COUNT(samples));
    for (size_t i = 0; i < COUNT(samples); i++) {
        const double u95 = number_at(csv, i + 1, "expanded_uncertainty");

        cell(csv, i + 1, column_of(csv, "name"), text);
        assert_string_equal(text, samples[i].name);
        cell(csv, i + 1, column_of(csv, "state"), text);
        assert_string_equal(text, "released");
        check_close(samples[i].name, number_at(csv, i + 1, "value"), samples[i].ph, 0.02);
        assert_true(u95 > 0);
        check_close("temperature",
                    number_at(csv, i + 1,
                              "temperature (\xc2\xb0"
                              "C)"),
                    20, 0.5);
        cell(csv, i + 1, column_of(csv, "captured_utc"), text);
        assert_int_equal(strncmp(text, "2026-12-01T08:1", 15), 0);
        assert_int_equal(number_at(csv, i + 1, "item"), 7 + i);
    }
    free(csv);
}

static void captures_and_curve_have_a_row_each(void **state)
{
    char *csv = export(0, "--captures", NULL), *only, text[256];

    (void)state;
    assert_int_equal(rows(csv), 15);
    for (size_t i = 1; i <= 15; i++) {
        assert_int_equal(number_at(csv, i, "number"), i);
        assert_true(number_at(csv, i, "window_to (s)") > number_at(csv, i, "window_from (s)"));
        cell(csv, i, column_of(csv, "rule"), text);
        assert_string_equal(text, "spread");
        cell(csv, i, column_of(csv, "who"), text);
        assert_string_equal(text, "try");
    }
    only = export(0, "--captures", "1");
    assert_string_equal(only, csv);
    free(only);
    only = export(0, "--captures", "2");
    assert_int_equal(rows(only), 0);
    free(only);
    free(csv);
    csv = export(0, "--curve", NULL);
    assert_int_equal(rows(csv), 5);
    check_close("slope", number_at(csv, 1, "slope_of_theory (%)"), 98.6, 1);
    check_close("offset", number_at(csv, 1, "offset (mV)"), 3.9, 1);
    assert_true(number_at(csv, 5, "r_squared") > 0.999);
    cell(csv, 1, column_of(csv, "accepted"), text);
    assert_string_equal(text, "yes");
    free(csv);
}

static void readings_are_those_that_came_down_the_wire(void **state)
{
    char *csv = export(0, "--readings", NULL), text[256], *only;
    size_t lines = 0;

    (void)state;
    for (const char *at = log_text; (at = strstr(at, "\"k\":\"bytes\"")) != NULL; at++)
        lines++;
    assert_in_range(rows(csv), lines * 95 / 100, lines);
    cell(csv, 0, 5, text);
    assert_string_equal(text, "potential (mV)");
    cell(csv, 1, column_of(csv, "potential_flag"), text);
    assert_string_equal(text, "ok");
    only = export(0, "--readings", "1");
    assert_true(rows(only) > 0 && rows(only) < rows(csv));
    cell(only, 1, column_of(only, "name"), text);
    assert_string_equal(text, "B1");
    free(only);
    free(csv);
}

static void put_file(const char *name, const struct log_maker_file *file)
{
    FILE *f = fopen(name, "wb");

    assert_non_null(f);
    assert_int_equal(fwrite(file->text, 1, file->n, f), file->n);
    assert_int_equal(fclose(f), 0);
}

static void a_later_file_of_the_folder_is_read_for_what_it_released(void **state)
{
    static struct log_maker m;
    struct scratch folder;
    char first[160], second[160], *argv[] = { first, NULL }, *out, *err, text[256];

    (void)state;
    play(&m, true);
    assert_int_equal(m.n_files, 2);
    scratch_make(&folder);
    snprintf(first, sizeof first, "%s/000001_2026-12-01T081203Z.jsonl", folder.path);
    snprintf(second, sizeof second, "%s/000002_2026-12-01T081303Z.jsonl", folder.path);
    put_file(first, &m.file[0]);
    for (int both = 0; both < 2; both++) {
        assert_int_equal(capture_run(sm_stillmark_export, argv, &out, &err), 0);
        assert_int_equal(rows(out), 8);
        for (size_t i = 1; i <= 8; i++) {
            cell(out, i, column_of(out, "state"), text);
            assert_string_equal(text, both ? "released" : "provisional");
        }
        assert_true(!both ||
                    strstr(err, "000002_2026-12-01T081303Z.jsonl: read for later") != NULL);
        free(out);
        free(err);
        put_file(second, &m.file[1]);
    }
    argv[0] = folder.path;
    assert_int_equal(capture_run(sm_stillmark_verify, argv, &out, &err), 0);
    assert_non_null(strstr(out, "2 files: all verify"));
    free(out);
    free(err);
    log_maker_finish(&m);
    scratch_remove(&folder);
}

static void a_damaged_log_exports_nothing(void **state)
{
    char *hurt = strstr(log_text, "\"k\":\"result\""), *out;

    (void)state;
    assert_non_null(hurt);
    hurt = strstr(hurt, "\"value\":");
    assert_non_null(hurt);
    hurt[8] = '9';
    scratch_write(path, log_text);
    out = export(1, "--results", NULL);
    assert_int_equal(rows(out), 0);
    free(out);
}

static void what_is_asked_wrongly_is_refused(void **state)
{
    (void)state;
    free(export(2, "--everything", NULL));
    free(export(2, "--captures", "soon"));
    free(export(2, "--captures", "0"));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_log_verifies_and_can_be_begun_from),
        cmocka_unit_test(results_are_released_and_are_what_the_scenario_says),
        cmocka_unit_test(captures_and_curve_have_a_row_each),
        cmocka_unit_test(readings_are_those_that_came_down_the_wire),
        cmocka_unit_test(a_later_file_of_the_folder_is_read_for_what_it_released),
        cmocka_unit_test(a_damaged_log_exports_nothing),
        cmocka_unit_test(what_is_asked_wrongly_is_refused),
    };

    return cmocka_run_group_tests(tests, make_log, drop_log);
}
