/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/csv: tables that people made, read or refused with the line; cells for output. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/csv.h"

#define ROWS_MOST 4

/* A table that reads without a fault. */
struct good {
    const char *what, *text;
    size_t rows;
    double x[ROWS_MOST], y[ROWS_MOST];
    const char *x_name, *y_name;
};

static void expect_good(const struct good *g)
{
    struct sm_csv c;
    char why[SM_REASON_SIZE] = "";

    if (sm_csv_begin(&c, g->text, strlen(g->text), why) != SM_OK)
        fail_msg("%s: begin: line %u: %s", g->what, c.line, why);
    if (strcmp(c.x_name, g->x_name) != 0 || strcmp(c.y_name, g->y_name) != 0)
        fail_msg("%s: columns \"%s\", \"%s\"", g->what, c.x_name, c.y_name);
    if (c.header != (*g->x_name != '\0' || *g->y_name != '\0'))
        fail_msg("%s: header is %d", g->what, c.header);
    for (size_t i = 0;; i++) {
        struct sm_csv_row r;
        const enum sm_status st = sm_csv_next(&c, &r, why);
        if (st == SM_ESHORT && i == g->rows)
            return;
        if (st != SM_OK)
            fail_msg("%s: row %zu, line %u: status %d, %s", g->what, i, c.line, st, why);
        if (i >= g->rows || r.x != g->x[i] || r.y != g->y[i])
            fail_msg("%s: row %zu, line %u: got %g, %g", g->what, i, c.line, r.x, r.y);
    }
}

static void tables_of_every_shape_are_read(void **state)
{
    static const struct good cases[] = {
        { "plain", "t,v\n0,1.5\n1,2.5\n", 2, { 0, 1 }, { 1.5, 2.5 }, "t", "v" },
        { "no end of line", "t,v\n0,1.5", 1, { 0 }, { 1.5 }, "t", "v" },
        { "CRLF", "t,v\r\n0,1.5\r\n1,2\r\n", 2, { 0, 1 }, { 1.5, 2 }, "t", "v" },
        { "CRLF, last line cut", "t,v\r\n0,1.5\r", 1, { 0 }, { 1.5 }, "t", "v" },
        { "no header", "0,1.5\n1,2\n", 2, { 0, 1 }, { 1.5, 2 }, "", "" },
        { "header alone", "t,v\n", 0, { 0 }, { 0 }, "t", "v" },
        { "BOM", "\xEF\xBB\xBFt,v\n0,1\n", 1, { 0 }, { 1 }, "t", "v" },
        { "BOM, no header",
          "\xEF\xBB\xBF"
          "0,1\n",
          1,
          { 0 },
          { 1 },
          "",
          "" },
        { "comments", "# a, \"b\n#;\n\nt,v\n0,1\n", 1, { 0 }, { 1 }, "t", "v" },
        { "blank last lines", "t,v\n0,1\n\n  \n\r\n\n", 1, { 0 }, { 1 }, "t", "v" },
        { "blanks", " t , v mV \n 0 ,\t1 \n", 1, { 0 }, { 1 }, "t", "v mV" },
        { "semicolon, comma", "t;v\n0,5;1,25\n", 1, { 0.5 }, { 1.25 }, "t", "v" },
        { "semicolon, point", "t;v\n0.5;1.25\n", 1, { 0.5 }, { 1.25 }, "t", "v" },
        { "tab, comma", "t\tv\n0,5\t1,25\n", 1, { 0.5 }, { 1.25 }, "t", "v" },
        { "comma in a name", "t, s;v, mV\n1;2\n", 1, { 1 }, { 2 }, "t, s", "v, mV" },
        { "comma, no header, ;", "1,5;2,5\n", 1, { 1.5 }, { 2.5 }, "", "" },
        { "more columns", "t,v,note\n0,1,\"x, y\"\n1,2,\n", 2, { 0, 1 }, { 1, 2 }, "t", "v" },
        { "quoted numbers", "\"t\",\"v\"\n\"0\",\"1.5\"\n", 1, { 0 }, { 1.5 }, "t", "v" },
        { "quoted comma, ;", "t;v\n\"0,5\";\"1\"\n", 1, { 0.5 }, { 1 }, "t", "v" },
        { "; in quotes only", "\"t;s\",v\n1,2\n", 1, { 1 }, { 2 }, "t;s", "v" },
        { "exponents", "t,v\n1e-3,-2.5E+2\n", 1, { 0.001 }, { -250 }, "t", "v" },
        { "a name like a number", "2-propanol,y\n1,2\n", 1, { 1 }, { 2 }, "2-propanol", "y" },
        { "quotes, ;", "\"t\";\"v\"\n1,5;2\n", 1, { 1.5 }, { 2 }, "t", "v" },
        { "names that begin like nan",
          "name,information\n1,2\n",
          1,
          { 1 },
          { 2 },
          "name",
          "information" },
        { "one name empty", ",y\n1,2\n", 1, { 1 }, { 2 }, "", "y" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        expect_good(&cases[i]);
}

/* Source: RFC 4180 section 2, rules 5 to 7, whose example fields are the column names here. */
static void the_quoting_of_rfc_4180_is_read(void **state)
{
    static const struct good cases[] = {
        { "rule 5", "\"aaa\",\"bbb\",\"ccc\"\r\n1,2,3", 1, { 1 }, { 2 }, "aaa", "bbb" },
        { "rule 6", "\"aaa\",\"b\r\nbb\",\"ccc\"\r\n1,2,3", 1, { 1 }, { 2 }, "aaa", "b\r\nbb" },
        { "rule 7", "\"aaa\",\"b\"\"bb\",\"ccc\"\r\n1,2,3", 1, { 1 }, { 2 }, "aaa", "b\"bb" },
        { "only quotes", "\"\"\"\",\"\"\"x\"\"\"\r\n1,2", 1, { 1 }, { 2 }, "\"", "\"x\"" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        expect_good(&cases[i]);
}

static void a_doubtful_row_is_refused_with_its_line(void **state)
{
    static const struct {
        const char *text;
        unsigned line;
        const char *why; /* stands in the reason */
    } cases[] = {
        { "", 1, "no rows" },
        { "\n\n# x\n", 4, "no rows" },
        { "\xEF\xBB\xBF", 1, "no rows" },
        { "t\n1\n", 1, "two columns" },
        { "1\n2\n", 1, "two columns" },
        { "t,v\n0\n", 2, "expected 2 fields as in the first row, got 1" },
        { "t,v\n0,1\n0,1,2\n", 3, "expected 2 fields as in the first row, got 3" },
        { "t,v\n0,1,\n", 2, "got 3" },
        { "t,v,\n0,1\n", 2, "expected 3 fields" },
        { "t,v\n0,1\n\n1,2\n", 3, "empty line" },
        { "t,v\n0,1\n\n\n1,2\n", 3, "empty line" },
        { "t,v\n# x, y\n1,2\n", 2, "got \"# x\"" },
        { "t,v\nabc,1\n", 2, "column 1: expected a number, got \"abc\"" },
        { "t,v\n1,abc\n", 2, "column 2: expected a number, got \"abc\"" },
        { "t,v\n0,nan\n", 2, "got \"nan\"" },
        { "t,v\n0,NaN\n", 2, "got \"NaN\"" },
        { "t,v\n0,inf\n", 2, "got \"inf\"" },
        { "t,v\n-Infinity,1\n", 2, "got \"-Infinity\"" },
        { "t,v\n0,\n", 2, "column 2: expected a number, got \"\"" },
        { "t,v\n,1\n", 2, "column 1: expected a number, got \"\"" },
        { "t,v\n,\n", 2, "got \"\"" },
        { "t,v\n0,\"\"\n", 2, "got \"\"" },
        { "t,v\n0,1e999\n", 2, "got \"1e999\"" },
        { "t,v\n0,0x10\n", 2, "got \"0x10\"" },
        { "t,v\n0,1 2\n", 2, "got \"1 2\"" },
        { "t,v\n0,1.5 mV\n", 2, "got \"1.5 mV\"" },
        { "t,v\n0,\033[2J\n", 2, "control character" },
        { "t,v\n0,\"\033[2J\"\n", 2, "got \"\\x1b[2J\"" },
        { "t,v\r0,1\r1,2\r", 1, "carriage return" },
        { "t;v\n1,234.5;1\n", 2, "got \"1,234.5\"" },
        { "t;v\n1.234,5;1\n", 2, "got \"1.234,5\"" },
        { "t;v\n1,2,3;1\n", 2, "got \"1,2,3\"" },
        { "t;v\n1.5;2.5\n1,5;2\n", 3, "with a decimal point as above, got \"1,5\"" },
        { "t;v\n1,5;2.5\n", 2, "with a decimal comma as above, got \"2.5\"" },
        { "t,v\n0,5,1\n", 2, "got 3" }, /* a decimal comma where the comma separates */
        { "t,v\n\"0,5\",1\n", 2, "got \"0,5\"" },
        { "nan,nan\n1,2\n", 1, "got \"nan\"" }, /* data, not a header */
        { "# c\nNULL,None\n1,2\n", 2, "got \"NULL\"" },
        { "n/a,-Infinity\n1,2\n", 1, "got \"n/a\"" },
        { "nan,1\n1,2\n", 1, "got \"nan\"" },
        { "1,abc\n1,2\n", 1, "got \"abc\"" },
        { "abc,1\n1,2\n", 1, "got \"abc\"" },
        { ",\n1,2\n", 1, "got \"\"" },
        { "-,--\n1,2\n", 1, "got \"-\"" },
        { "1.2.3,4.5.6\n1,2\n", 1, "got \"1.2.3\"" },
        { "t,v\n0,\"1\n", 2, "never closed" },
        { "t,v\n0,\"1\"x\n", 2, "after a closing quote" },
        { "t,v\n0,1\"\n", 2, "a quote inside a cell" },
        { "\"t,v\n0,1\n", 1, "never closed" },
        { "t,v,ux,ux\n0,1,2,3\n", 1, "two columns of the same name" },
        { "t,v,ux\n0,1,abc\n", 2, "column ux: expected a number" },
        { "t,v,uy\n0,1,\n", 2, "column uy: expected a number" },
        { "t,v,uy\n0,1,-0.5\n", 2, "column uy: an uncertainty cannot be negative" },
        { "t,\"v\nw\"\n1,2\n3,x\n", 4, "got \"x\"" }, /* lines inside quotes count */
        { "t,v,note\n1,2,\"a\nb\"\n3,x,\n", 4, "got \"x\"" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const char *text = cases[i].text;
        struct sm_csv c;
        struct sm_csv_row row = { .x = 42 };
        char why[SM_REASON_SIZE] = "";
        enum sm_status st = sm_csv_begin(&c, text, strlen(text), why);

        while (st == SM_OK)
            st = sm_csv_next(&c, &row, why);
        if (st != SM_ESYNTAX || strstr(why, cases[i].why) == NULL || c.line != cases[i].line)
            fail_msg("case %zu: status %d, line %u: \"%s\"; want line %u: \"%s\"", i, st, c.line,
                     why, cases[i].line, cases[i].why);
    }
}

static void a_nul_byte_is_no_part_of_a_table(void **state)
{
    static const char utf16[] = "t\0,\0v\0\n\0";
    static const char quoted[] = "t,v\n0,\"1\0\"\n";
    struct sm_csv c;
    struct sm_csv_row row;
    char why[SM_REASON_SIZE] = "";

    (void)state;
    assert_int_equal(sm_csv_begin(&c, utf16, sizeof utf16 - 1, why), SM_ESYNTAX);
    assert_non_null(strstr(why, "UTF-8"));
    assert_int_equal(sm_csv_begin(&c, quoted, sizeof quoted - 1, why), SM_OK);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_ESYNTAX);
    assert_non_null(strstr(why, "got \"1\\x00\""));
}

static void a_failure_leaves_the_row_alone_and_the_next_row_can_be_asked_for(void **state)
{
    static const char text[] = "t,v\n0,x\n1,2,3\n4,5\n";
    struct sm_csv c;
    struct sm_csv_row row = { .x = 42, .y = 43 };
    char why[SM_REASON_SIZE] = "";

    (void)state;
    assert_int_equal(sm_csv_begin(&c, text, strlen(text), why), SM_OK);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_ESYNTAX);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_ESYNTAX);
    assert_int_equal(c.line, 3);
    assert_true(row.x == 42 && row.y == 43);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_OK);
    assert_int_equal(c.line, 4);
    assert_true(row.x == 4 && row.y == 5);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_ESHORT);
    assert_int_equal(sm_csv_next(&c, &row, why), SM_ESHORT);
}

static void columns_named_ux_and_uy_are_found_wherever_they_stand(void **state)
{
    static const struct {
        const char *text;
        bool has_ux, has_uy;
        double ux, uy;
    } cases[] = {
        { "x,y,ux,uy\n1,2,0.1,0.2\n", true, true, 0.1, 0.2 },
        { "x,y,note,uy,ux\n1,2,a,0.2,0.1\n", true, true, 0.1, 0.2 },
        { "x,y,\"uy\"\n1,2,0\n", false, true, 0, 0 },
        { "x;y;ux\n1;2;0,1\n", true, false, 0.1, 0 },
        { "x,y,UX,uyy,u\n1,2,a,b,c\n", false, false, 0, 0 },
        { "ux,uy\n1,2\n", false, false, 0, 0 }, /* the first two are x and y whatever their names */
        { "1,2,3,4\n", false, false, 0, 0 },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_csv c;
        struct sm_csv_row r = { 0 };
        char why[SM_REASON_SIZE] = "";

        if (sm_csv_begin(&c, cases[i].text, strlen(cases[i].text), why) != SM_OK ||
            sm_csv_next(&c, &r, why) != SM_OK)
            fail_msg("case %zu: line %u: %s", i, c.line, why);
        if (r.x != 1 || r.y != 2 || r.has_ux != cases[i].has_ux || r.has_uy != cases[i].has_uy ||
            r.ux != cases[i].ux || r.uy != cases[i].uy)
            fail_msg("case %zu: ux %d %g, uy %d %g", i, r.has_ux, r.ux, r.has_uy, r.uy);
    }
}

static void the_step_is_that_of_the_digits_of_y(void **state)
{
    static const struct {
        const char *text;
        double want;
        bool comma;
    } cases[] = {
        { "1,2.50\n", 0.01, false },   { "1;2,500\n", 0.001, true },    { "1.5,7\n", 1, false },
        { "1,\"2.0\"\n", 0.1, false }, { "1\t2,5e-3\n", 0.0001, true },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_csv c;
        struct sm_csv_row r = { 0 };
        char why[SM_REASON_SIZE] = "";

        assert_int_equal(sm_csv_begin(&c, cases[i].text, strlen(cases[i].text), why), SM_OK);
        assert_int_equal(sm_csv_next(&c, &r, why), SM_OK);
        if (r.y_step != cases[i].want || c.decimal_comma != cases[i].comma)
            fail_msg("case %zu: step %g, want %g; decimal comma %d", i, r.y_step, cases[i].want,
                     c.decimal_comma);
    }
}

/* Every beginning of a table, in storage of exactly its length: nothing beyond is looked at, and
 * the reader always comes to an end. */
static void a_table_cut_at_any_byte_is_read_to_its_end(void **state)
{
    static const char text[] =
        "\xEF\xBB\xBF# c\r\n\"t\"\"s\";\"v\nw\";uy\r\n0,5;\"1,25\";0,1\r\n\r\n1;x;\"\n";
    (void)state;
    for (size_t n = 0; n < sizeof text; n++) {
        char *copy = malloc(n > 0 ? n : 1), why[SM_REASON_SIZE] = "";
        struct sm_csv c;
        struct sm_csv_row r;
        enum sm_status st;
        size_t calls = 0;

        assert_non_null(copy);
        memcpy(copy, text, n);
        st = sm_csv_begin(&c, copy, n, why);
        while (st != SM_ESHORT && calls++ < n + 2)
            st = sm_csv_next(&c, &r, why);
        if (st != SM_ESHORT || c.at != n || c.line > 8)
            fail_msg("first %zu bytes: status %d, at %zu, line %u", n, st, c.at, c.line);
        free(copy);
    }
}

static void cells_go_out_quoted_and_without_formulas(void **state)
{
    static const struct {
        const char *cell, *want;
    } cases[] = {
        { "", "" },
        { "plain", "plain" },
        { "two words", "two words" },
        { "a,b", "\"a,b\"" },
        { "a;b", "\"a;b\"" },
        { "say \"x\"", "\"say \"\"x\"\"\"" },
        { " a", "\" a\"" },
        { "a ", "\"a \"" },
        { "=1+1", "'=1+1" },
        { "+cmd", "'+cmd" },
        { "-cmd", "'-cmd" },
        { "@x", "'@x" },
        { "-", "'-" },
        { "-1.5", "-1.5" },
        { "+2", "+2" },
        { "-1e-3", "-1e-3" },
        { "-1.5 mV", "'-1.5 mV" },
        { "-inf", "'-inf" },
        { "=\"a\",1", "\"'=\"\"a\"\",1\"" },
        { "a\nb", "\"a b\"" },
        { "a\r\nb", "\"a  b\"" },
        { "\t=1", "\"' =1\"" },
        { "\001=1", "' =1" },
        { " =1", "\"' =1\"" },
        { "a\033[2J", "a [2J" },
        { "a\x7F\xC2\x9B", "a  " },
        { "\xC2\xB5S/cm", "\xC2\xB5S/cm" },
        { "\xC2\x9F.\xC2\xA0.", " .\xC2\xA0." }, /* the last of C1, and what follows it */
        { "a\xFF", "a\\xff" },
        { "a\xE2\x80\xAE", "a\\xe2\\x80\\xae" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char buf[64];
        struct sm_text t;

        sm_text_init(&t, buf, sizeof buf);
        sm_csv_cell(&t, cases[i].cell);
        if (strcmp(buf, cases[i].want) != 0)
            fail_msg("case %zu: got <%s>, want <%s>", i, buf, cases[i].want);
    }
}

static void what_goes_out_as_a_cell_comes_back_as_a_name(void **state)
{
    static const char *const names[] = { "a,b", "say \"x\"", "a;b", "plain", "\xC2\xB5S/cm" };
    (void)state;
    for (size_t i = 0; i < COUNT(names); i++) {
        char buf[200], why[SM_REASON_SIZE] = "";
        struct sm_text t;
        struct sm_csv c;

        sm_text_init(&t, buf, sizeof buf);
        sm_text_add(&t, "x,");
        sm_csv_cell(&t, names[i]);
        sm_text_add(&t, "\r\n1,2\r\n");
        if (sm_csv_begin(&c, buf, t.len, why) != SM_OK || strcmp(c.y_name, names[i]) != 0)
            fail_msg("\"%s\": %s, came back as \"%s\"", names[i], why, c.y_name);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(tables_of_every_shape_are_read),
        cmocka_unit_test(the_quoting_of_rfc_4180_is_read),
        cmocka_unit_test(a_doubtful_row_is_refused_with_its_line),
        cmocka_unit_test(a_nul_byte_is_no_part_of_a_table),
        cmocka_unit_test(a_failure_leaves_the_row_alone_and_the_next_row_can_be_asked_for),
        cmocka_unit_test(columns_named_ux_and_uy_are_found_wherever_they_stand),
        cmocka_unit_test(the_step_is_that_of_the_digits_of_y),
        cmocka_unit_test(a_table_cut_at_any_byte_is_read_to_its_end),
        cmocka_unit_test(cells_go_out_quoted_and_without_formulas),
        cmocka_unit_test(what_goes_out_as_a_cell_comes_back_as_a_name),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
