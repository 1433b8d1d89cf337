/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "base/time.h"
#include "in_memory.h"
#include "same_setup.h"
#include "standard/standard.h"

#define SETUP "conf/stillmark.yaml"
#define MIN (60 * SM_NS_PER_S)

static struct sm_setup *load(struct bench *b)
{
    struct sm_setup *s = NULL;

    if (sm_setup_load(&b->source, SETUP, &s, &b->blames) != SM_OK) {
        print_blames(&b->blames);
        fail_msg("%zu blames", b->blames.n);
    }
    return s;
}

static void the_setup_file_and_the_meter_are_read(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = load(b);
    const struct sm_meter_setup *m = &s->meter[0];

    (void)state;
    assert_string_equal(s->logs, "conf/../logs");
    assert_string_equal(s->socket, "");
    assert_int_equal(s->n_people, 2);
    assert_true(s->people[0].analyse && !s->people[0].review && s->people[1].review);
    assert_int_equal(s->n_meters, 1);
    assert_string_equal(m->core.meter, "m1");
    assert_string_equal(m->core.sensor, "el-1");
    assert_string_equal(m->port.port, "/dev/serial/by-id/usb-1");
    assert_int_equal(m->port.baud, 9600);
    assert_int_equal(m->port.stop, 1);
    assert_true(m->port.dtr && m->port.rts && !m->port.other_adapter);
    assert_int_equal(m->core.silence_ns, 10 * SM_NS_PER_S);
    assert_ptr_equal(m->core.profile, &s->profile[0]);
    assert_int_equal(m->core.n_methods, 2);
    assert_string_equal(s->method[m->core.own_method].name, "ph");
    assert_ptr_equal(m->core.people, s->people);
    assert_ptr_equal(m->core.standards, &s->standards);
    sm_setup_destroy(s);
    bench_end(b);
}

static void limits_in_ph_are_resolved_at_the_theoretical_slope_of_25_degrees(void **state)
{
    /* ln(10) R T / F at 298.15 K with R = 8.314462618 J/(mol K), F = 96485.33212 C/mol (CODATA
     * 2018) */
    const double slope = 59.15934;
    struct bench *b =
        bench_begin("conf/methods/ph.yaml", "levels: 5\n",
                    "drift-allowed: { standards: 0 pH/min, samples: 0.005 pH/min }\n");
    struct sm_setup *s = load(b);
    const struct sm_method *m = &s->method[s->meter[0].core.own_method];

    (void)state;
    check_close("standards", m->rule.tolerance[SM_CLASS_STANDARD], 0.01 * slope, 1e-5);
    check_close("checks", m->rule.tolerance[SM_CLASS_CHECK], 0.01 * slope, 1e-5);
    check_close("samples", m->rule.tolerance[SM_CLASS_SAMPLE], 0.02 * slope, 1e-5);
    check_close("drift of samples", m->rule.drift_allowed_per_s[SM_CLASS_SAMPLE],
                0.005 * slope / 60, 1e-7);
    check_close("drift of standards", m->rule.drift_allowed_per_s[SM_CLASS_STANDARD], 0, 0);
    check_close("as written", m->tolerance_written[SM_CLASS_SAMPLE].value, 0.02, 0);
    assert_int_equal(m->tolerance_written[SM_CLASS_SAMPLE].unit, SM_UNIT_PH);
    assert_int_equal(m->signal_unit, SM_UNIT_MV);
    sm_setup_destroy(s);
    bench_end(b);
}

/* The defaults to ship, pH of surface and drinking water. */
static void what_a_ph_method_leaves_out_takes_the_shipped_default(void **state)
{
    struct bench *b = bench_begin("conf/methods/ph.yaml", "",
                                  "measures: pH\nsignal: potential\ntemperature: probe\n"
                                  "model: nernst\nrule: spread\nover: 20 s\n");
    struct sm_setup *s = load(b);
    const struct sm_method *m = &s->method[s->meter[0].core.own_method];

    (void)state;
    check_close("tolerance", m->tolerance_written[SM_CLASS_STANDARD].value, 0.01, 0);
    check_close("tolerance of samples", m->tolerance_written[SM_CLASS_SAMPLE].value, 0.02, 0);
    check_close("doubt", m->rule.doubt[SM_CLASS_CHECK], 0.01, 1e-15);
    check_close("doubt of samples", m->rule.doubt[SM_CLASS_SAMPLE], 0.03, 1e-15);
    assert_int_equal(m->rule.dwell_ns, 30 * SM_NS_PER_S);
    assert_int_equal(m->rule.longest_wait_ns[SM_CLASS_CHECK], 5 * MIN);
    assert_int_equal(m->rule.longest_wait_ns[SM_CLASS_SAMPLE], 15 * MIN);
    assert_int_equal(m->levels, 5);
    assert_int_equal(m->levels_after_drop, 4);
    check_close("pH of the isopotential point", m->ph_iso, 7, 0);
    check_close("its half-width", m->ph_iso_half_width, 0.5, 0);
    check_close("R²", m->r_squared.value, 0.990, 0);
    check_close("residual SD", m->residual_sd.value, 1.2, 0);
    check_close("slope from", m->slope.from.value, 90, 0);
    check_close("slope to", m->slope.to.value, 105, 0);
    check_close("slope warn from", m->slope.warn_from.value, 95, 0);
    check_close("slope warn to", m->slope.warn_to.value, 102, 0);
    check_close("offset from", m->offset.from.value, -30, 0);
    check_close("offset to", m->offset.to.value, 30, 0);
    check_close("back-calculated", m->back_calculated.value, 0.05, 0);
    check_close("leave-one-out", m->leave_one_out.value, 0.08, 0);
    assert_int_equal(m->curve_valid_ns, 8 * 60 * MIN);
    check_close("after the curve", m->after_curve.value, 0.1, 0);
    check_close("after the curve, warn", m->after_curve_warn.value, 0.05, 0);
    check_close("check", m->check.value, 0.1, 0);
    assert_int_equal(m->check_every, 10);
    assert_true(m->check_at_end && m->r_squared.has && m->check.has && m->duplicate.has);
    assert_int_equal(m->duplicate_one_in, 10);
    assert_int_equal(m->marks, SM_MARKS_ASK);
    assert_int_equal(m->redo, SM_REDO_FOR_CAUSE);
    assert_int_equal(m->idle_ns, 5 * MIN);
    assert_int_equal(m->gap_ns, 2 * MIN);
    sm_setup_destroy(s);
    bench_end(b);
}

static void a_limit_that_says_none_is_none(void **state)
{
    struct bench *b = bench_begin("conf/methods/ph.yaml", "levels: 5\n",
                                  "offset: none\nback-calculated: none\nr-squared: none\n");
    struct sm_setup *s = load(b);
    const struct sm_method *m = &s->method[s->meter[0].core.own_method];

    (void)state;
    assert_false(m->offset.from.has || m->offset.to.has || m->back_calculated.has ||
                 m->r_squared.has);
    assert_true(m->residual_sd.has);
    sm_setup_destroy(s);
    bench_end(b);
}

static void a_line_takes_its_signals_unit_from_the_tolerance(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = load(b);
    const struct sm_method *m = &s->method[0];

    (void)state;
    assert_string_equal(m->name, "line"); /* methods are read in the order of their names */
    assert_int_equal(m->signal_unit, SM_UNIT_A);
    check_close("tolerance of samples", m->rule.tolerance[SM_CLASS_SAMPLE], 0.002, 0);
    assert_int_equal(m->rule.longest_wait_ns[SM_CLASS_SAMPLE], 2 * MIN);
    check_close("residual SD of a photometer", m->residual_sd.value, 0.003, 0);
    assert_false(m->back_calculated.has || m->slope.from.has || m->duplicate.has);
    sm_setup_destroy(s);
    bench_end(b);
}

static void standards_are_read_with_their_table(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = load(b);
    const struct sm_standards *all = &s->standards;
    char why[SM_REASON_SIZE];
    double v = 0;

    (void)state;
    assert_int_equal(all->n, 4);
    assert_string_equal(all->table.name, "conf/standards/tables/t.csv");
    assert_int_equal(all->list[0].table_column, 0);
    assert_true(all->list[0].has_expires && all->list[0].has_opened);
    assert_int_equal(all->list[0].expires_day - all->list[0].opened_day, 131);
    assert_int_equal(sm_standard_value(all, 0, 22.5, &v, why), SM_OK);
    check_close("between the table's rows", v, 4.005, 1e-12);
    assert_int_equal(all->list[1].n_values, 2);
    check_close("sorted by temperature", all->list[1].t_c[0], 20, 0);
    check_close("with its value", all->list[1].value[0], 10.07, 0);
    check_close("U", all->list[1].u, 0.02, 0);
    assert_int_equal(all->list[3].unit, SM_UNIT_MG_L);
    assert_true(isnan(all->list[3].t_c[0]));
    check_close("U of 2 %", all->list[3].u, 0.02, 1e-15);
    sm_setup_destroy(s);
    bench_end(b);
}

static void the_files_for_the_log_come_in_a_fixed_order(void **state)
{
    static const char *const want[] = { "conf/stillmark.yaml",        "conf/meters/m1.yaml",
                                        "conf/profiles/mv.yaml",      "conf/methods/line.yaml",
                                        "conf/methods/ph.yaml",       "conf/standards/buffers.yaml",
                                        "conf/standards/tables/t.csv" };
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = load(b);

    (void)state;
    assert_int_equal(s->n_files, COUNT(want));
    for (size_t i = 0; i < COUNT(want); i++)
        assert_string_equal(s->files[i].name, want[i]);
    sm_setup_destroy(s);
    bench_end(b);
}

static void the_files_kept_for_the_log_give_the_same_setup_again(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL), *again = calloc(1, sizeof *again);
    struct sm_setup *s = load(b), *t;

    (void)state;
    assert_non_null(again);
    for (size_t i = s->n_files; i-- > 0;) /* whatever order they come in */
        assert_int_equal(
            sm_logged_add(&again->files, s->files[i].name, s->files[i].text, s->files[i].n), SM_OK);
    sm_logged_source(&again->files, &again->source);
    sm_blames_init(&again->blames, again->list, BLAMES);
    t = load(again);
    assert_same_setup(s, t);
    sm_setup_destroy(s);
    sm_setup_destroy(t);
    bench_end(b);
    bench_end(again);
}

static void a_sheet_is_read_against_the_setup(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = load(b);
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);

    (void)state;
    assert_non_null(sheet);
    assert_int_equal(sm_sheet_load(s, "s.yaml", good_sheet, strlen(good_sheet), sheet, &b->blames),
                     SM_OK);
    assert_string_equal(sheet->file, "s.yaml");
    assert_string_equal(s->method[sheet->method].name, "ph");
    assert_int_equal(sheet->n, 6);
    assert_int_equal(sheet->item[1].standard, 1);
    assert_int_equal(sheet->item[2].kind, SM_ITEM_CHECK);
    assert_string_equal(sheet->item[3].place, "clear well");
    assert_true(sheet->item[3].has_sampled && sheet->item[3].has_band);
    check_close("sampled", (double)(sheet->item[3].sampled_utc_us / 1000000), 1796108700.0, 0);
    check_close("band", sheet->item[3].band_to, 8.4, 0);
    assert_int_equal(sheet->item[3].standard, -1);
    assert_int_equal(sheet->item[4].kind, SM_ITEM_DUPLICATE);
    assert_string_equal(sheet->item[4].name, "final");
    free(sheet);
    sm_setup_destroy(s);
    bench_end(b);
}

static void what_two_meters_or_two_lists_share_is_read_and_logged_once(void **state)
{
    static const char m2[] = "port: /dev/p2\nprofile: mv\nmethod: ph\nsensor: el-2\n";
    static const char more[] = "table: tables/t.csv\n"
                               "standards: [ { name: D4, column: phthalate, lot: G-1 } ]\n";
    struct bench *b = bench_begin(SETUP, "meters: [ m1 ]\nstandards: [ buffers ]",
                                  "meters: [ m1, m2 ]\nstandards: [ buffers, more ]");
    struct sm_setup *s;

    (void)state;
    assert_int_equal(sm_logged_add(&b->files, "conf/meters/m2.yaml", m2, strlen(m2)), SM_OK);
    assert_int_equal(sm_logged_add(&b->files, "conf/standards/more.yaml", more, strlen(more)),
                     SM_OK);
    s = load(b);
    assert_int_equal(s->n_meters, 2);
    assert_int_equal(s->n_profiles, 1);
    assert_ptr_equal(s->meter[0].core.profile, s->meter[1].core.profile);
    assert_int_equal(s->standards.n, 5);
    assert_int_equal(s->standards.list[4].table_column, 0);
    assert_int_equal(s->n_files, COUNT(good_files) + 2);
    sm_setup_destroy(s);
    bench_end(b);
}

/* ---- memory and the source failing ---- */

static enum sm_status fail_get(void *ctx, const char *name, size_t limit, char **ret_text,
                               size_t *ret_n, char ret_why[SM_REASON_SIZE])
{
    struct bench *b = ctx;

    if (strcmp(name, "conf/methods/ph.yaml") == 0)
        return SM_ENOMEM;
    return b->source.get(&b->files, name, limit, ret_text, ret_n, ret_why);
}

static enum sm_status fail_list(void *ctx, const char *folder,
                                void (*each)(void *arg, const char *name), void *arg)
{
    struct bench *b = ctx;

    return b->source.list(&b->files, folder, each, arg);
}

static enum sm_status no_list(void *ctx, const char *folder,
                              void (*each)(void *arg, const char *name), void *arg)
{
    (void)ctx, (void)folder, (void)each, (void)arg;
    return SM_EIO;
}

static void a_source_that_fails_is_said(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    const struct sm_source no_memory = { b, fail_get, fail_list };
    struct sm_source no_folder = b->source;
    struct sm_setup *s = NULL;

    (void)state;
    assert_int_equal(sm_setup_load(&no_memory, SETUP, &s, &b->blames), SM_ENOMEM);
    assert_null(s);
    no_folder.list = no_list;
    sm_blames_init(&b->blames, b->list, BLAMES);
    assert_int_equal(sm_setup_load(&no_folder, SETUP, &s, &b->blames), SM_ESYNTAX);
    assert_string_equal(b->list[0].text, "the folder of methods cannot be read");
    assert_int_equal(sm_setup_load(&b->source, "", &s, &b->blames), SM_ESYNTAX);
    bench_end(b);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_setup_file_and_the_meter_are_read),
        cmocka_unit_test(limits_in_ph_are_resolved_at_the_theoretical_slope_of_25_degrees),
        cmocka_unit_test(what_a_ph_method_leaves_out_takes_the_shipped_default),
        cmocka_unit_test(a_limit_that_says_none_is_none),
        cmocka_unit_test(a_line_takes_its_signals_unit_from_the_tolerance),
        cmocka_unit_test(standards_are_read_with_their_table),
        cmocka_unit_test(the_files_for_the_log_come_in_a_fixed_order),
        cmocka_unit_test(the_files_kept_for_the_log_give_the_same_setup_again),
        cmocka_unit_test(a_sheet_is_read_against_the_setup),
        cmocka_unit_test(what_two_meters_or_two_lists_share_is_read_and_logged_once),
        cmocka_unit_test(a_source_that_fails_is_said),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
