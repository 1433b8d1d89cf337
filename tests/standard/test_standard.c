/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_standard.c: values of standards against temperature, and the table that ships. */
#include "standard/standard.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "reference/reference.h"

#define SHIPPED "conf/standards/tables/ph-buffers.csv"
#define HEAD "# source: invented for this test\n# unit: pH\n"

static struct sm_table parsed(const char *text, size_t n)
{
    struct sm_table t;
    unsigned line = 0;
    char why[SM_REASON_SIZE] = "";

    if (sm_table_parse(text, n, &t, &line, why) != SM_OK)
        fail_msg("line %u: %s", line, why);
    return t;
}

static struct sm_table shipped(void)
{
    size_t n;
    char *text = check_read_file(SHIPPED, &n);
    const struct sm_table t = parsed(text, n);

    free(text);
    return t;
}

static int column_of(const struct sm_table *t, const char *name)
{
    for (size_t i = 0; i < t->n_columns; i++)
        if (strcmp(t->column[i], name) == 0)
            return (int)i;
    fail_msg("no column %s", name);
    return -1;
}

static double value_at(const struct sm_table *t, const char *column, double t_c)
{
    static struct sm_standards s;
    double v;
    char why[SM_REASON_SIZE];

    s = (struct sm_standards){ .table = *t, .n = 1 };
    s.list[0] = (struct sm_standard){ .name = "B", .table_column = column_of(t, column) };
    if (sm_standard_value(&s, 0, t_c, &v, why) != SM_OK)
        fail_msg("%s at %g: %s", column, t_c, why);
    return v;
}

static void the_shipped_table_names_its_source_and_unit(void **state)
{
    const struct sm_table t = shipped();

    (void)state;
    assert_int_equal(t.unit, SM_UNIT_PH);
    assert_int_equal(t.n_rows, 31);
    assert_int_equal(t.n_columns, 9);
    assert_non_null(strstr(t.source, "names no origin"));
    assert_non_null(strstr(t.source, "Bates"));
    assert_string_equal(t.name, "");
    check_close("first", t.t_c[0], 0, 0);
    check_close("last", t.t_c[30], 95, 0);
}

/* Second table: European Pharmacopoeia, general chapter 2.2.3, table 2.2.3-2 (two decimals). */
static void the_shipped_table_agrees_with_the_european_pharmacopoeia(void **state)
{
    static const char *const rows[] = { "15", "25", "35" };
    const struct sm_table t = shipped();
    size_t compared = 0;

    (void)state;
    for (size_t r = 0; r < COUNT(rows); r++)
        for (size_t c = 0; c < t.n_columns; c++) {
            char text[REFERENCE_LINE], what[300];
            reference_text("ph_buffers_eur_pharm.csv", rows[r], NULL, t.column[c], text);
            if (text[0] == '\0')
                continue; /* tartrate below 25 °C */
            snprintf(what, sizeof what, "%s at %s °C", t.column[c], rows[r]);
            check_close(what, value_at(&t, t.column[c], atof(rows[r])), atof(text), 0.00501);
            compared++;
        }
    assert_int_equal(compared, 26);
}

/* Second table, three decimals: HJ 1147-2020, which differs by at most 0.004 in these columns here.
 */
static void the_shipped_table_agrees_with_hj_1147(void **state)
{
    static const char *const rows[] = { "10", "20", "40" };
    static const char *const columns[][2] = { { "tetroxalate_0.05", "tetroxalate" },
                                              { "phthalate_0.05", "phthalate" },
                                              { "phosphate_0.025_0.025", "phosphate_equimolal" },
                                              { "borax_0.01", "borax" } };
    const struct sm_table t = shipped();

    (void)state;
    for (size_t r = 0; r < COUNT(rows); r++)
        for (size_t c = 0; c < COUNT(columns); c++)
            check_close(columns[c][1], value_at(&t, columns[c][0], atof(rows[r])),
                        reference_value("ph_buffers_hj1147.csv", rows[r], NULL, columns[c][1]),
                        0.00401);
}

static void a_table_is_read_between_its_rows_and_not_beyond(void **state)
{
    static const char text[] = HEAD "t_C,a,b\n0,4.0,\n10,4.1,7.0\n20,,7.2\n40,4.7,7.5\n";
    static struct sm_standards s;
    static const struct {
        int column;
        double t_c, want; /* NaN: refused */
    } cases[] = { { 0, 0, 4.0 },     { 0, 2.5, 4.025 },
                  { 0, 10, 4.1 },    { 0, 20, 4.3 },
                  { 0, 39.5, 4.69 }, { 0, 40, 4.7 },
                  { 0, 40.1, NAN },  { 0, -0.1, NAN },
                  { 1, 10, 7.0 },    { 1, 9.9, NAN },
                  { 1, 15, 7.1 },    { 1, 30, 7.35 },
                  { 0, NAN, NAN },   { 0, (double)INFINITY, NAN } };

    (void)state;
    s = (struct sm_standards){ .table = parsed(text, strlen(text)), .n = 1 };
    for (size_t i = 0; i < COUNT(cases); i++) {
        double v = 99;
        char why[SM_REASON_SIZE] = "";
        s.list[0] = (struct sm_standard){ .name = "B4", .table_column = cases[i].column };
        const enum sm_status got = sm_standard_value(&s, 0, cases[i].t_c, &v, why);
        if (got != (isnan(cases[i].want) ? SM_EINVAL : SM_OK))
            fail_msg("column %d at %g °C: status %d", cases[i].column, cases[i].t_c, got);
        check_close("value", v, isnan(cases[i].want) ? 99 : cases[i].want, 1e-12);
        assert_int_equal(why[0] != '\0', got != SM_OK);
    }
    double v;
    char why[SM_REASON_SIZE];
    s.list[0].table_column = 1;
    assert_int_equal(sm_standard_value(&s, 0, 5, &v, why), SM_EINVAL);
    assert_string_equal(why, "B4 has a value from 10 °C to 40 °C, not at 5.0 °C");
}

static void a_certificate_wins_over_the_table(void **state)
{
    static const char text[] = HEAD "t_C,a\n0,4.0\n100,5.0\n";
    static struct sm_standards s;
    static const struct {
        const char *name;
        size_t n;
        double t[3], v[3], t_c, want; /* NaN: refused */
    } cases[] = {
        { "no certificate", 0, { 0 }, { 0 }, 20, 4.2 },
        { "single, there", 1, { 20 }, { 7.02 }, 20, 7.02 },
        { "single, 1 °C off", 1, { 20 }, { 7.02 }, 21, 7.02 },
        { "single, 1 °C off below", 1, { 20 }, { 7.02 }, 19, 7.02 },
        { "single, too far", 1, { 20 }, { 7.02 }, 21.01, NAN },
        { "single, too far below", 1, { 20 }, { 7.02 }, 18.99, NAN },
        { "two, between", 2, { 20, 25 }, { 10.07, 10.02 }, 21, 10.06 },
        { "two, at the second", 2, { 20, 25 }, { 10.07, 10.02 }, 25, 10.02 },
        { "two, just above", 2, { 20, 25 }, { 10.07, 10.02 }, 25.9, 10.02 },
        { "two, too high", 2, { 20, 25 }, { 10.07, 10.02 }, 26.1, NAN },
        { "three, in the second stretch", 3, { 10, 20, 30 }, { 4, 4.1, 4.5 }, 25, 4.3 },
        { "concentration", 1, { NAN }, { 0.5 }, 37, 0.5 },
        { "concentration, temperature unknown", 1, { NAN }, { 0.5 }, NAN, 0.5 },
        { "certificate, temperature unknown", 1, { 20 }, { 7.02 }, NAN, NAN },
    };

    (void)state;
    s = (struct sm_standards){ .table = parsed(text, strlen(text)), .n = 1 };
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_standard d = { .name = "C7", .n_values = cases[i].n, .table_column = 0 };
        double v = 99;
        char why[SM_REASON_SIZE];
        memcpy(d.t_c, cases[i].t, sizeof cases[i].t);
        memcpy(d.value, cases[i].v, sizeof cases[i].v);
        s.list[0] = d;
        const enum sm_status got = sm_standard_value(&s, 0, cases[i].t_c, &v, why);
        if (got != (isnan(cases[i].want) ? SM_EINVAL : SM_OK))
            fail_msg("%s: status %d (%s)", cases[i].name, got, why);
        check_close(cases[i].name, v, isnan(cases[i].want) ? 99 : cases[i].want, 1e-12);
    }
}

static void a_standard_without_any_value_says_so(void **state)
{
    static struct sm_standards s = { .n = 1 };
    double v = 99;
    char why[SM_REASON_SIZE];

    (void)state;
    s.list[0] = (struct sm_standard){ .name = "B4", .table_column = -1 };
    assert_int_equal(sm_standard_value(&s, 0, 20, &v, why), SM_EINVAL);
    assert_string_equal(why, "B4 has neither a certificate value nor a table column");
    s.list[0].table_column = 3; /* of a table that is not there */
    assert_int_equal(sm_standard_value(&s, 0, 20, &v, why), SM_EINVAL);
    assert_int_equal(sm_standard_value(&s, 1, 20, &v, why), SM_EINVAL);
    check_close("untouched", v, 99, 0);
}

static void standards_are_found_by_name(void **state)
{
    static struct sm_standards s = { .n = 2 };

    (void)state;
    s.list[0] = (struct sm_standard){ .name = "B4" };
    s.list[1] = (struct sm_standard){ .name = "B10" };
    assert_int_equal(sm_standards_find(&s, "B10"), 1);
    assert_int_equal(sm_standards_find(&s, "B1"), -1);
    assert_int_equal(sm_standards_find(&s, ""), -1);
}

static void a_table_that_is_wrong_is_refused_with_its_line(void **state)
{
    static const struct {
        const char *name, *text, *why;
        unsigned line;
        enum sm_status want;
    } cases[] = {
        { "no source", "# unit: pH\nt_C,a\n0,1\n", "names no source", 2, SM_ESYNTAX },
        { "empty source", "# source:  \n# unit: pH\nt_C,a\n0,1\n", "source:", 1, SM_ESYNTAX },
        { "two sources", HEAD "# source: x\nt_C,a\n0,1\n", "a second source", 3, SM_ESYNTAX },
        { "no unit", "# source: x\nt_C,a\n0,1\n", "names no unit", 2, SM_ESYNTAX },
        { "unknown unit", "# source: x\n# unit: ph\nt_C,a\n0,1\n", "got \"ph\"", 2, SM_ESYNTAX },
        { "nothing but a head", HEAD, "no row of column names", 2, SM_ESYNTAX },
        { "nothing", "", "names no source", 0, SM_ESYNTAX },
        { "first column", HEAD "t,a\n0,1\n", "got \"t\"", 3, SM_ESYNTAX },
        { "no columns", HEAD "t_C\n0\n", "no column but", 3, SM_ESYNTAX },
        { "column without a name", HEAD "t_C,a,\n0,1,2\n", "name of a column", 3, SM_ESYNTAX },
        { "column twice", HEAD "t_C,a,a\n0,1,2\n", "a second column", 3, SM_ESYNTAX },
        { "no rows", HEAD "t_C,a\n\n", "no row of values", 4, SM_ESYNTAX },
        { "no temperature", HEAD "t_C,a\n0,1\n,2\n", "a temperature in", 5, SM_ESYNTAX },
        { "falling", HEAD "t_C,a\n5,1\n5,2\n", "above that of the row before", 5, SM_ESYNTAX },
        { "no number", HEAD "t_C,a\n0,1\n5,1.2.3\n", "got \"1.2.3\"", 5, SM_ESYNTAX },
        { "nan", HEAD "t_C,a\n0,nan\n", "got \"nan\"", 4, SM_ESYNTAX },
        { "too few", HEAD "t_C,a,b\n0,1\n", "fewer fields", 4, SM_ESYNTAX },
        { "too many", HEAD "t_C,a\n\n0,1,2\n", "more fields", 5, SM_ESYNTAX },
        { "a note below the head", HEAD "t_C,a\n0,1\n# x\n", "got \"# x\"", 5, SM_ESYNTAX },
        { "control characters", HEAD "t_C,a\n0,\x1b[2J\n", "got \"\\x1b[2J\"", 4, SM_ESYNTAX },
        { "17 columns", HEAD "t_C,a,b,c,d,e,f,g,h,i,j,k,l,m,n,o,p,q\n", "more than 16", 3,
          SM_EFULL },
    };
    static struct sm_table got, before;

    (void)state;
    memset(&before, 0x5a, sizeof before);
    for (size_t i = 0; i < COUNT(cases); i++) {
        unsigned line = 77;
        char why[SM_REASON_SIZE] = "";
        memcpy(&got, &before, sizeof got);
        const enum sm_status status =
            sm_table_parse(cases[i].text, strlen(cases[i].text), &got, &line, why);
        if (status != cases[i].want || line != cases[i].line || strstr(why, cases[i].why) == NULL ||
            memcmp(&got, &before, sizeof got) != 0)
            fail_msg("%s: status %d, line %u, \"%s\"; want %d, %u, \"%s\"", cases[i].name, status,
                     line, why, cases[i].want, cases[i].line, cases[i].why);
    }
}

static void a_table_holds_sixty_four_rows_and_no_more(void **state)
{
    static char text[4096];
    static struct sm_table t;
    unsigned line = 0;
    char why[SM_REASON_SIZE];
    size_t n = (size_t)snprintf(text, sizeof text, "\xef\xbb\xbf" HEAD "t_C,a\r\n");

    (void)state;
    for (int i = 0; i < SM_TABLE_ROWS_MAX; i++)
        n += (size_t)snprintf(text + n, sizeof text - n, "%d, %d.5 \r\n", i, i);
    assert_int_equal(sm_table_parse(text, n, &t, &line, why), SM_OK);
    assert_int_equal(t.n_rows, SM_TABLE_ROWS_MAX);
    check_close("last", t.value[63][0], 63.5, 0);
    assert_string_equal(t.source, "invented for this test");
    n += (size_t)snprintf(text + n, sizeof text - n, "100,1\n");
    assert_int_equal(sm_table_parse(text, n, &t, &line, why), SM_EFULL);
    assert_int_equal(line, 68);
}

/* However a table is cut or damaged, it is read or refused; the sanitizers watch. */
static void a_cut_or_damaged_table_is_read_or_refused(void **state)
{
    size_t n;
    char *text = check_read_file(SHIPPED, &n);
    static struct sm_table t;
    size_t refused = 0;

    (void)state;
    for (size_t i = 0; i < n; i++) {
        unsigned line = 0;
        char why[SM_REASON_SIZE] = "";
        char *copy = malloc(i + 1); /* its end is the heap's end */
        assert_non_null(copy);
        memcpy(copy, text, i + 1);
        copy[i] = (char)(i * 37);
        if (sm_table_parse(copy, i + 1, &t, &line, why) != SM_OK) {
            refused++;
            assert_true(why[0] != '\0');
        }
        free(copy);
    }
    assert_true(refused > n / 2);
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_shipped_table_names_its_source_and_unit),
        cmocka_unit_test(the_shipped_table_agrees_with_the_european_pharmacopoeia),
        cmocka_unit_test(the_shipped_table_agrees_with_hj_1147),
        cmocka_unit_test(a_table_is_read_between_its_rows_and_not_beyond),
        cmocka_unit_test(a_certificate_wins_over_the_table),
        cmocka_unit_test(a_standard_without_any_value_says_so),
        cmocka_unit_test(standards_are_found_by_name),
        cmocka_unit_test(a_table_that_is_wrong_is_refused_with_its_line),
        cmocka_unit_test(a_table_holds_sixty_four_rows_and_no_more),
        cmocka_unit_test(a_cut_or_damaged_table_is_read_or_refused),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
