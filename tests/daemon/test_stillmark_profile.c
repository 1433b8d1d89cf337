/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "check.h"
#include "stillmark_profile.h"

#define R_MV SM_SOURCE_DIR "/conf/profiles/r-mv.yaml"

/* Runs the command; what it wrote to standard output and error, in storage that the caller frees.
 */
static int run(int argc, char **argv, char **ret_out)
{
    FILE *f = tmpfile();
    const int out = dup(STDOUT_FILENO), err = dup(STDERR_FILENO);
    char *text = calloc(1, 1 << 16);
    int status;

    assert_true(f != NULL && text != NULL && out >= 0 && err >= 0);
    fflush(stdout);
    dup2(fileno(f), STDOUT_FILENO);
    dup2(fileno(f), STDERR_FILENO);
    status = sm_stillmark_profile(argc, argv);
    fflush(stdout);
    dup2(out, STDOUT_FILENO);
    dup2(err, STDERR_FILENO);
    close(out);
    close(err);
    rewind(f);
    (void)!fread(text, 1, (1 << 16) - 1, f);
    fclose(f);
    *ret_out = text;
    return status;
}

/* `stillmark profile PROFILE --try` a file with these bytes. */
static int try_bytes(const char *profile, const char *bytes, size_t n, char **ret_out)
{
    char lines[] = "/tmp/sm-lines-XXXXXX", path[512], try[] = "--try";
    char *argv[] = { path, try, lines };
    const int fd = mkstemp(lines);
    int status;

    assert_true(fd >= 0);
    assert_int_equal(write(fd, bytes, n), n);
    close(fd);
    snprintf(path, sizeof path, "%s", profile);
    status = run(3, argv, ret_out);
    unlink(lines);
    return status;
}

static void lines_that_are_read_are_shown_with_their_step(void **state)
{
    static const char bytes[] = "-0012.4 mV  24.8 C\r\n+0001.25 mV 9 C\rOVR mV 24.8 C\n";
    char *out;

    (void)state;
    assert_int_equal(try_bytes(R_MV, bytes, strlen(bytes), &out), 0);
    assert_string_equal(
        out, "1: potential -12.4 mV (step 0.1), probe 24.8 °C (step 0.1)   | -0012.4 mV  24.8 C\n"
             "2: potential 1.25 mV (step 0.01), probe 9 °C (step 1)   | +0001.25 mV 9 C\n"
             "3: potential over (\"OVR\"), probe 24.8 °C (step 0.1)   | OVR mV 24.8 C\n"
             "3 of 3 lines gave a reading\n");
    free(out);
}

static void a_line_that_gives_no_reading_says_why_and_reaches_no_terminal_raw(void **state)
{
    static const char bytes[] = "rub\x1b[2J\xff\r\n-1.0 mV 20 C";
    char *out;

    (void)state;
    assert_int_equal(try_bytes(R_MV, bytes, strlen(bytes), &out), 1);
    assert_non_null(strstr(out, "1: no reading: "));
    assert_non_null(strstr(out, "| rub\\x1b[2J\\xff\n"));
    assert_non_null(strstr(out, "(the last line has no end)\n2: potential -1 mV"));
    assert_non_null(strstr(out, "1 of 2 lines gave a reading\n"));
    assert_null(strchr(out, '\x1b'));
    free(out);
}

static void an_endless_line_is_one_line(void **state)
{
    const size_t n = 100000;
    char *bytes = malloc(n), *out;

    (void)state;
    assert_non_null(bytes);
    memset(bytes, '7', n);
    assert_int_equal(try_bytes(R_MV, bytes, n, &out), 1);
    assert_non_null(strstr(out, "1: no reading: the line is overlong"));
    assert_non_null(strstr(out, "0 of 1 lines gave a reading\n"));
    free(bytes);
    free(out);
}

static void a_meter_that_ends_lines_by_a_pause_is_tried_line_by_line(void **state)
{
    static const char bytes[] = "S0 - 1.2345E-2 V 24.8#94C7\n";
    char *out;

    (void)state;
    assert_int_equal(
        try_bytes(SM_SOURCE_DIR "/conf/profiles/pause-hex.yaml", bytes, strlen(bytes), &out), 0);
    assert_non_null(strstr(out, "potential -12.345 mV"));
    free(out);
}

static void what_cannot_be_done_ends_with_2_and_says_why(void **state)
{
    char profile[] = R_MV, none[] = "/tmp/sm-no-such-file", try[] = "--try", wrong[] = "--tyr";
    char method[] = SM_SOURCE_DIR "/conf/methods/ph-surface.yaml";
    struct {
        const char *name;
        int argc;
        char *argv[4];
        const char *says;
    } cases[] = {
        { "nothing", 0, { NULL }, "wanted: stillmark profile FILE --try LINES" },
        { "no lines", 1, { profile }, "wanted: stillmark profile FILE --try LINES" },
        { "no such profile", 3, { none, try, none }, "/tmp/sm-no-such-file: No such file" },
        { "no such lines", 3, { profile, try, none }, "/tmp/sm-no-such-file: No such file" },
        { "unknown option", 3, { profile, wrong, none }, "--tyr: not understood" },
        { "not a profile", 3, { method, try, profile }, "measures: no such key" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        char *out;
        const int status = run(cases[i].argc, cases[i].argv, &out);

        if (status != 2 || strstr(out, cases[i].says) == NULL)
            fail_msg("%s: exit %d, \"%s\"", cases[i].name, status, out);
        free(out);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(lines_that_are_read_are_shown_with_their_step),
        cmocka_unit_test(a_line_that_gives_no_reading_says_why_and_reaches_no_terminal_raw),
        cmocka_unit_test(an_endless_line_is_one_line),
        cmocka_unit_test(a_meter_that_ends_lines_by_a_pause_is_tried_line_by_line),
        cmocka_unit_test(what_cannot_be_done_ends_with_2_and_says_why),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
