/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_replay_trace.c: the command `stillmark-replay trace` as a script sees it. */
#include "replay_trace.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "check.h"

#define WORDS_MAX 12
#define HEADER "moved_s,captured_s,value,expanded_uncertainty,readings\n"

static char path[] = "/tmp/sm-trace-XXXXXX";
static char out[4096], err[4096];

static void slurp(int fd, char *text, size_t cap)
{
    const ssize_t n = pread(fd, text, cap - 1, 0);

    assert_true(n >= 0);
    text[n] = '\0';
    close(fd);
}

static int scratch(void)
{
    char name[] = "/tmp/sm-trace-out-XXXXXX";
    const int fd = mkstemp(name);

    assert_true(fd >= 0);
    unlink(name);
    return fd;
}

/* Runs the command with the words up to NULL; "FILE" stands for the recording. */
static int run(const char *const *words)
{
    char *argv[WORDS_MAX];
    int argc = 0, saved[2], got[2] = { scratch(), scratch() }, status;

    for (; words[argc] != NULL; argc++)
        argv[argc] = strdup(strcmp(words[argc], "FILE") == 0 ? path : words[argc]);
    fflush(stdout);
    fflush(stderr);
    for (int i = 0; i < 2; i++) {
        saved[i] = dup(STDOUT_FILENO + i);
        dup2(got[i], STDOUT_FILENO + i);
    }
    status = sm_replay_trace(argc, argv);
    fflush(stdout);
    fflush(stderr);
    for (int i = 0; i < 2; i++) {
        dup2(saved[i], STDOUT_FILENO + i);
        close(saved[i]);
    }
    slurp(got[0], out, sizeof out);
    slurp(got[1], err, sizeof err);
    while (argc > 0)
        free(argv[--argc]);
    return status;
}

static void record(const char *text)
{
    FILE *f = fopen(path, "w");

    assert_non_null(f);
    assert_true(fputs(text, f) >= 0);
    assert_int_equal(fclose(f), 0);
}

/* One reading/s, 12.3 for a minute, then 45.6 for a minute. */
static void record_two(void)
{
    FILE *f = fopen(path, "w");

    assert_non_null(f);
    fputs("time_s,value\n", f);
    for (int i = 0; i < 120; i++)
        fprintf(f, "%d,%s\n", i, i < 60 ? "12.3" : "45.6");
    assert_int_equal(fclose(f), 0);
}

static void check_text(const char *what, const char *got, const char *want)
{
    if (strcmp(got, want) != 0)
        fail_msg("%s:\n  got  %s\n  want %s", what, got, want);
}

static void a_row_per_capture_follows_the_header(void **state)
{
    static const char *const words[][8] = {
        { "FILE", "--tolerance", "0.6 mV", "--rule", "spread", NULL },
        { "--rule=spread", "--tolerance=0.6", "FILE", "--dwell=22", "--over", "20 s", NULL },
        { "FILE", "--tolerance", "0.6 mV", "--rule", "spread", "--value", "window", NULL },
    };

    (void)state;
    record_two();
    for (size_t i = 0; i < COUNT(words); i++) {
        assert_int_equal(run(words[i]), 0);
        check_text("standard error", err, "");
        /* 2 × 0.1 / sqrt 12 = 0.0577350269189626 */
        check_text("rows", out,
                   HEADER "0,22,12.3,0.05773502691896258,21\n60,82,45.6,0.05773502691896258,21\n");
    }
}

static void dwell_over_and_longest_wait_are_obeyed(void **state)
{
    static const char *const quick[] = { "FILE",    "--tolerance", "0.6",    "--rule", "spread",
                                         "--dwell", "5 s",         "--over", "3 s",    NULL };
    static const char *const late[] = { "FILE",    "--tolerance", "0.6",    "--rule", "spread",
                                        "--dwell", "1 min",       "--over", "3 s",    NULL };
    static const char *const never[] = {
        "FILE",         "--tolerance",         "0.6", "--rule", "spread",
        "--dwell=22 s", "--longest-wait=22 s", NULL
    };

    (void)state;
    record_two();
    assert_int_equal(run(quick), 0);
    check_text("quick", out,
               HEADER "0,5,12.3,0.05773502691896258,4\n60,65,45.6,0.05773502691896258,4\n");
    assert_int_equal(run(late), 0);
    check_text("late", out, HEADER);
    assert_int_equal(run(never), 0);
    check_text("never", out, HEADER);
}

static void what_cannot_be_done_is_said_in_one_line_with_status_2(void **state)
{
    static const struct {
        const char *words[8];
        const char *say; /* begins with */
    } cases[] = {
        { { NULL }, "stillmark-replay trace: which file?" },
        { { "FILE", NULL }, "stillmark-replay trace: --tolerance is needed" },
        { { "FILE", "--tolerance", "1", NULL },
          "stillmark-replay trace: --rule is needed until the rule arrival exists" },
        { { "FILE", "--tolerance", "1", "--rule", "arrival", NULL },
          "stillmark-replay trace: --rule arrival: not possible yet" },
        { { "FILE", "--tolerance", "1", "--rule", "drift", NULL },
          "stillmark-replay trace: --rule drift: not possible yet" },
        { { "FILE", "--tolerance", "1", "--rule", "range", NULL },
          "stillmark-replay trace: --rule: expected" },
        { { "FILE", "--tolerance", "0", "--rule", "spread", NULL },
          "stillmark-replay trace: --tolerance: expected" },
        { { "FILE", "--tolerance", "x", "--rule", "spread", NULL },
          "stillmark-replay trace: --tolerance: expected" },
        { { "FILE", "--tolerance", "1 parsec", "--rule", "spread", NULL },
          "stillmark-replay trace: --tolerance: expected" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--doubt", "0 %", NULL },
          "stillmark-replay trace: --doubt: expected" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--dwell", "5 mV", NULL },
          "stillmark-replay trace: --dwell: expected" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--over", "0 s", NULL },
          "stillmark-replay trace: --over: expected" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--value", "end", NULL },
          "stillmark-replay trace: --value end: not possible yet" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--readings", "1", NULL },
          "stillmark-replay trace: --readings: expected" },
        { { "FILE", "--tolerance", "1", "--rule", "spread", "--longest-wait", "10 s", NULL },
          "stillmark-replay trace: --longest-wait is shorter" },
        { { "FILE", "--tolerance", "1", "--tolerance", "2", NULL },
          "stillmark-replay trace: --tolerance is given twice" },
        { { "FILE", "--tolerance", NULL }, "stillmark-replay trace: --tolerance needs a value" },
        { { "FILE", "--speed", "2", NULL }, "stillmark-replay trace: \"--speed\" is not" },
        { { "FILE", "FILE", NULL }, "stillmark-replay trace: \"/tmp/" },
        { { "/nowhere/x.csv", "--tolerance", "1", "--rule", "spread", NULL },
          "/nowhere/x.csv: No such file" },
        { { "/tmp", "--tolerance", "1", "--rule", "spread", NULL }, "/tmp: " },
    };

    (void)state;
    record_two();
    for (size_t i = 0; i < COUNT(cases); i++) {
        const int status = run(cases[i].words);
        const char *end = strchr(err, '\n');

        if (status != 2 || strncmp(err, cases[i].say, strlen(cases[i].say)) != 0)
            fail_msg("case %zu: status %d, said \"%s\", want \"%s…\"", i, status, err,
                     cases[i].say);
        if (end == NULL || end[1] != '\0' || out[0] != '\0')
            fail_msg("case %zu: more than one line: %s%s", i, err, out);
    }
}

static void a_bad_row_is_an_error_with_its_line(void **state)
{
    static const struct {
        const char *text, *say; /* behind the file's name */
    } cases[] = {
        { "t,v\n0,1\n1,2\n0.5,3\n", ":4: the time goes back" },
        { "t,v\n0,1\nnan,2\n", ":3: column 1: expected a number" },
        { "t,v\n0,1\n1,nan\n", ":3: column 2: expected a number" },
        { "t,v\n0,1\n1e12,2\n", ":3: the time is too far from 0" },
        { "t,v\n0,1\n1\n", ":3: " },
        { "t,v\n0,1\n1,\n", ":3: " },
        { "", ":1: " },
    };
    static const char *const words[] = { "FILE", "--tolerance", "1", "--rule", "spread", NULL };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        record(cases[i].text);
        if (run(words) != 2 || strncmp(err, path, strlen(path)) != 0 ||
            strncmp(err + strlen(path), cases[i].say, strlen(cases[i].say)) != 0)
            fail_msg("case %zu: said \"%s\", want FILE%s", i, err, cases[i].say);
    }
}

static void equal_times_further_columns_and_decimal_commas_are_fine(void **state)
{
    static const char *const words[] = { "FILE", "--tolerance", "1", "--rule", "spread", NULL };
    FILE *f = fopen(path, "w");

    (void)state;
    assert_non_null(f);
    fputs("when;what;more\n", f);
    for (int i = 0; i <= 50; i++)
        fprintf(f, "%d,5;7,%d;x\n", i / 2, i % 2);
    assert_int_equal(fclose(f), 0);
    assert_int_equal(run(words), 0);
    assert_int_equal(strncmp(out, HEADER "0.5,22.5,7.0", strlen(HEADER "0.5,22.5,7.0")), 0);
}

static void help_says_what_there_is(void **state)
{
    static const char *const words[] = { "--help", NULL };

    (void)state;
    assert_int_equal(run(words), 0);
    assert_non_null(strstr(out, "--tolerance"));
    assert_non_null(strstr(out, "simulated signals"));
    check_text("standard error", err, "");
}

static int make(void **state)
{
    const int fd = mkstemp(path);

    (void)state;
    return fd < 0 || close(fd) != 0;
}

static int clear(void **state)
{
    (void)state;
    return unlink(path);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_row_per_capture_follows_the_header),
        cmocka_unit_test(dwell_over_and_longest_wait_are_obeyed),
        cmocka_unit_test(what_cannot_be_done_is_said_in_one_line_with_status_2),
        cmocka_unit_test(a_bad_row_is_an_error_with_its_line),
        cmocka_unit_test(equal_times_further_columns_and_decimal_commas_are_fine),
        cmocka_unit_test(help_says_what_there_is),
    };

    return cmocka_run_group_tests(tests, make, clear);
}
