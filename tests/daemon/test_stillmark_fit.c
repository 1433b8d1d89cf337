/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_stillmark_fit.c: the command `stillmark fit` as a script sees it: what it writes to standard
 * output and standard error, and its exit status. Sources of the values: the files of
 * tests/reference/. */
#include "stillmark_fit.h"

#include <fcntl.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <gsl/gsl_errno.h>
#include <jansson.h>

#include "check.h"
#include "reference/reference.h"

#define WORDS_MAX 12

struct said {
    int status;
    char *out, *err; /* freed by forget() */
};

static char *everything(int fd)
{
    const off_t n = lseek(fd, 0, SEEK_END);
    char *text = calloc((size_t)n + 1, 1);

    assert_non_null(text);
    assert_int_equal(pread(fd, text, (size_t)n, 0), n);
    close(fd);
    return text;
}

static int scratch(void)
{
    char path[] = "/tmp/sm-fit-XXXXXX";
    const int fd = mkstemp(path);

    assert_true(fd >= 0);
    unlink(path);
    return fd;
}

/* Runs the command with the words up to NULL. */
static struct said run(const char *const *words)
{
    char *argv[WORDS_MAX];
    int argc = 0, saved[2], got[2] = { scratch(), scratch() };
    struct said s;

    for (; words[argc] != NULL; argc++)
        argv[argc] = strdup(words[argc]);
    fflush(stdout);
    fflush(stderr);
    for (int i = 0; i < 2; i++) {
        saved[i] = dup(STDOUT_FILENO + i);
        dup2(got[i], STDOUT_FILENO + i);
    }
    s.status = sm_stillmark_fit(argc, argv);
    fflush(stdout);
    fflush(stderr);
    for (int i = 0; i < 2; i++) {
        dup2(saved[i], STDOUT_FILENO + i);
        close(saved[i]);
    }
    s.out = everything(got[0]);
    s.err = everything(got[1]);
    while (argc > 0)
        free(argv[--argc]);
    return s;
}

static void forget(struct said s)
{
    free(s.out);
    free(s.err);
}

/* A data set of tests/reference/ by its whole path. */
static const char *reference(const char *file, char out[256])
{
    snprintf(out, 256, SM_SOURCE_DIR "/tests/reference/%s", file);
    return out;
}

static json_t *object(const char *const *words)
{
    const struct said s = run(words);
    json_error_t e;
    json_t *j;

    if (s.status != 0 || s.err[0] != '\0')
        fail_msg("status %d: %s", s.status, s.err);
    j = json_loads(s.out, JSON_REJECT_DUPLICATES, &e);
    if (j == NULL)
        fail_msg("no JSON: %s", e.text);
    forget(s);
    return j;
}

static double number(const json_t *j, const char *key)
{
    const json_t *v = json_object_get(j, key);

    if (!json_is_number(v))
        fail_msg("no number \"%s\"", key);
    return json_number_value(v);
}

static void nist_sets_come_out_of_the_command_to_nine_digits(void **state)
{
    static const struct {
        const char *set, *file, *model, *names[3];
        size_t first, n, points;
    } cases[] = {
        { "norris", "nist_norris.csv", "line", { "intercept", "slope", NULL }, 0, 2, 36 },
        { "pontius",
          "nist_pontius.csv",
          "quadratic",
          { "intercept", "slope", "quadratic" },
          0,
          3,
          40 },
        { "noint1", "nist_noint1.csv", "proportional", { "slope", NULL, NULL }, 1, 1, 11 }
    };
    const char *const certified = "nist_certified.csv";

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char path[256], b[8], sd[8];
        const char *const words[] = { "--json", "--model", cases[i].model,
                                      reference(cases[i].file, path), NULL };
        json_t *j = object(words);
        const json_t *list = json_object_get(j, "coefficients");
        assert_string_equal(json_string_value(json_object_get(j, "model")), cases[i].model);
        assert_int_equal(number(j, "n"), cases[i].points);
        assert_int_equal(number(j, "dof"),
                         reference_value(certified, cases[i].set, "df", "certified"));
        assert_int_equal(json_array_size(list), cases[i].n);
        for (size_t k = 0; k < cases[i].n; k++) {
            const json_t *c = json_array_get(list, k);
            snprintf(b, sizeof b, "B%zu", cases[i].first + k);
            snprintf(sd, sizeof sd, "sd_B%zu", cases[i].first + k);
            assert_string_equal(json_string_value(json_object_get(c, "name")), cases[i].names[k]);
            check_digits(b, number(c, "value"),
                         reference_value(certified, cases[i].set, b, "certified"), 9);
            check_digits(sd, number(c, "standard_error"),
                         reference_value(certified, cases[i].set, sd, "certified"), 9);
        }
        check_digits("residual_sd", number(j, "residual_sd"),
                     reference_value(certified, cases[i].set, "residual_sd", "certified"), 9);
        check_digits("r_squared", number(j, "r_squared"),
                     reference_value(certified, cases[i].set, "r_squared", "certified"), 9);
        assert_int_equal(json_array_size(json_object_get(j, "points")), cases[i].points);
        assert_int_equal(json_array_size(json_object_get(j, "readings")), 0);
        assert_int_equal(json_object_get(j, "linearity") != NULL, i == 0);
        json_decref(j);
    }
}

/* Miller and Miller, chapter 5; t from t_critical.csv; four replicates given one by one. */
static void fluorescein_is_read_with_its_expanded_uncertainty(void **state)
{
    char path[256];
    const char *const words[] = { reference("cal_fluorescein.csv", path),
                                  "--model=line",
                                  "--json",
                                  "--read",
                                  "2.9,13.3/13.7/13.5/13.5,30",
                                  NULL };
    json_t *j = object(words);
    const json_t *readings = json_object_get(j, "readings"), *r = json_array_get(readings, 0);
    const json_t *four = json_array_get(readings, 1), *beyond = json_array_get(readings, 2);
    const char *const file = "cal_results.csv", *const set = "fluorescein";

    (void)state;
    assert_int_equal(json_array_size(readings), 3);
    check_close("y", number(r, "y"), 2.9, 0);
    check_digits("x", number(r, "x"), reference_value(file, set, "x0(y0=2.9)", "recomputed"), 12);
    check_digits("u", number(r, "standard_uncertainty"),
                 reference_value(file, set, "s_x0(y0=2.9; m=1)", "recomputed"), 12);
    check_digits("U", number(r, "expanded_uncertainty"),
                 reference_value(file, set, "ci95_halfwidth(y0=2.9; m=1)", "recomputed"), 10);
    check_digits("t", number(r, "coverage_factor"),
                 reference_value("t_critical.csv", "5", NULL, "p0.975"), 11);
    assert_true(json_is_true(json_object_get(r, "between_standards")));
    check_close("y", number(four, "y"), 13.5, 1e-14);
    check_digits("u, m = 4", number(four, "standard_uncertainty"),
                 reference_value(file, set, "s_x0(y0=13.5; m=4)", "recomputed"), 12);
    assert_true(json_is_false(json_object_get(beyond, "between_standards")));
    const json_t *l = json_object_get(j, "linearity");
    assert_string_equal(json_string_value(json_object_get(l, "test")), "mandel");
    check_digits("Mandel", number(l, "statistic"),
                 reference_value(file, set, "mandel_test_value", "recomputed"), 10);
    assert_true(json_is_true(json_object_get(l, "pass")));
    const json_t *p = json_array_get(json_object_get(j, "points"), 2); /* 4, 9.0 */
    const double b0 = reference_value(file, set, "intercept", "recomputed");
    const double b1 = reference_value(file, set, "slope", "recomputed");
    check_close("residual", number(p, "residual"), 9.0 - b0 - 4 * b1, 1e-13);
    check_close("back", number(p, "back_calculated"), (9.0 - b0) / b1, 1e-13);
    json_decref(j);
}

/* DIN 38402-51 B.1: 572 against 10.6; the verdict is "no", the exit status is 0 all the same. */
static void a_bent_curve_fails_linearity_and_exits_0(void **state)
{
    char path[256];
    const char *const words[] = { reference("cal_din38402_b1.csv", path), "--model", "line",
                                  "--json", NULL };
    json_t *j = object(words);
    const json_t *l = json_object_get(j, "linearity");

    (void)state;
    check_close("statistic", number(l, "statistic"), 572, 0.5);
    check_close("critical", number(l, "critical"), 10.6, 0.05);
    assert_true(json_is_false(json_object_get(l, "pass")));
    assert_true(number(l, "p") < 1e-8);
    json_decref(j);
}

/* A file of the test's own; removed by its maker. */
static const char *written(const char *text, size_t n, char path[64])
{
    strcpy(path, "/tmp/sm-fit-csv-XXXXXX");
    const int fd = mkstemp(path);

    assert_true(fd >= 0);
    assert_int_equal(write(fd, text, n), n);
    close(fd);
    return path;
}

static void an_electrode_gets_slope_offset_and_zero_point(void **state)
{
    /* 20 °C: 58.1672425292 mV per pH (nernst_slope.csv); s = 0.97, 6 mV at pH 7, no noise to speak
     * of */
    static const char *const temperatures[] = { "20", "20 °C" };
    const double k = reference_value("nernst_slope.csv", "20", NULL, "slope_mV");
    static const double ph[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };
    char csv[512], path[64];
    size_t n = (size_t)snprintf(csv, sizeof csv, "pH;mV\n");

    (void)state;
    for (size_t i = 0; i < COUNT(ph); i++)
        n += (size_t)snprintf(csv + n, sizeof csv - n, "%.2f;%.12f\n", ph[i],
                              6 - 0.97 * k * (ph[i] - 7));
    written(csv, n, path);
    for (size_t i = 0; i < COUNT(temperatures); i++) {
        const char *const words[] = { path,   "--model",       "nernst",        "--read",
                                      "6 mV", "--temperature", temperatures[i], "--json",
                                      NULL };
        json_t *j = object(words);
        const json_t *c = json_object_get(j, "coefficients");
        check_close("slope %", number(j, "slope_percent"), 97, 1e-8);
        check_close("offset", number(j, "offset_mv"), 6, 1e-8);
        check_close("zero point", number(j, "zero_point_ph"), 7 + 6 / (0.97 * k), 1e-9);
        check_close("slope", number(json_array_get(c, 1), "value"), -0.97 * k, 1e-8);
        check_close("intercept", number(json_array_get(c, 0), "value"), 6 + 0.97 * k * 7, 1e-8);
        check_close("pH", number(json_array_get(json_object_get(j, "readings"), 0), "x"), 7, 1e-9);
        json_decref(j);
    }
    unlink(path);
}

static void a_reading_without_an_x_has_none_in_the_object(void **state)
{
    static const char csv[] = "x,y\n1,5.5\n2,10.9\n3,14.6\n4,16.9\n5,18.6\n";
    char path[64];
    const char *const words[] = {
        written(csv, strlen(csv), path), "--model", "quadratic", "--read", "30", "--json", NULL
    };
    json_t *j = object(words);
    const json_t *r = json_array_get(json_object_get(j, "readings"), 0);

    (void)state;
    unlink(path);
    assert_null(json_object_get(r, "x"));
    assert_null(json_object_get(r, "standard_uncertainty"));
    assert_true(json_is_false(json_object_get(r, "between_standards")));
    check_digits("t", number(r, "coverage_factor"),
                 reference_value("t_critical.csv", "2", NULL, "p0.975"), 11);
    json_decref(j);
}

static void the_page_of_text_has_standards_first_and_r_squared_last(void **state)
{
    char path[256];
    const char *const words[] = {
        reference("cal_fluorescein.csv", path), "--model", "line", "--read", "13.5,30", NULL
    };
    const struct said s = run(words);
    static const char *const order[] = { "line: intensity against conc_pg_mL",
                                         "7 points at 7 levels, 5 degrees of freedom",
                                         "read back",
                                         "6.20722",
                                         "            30  ",
                                         "no result: above the highest standard, 12\n",
                                         "slope         1.9303571 ± 0.0409",
                                         "residual SD   0.4328",
                                         "no bend found: F = 1.561, limit 21.2 at 99 %",
                                         "R squared     0.997760\n" };
    const char *at = s.out;

    (void)state;
    assert_int_equal(s.status, 0);
    for (size_t i = 0; i < COUNT(order); i++) {
        const char *found = strstr(at, order[i]);
        if (found == NULL)
            fail_msg("\"%s\" is not in, or not in its place:\n%s", order[i], s.out);
        at = found + strlen(order[i]);
    }
    assert_string_equal(at, "");
    forget(s);
}

static void what_cannot_be_done_is_one_line_and_exit_2(void **state)
{
    static const struct {
        const char *csv; /* NULL: none written, the first word is the file */
        const char *words[6];
        const char *want;
    } cases[] = {
        { NULL, { NULL }, "a CSV file is needed" },
        { NULL,
          { "/nonexistent.csv", "--model", "line" },
          "/nonexistent.csv: cannot be read: No such" },
        { NULL, { "/tmp", "--model", "line" }, "cannot be read" },
        { NULL, { "a.csv" }, "--model is needed" },
        { NULL, { "a.csv", "--model" }, "--model needs a value" },
        { NULL, { "a.csv", "--model", "cubic" }, "got \"cubic\"" },
        { NULL, { "a.csv", "--model", "log-line" }, "not possible yet" },
        { NULL, { "a.csv", "--model", "log-offset" }, "not possible yet" },
        { NULL, { "a.csv", "--model", "as-read" }, "nothing to fit" },
        { NULL,
          { "a.csv", "--model", "line", "--weights", "1/x2" },
          "--weights 1/x2: not possible yet" },
        { NULL, { "a.csv", "--model", "line", "--weights", "x" }, "got \"x\"" },
        { NULL, { "a.csv", "--model", "line", "--method", "ph" }, "--method: not possible yet" },
        { NULL, { "a.csv", "--model", "nernst" }, "needs --temperature" },
        { NULL, { "a.csv", "--model", "nernst", "--temperature", "20 mV" }, "got \"20 mV\"" },
        { NULL, { "a.csv", "--model", "nernst", "--temperature", "293" }, "from -20 °C to 150 °C" },
        { NULL,
          { "a.csv", "--model", "line", "--read", "1,,2" },
          "--read: expected a number, got \"\"" },
        { NULL, { "a.csv", "--model", "line", "--read", "1/" }, "got \"\"" },
        { NULL, { "a.csv", "--model", "line", "--read", "1 mV" }, "got \"1 mV\"" },
        { NULL, { "a.csv", "--model", "line", "--model", "line" }, "given twice" },
        { NULL, { "a.csv", "b.csv", "--model", "line" }, "\"b.csv\" is not understood" },
        { NULL, { "a.csv", "--modell", "line" }, "\"--modell\" is not understood" },
        { "x,y\n1,2\n2,4.1\n",
          { "--model", "line" },
          "line needs at least 3 points at 3 different x; there are 2 at 2" },
        { "x,y\n1,2\n2,4.1\n1,2.1\n2,4\n", { "--model", "line" }, "there are 4 at 2" },
        { "x,y\n1,2\n2,4.1\n3\n", { "--model", "line" }, ":4: " },
        { "x,y\n1,2\n2,four\n3,1\n", { "--model", "line" }, ":3: " },
        { "x,y\n1,2\n2,nan\n3,1\n", { "--model", "line" }, ":3: " },
        { "x,y\n1,2\n2,\x1b[2J\n3,1\n", { "--model", "line" }, ":3: a control character" },
        { NULL, { "a.csv", "--model", "\x1b[2J" }, "got \"\\x1b[2J\"" },
        { "", { "--model", "line" }, "csv" },
        { "x,y\n1e308,2\n-1e308,4.1\n1e307,1\n", { "--model", "line" }, "too far apart" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const char *words[8] = { NULL };
        size_t n = 0;
        char path[64] = "";
        if (cases[i].csv != NULL)
            words[n++] = written(cases[i].csv, strlen(cases[i].csv), path);
        for (size_t k = 0; k < 6 && cases[i].words[k] != NULL; k++)
            words[n++] = cases[i].words[k];
        const struct said s = run(words);
        const char *end = strchr(s.err, '\n');
        if (s.status != 2 || strstr(s.err, cases[i].want) == NULL || s.out[0] != '\0' ||
            end == NULL || end[1] != '\0' || strchr(s.err, '\x1b') != NULL)
            fail_msg("case %zu: status %d, want 2 and \"%s\"; error \"%s\", output \"%s\"", i,
                     s.status, cases[i].want, s.err, s.out);
        forget(s);
        if (path[0] != '\0')
            unlink(path);
    }
}

static void twenty_thousand_points_pass_and_one_more_does_not(void **state)
{
    const size_t cap = 20002 * 20;
    char *csv = malloc(cap), path[64];
    size_t n = 0;

    (void)state;
    assert_non_null(csv);
    for (unsigned i = 0; i < 20000; i++) /* no header: numbers from the first row on */
        n += (size_t)snprintf(csv + n, cap - n, "%u.5,%u.%u\n", i, 2 * i, i % 10);
    const char *const words[] = { written(csv, n, path), "--model", "quadratic", "--json", NULL };
    json_t *j = object(words);
    assert_int_equal(json_array_size(json_object_get(j, "points")), 20000);
    json_decref(j);
    unlink(path);
    n += (size_t)snprintf(csv + n, cap - n, "1,2\n");
    written(csv, n, path);
    const struct said s = run(words);
    assert_int_equal(s.status, 2);
    if (strstr(s.err, ":20001: more than 20000 points") == NULL)
        fail_msg("%s", s.err);
    forget(s);
    unlink(path);
    free(csv);
}

static void help_names_every_option(void **state)
{
    static const char *const options[] = { "--model", "--weights", "--read", "--temperature",
                                           "--json" };
    const char *const words[] = { "--help", NULL };
    const struct said s = run(words);

    (void)state;
    assert_int_equal(s.status, 0);
    for (size_t i = 0; i < COUNT(options); i++)
        assert_non_null(strstr(s.out, options[i]));
    forget(s);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(nist_sets_come_out_of_the_command_to_nine_digits),
        cmocka_unit_test(fluorescein_is_read_with_its_expanded_uncertainty),
        cmocka_unit_test(a_bent_curve_fails_linearity_and_exits_0),
        cmocka_unit_test(an_electrode_gets_slope_offset_and_zero_point),
        cmocka_unit_test(a_reading_without_an_x_has_none_in_the_object),
        cmocka_unit_test(the_page_of_text_has_standards_first_and_r_squared_last),
        cmocka_unit_test(what_cannot_be_done_is_one_line_and_exit_2),
        cmocka_unit_test(twenty_thousand_points_pass_and_one_more_does_not),
        cmocka_unit_test(help_names_every_option),
    };
    gsl_set_error_handler_off();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
