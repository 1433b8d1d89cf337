/* SPDX-License-Identifier: GPL-3.0-or-later */
/* capture_output.h: a command of `stillmark` run inside a test, and what it wrote. */
#ifndef SM_TEST_CAPTURE_OUTPUT_H
#define SM_TEST_CAPTURE_OUTPUT_H
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

/* Everything written to the stream since, NUL-terminated; the caller frees it. */
static inline char *capture_take(FILE *f)
{
    const long n = (fseek(f, 0, SEEK_END), ftell(f));
    char *text = malloc((size_t)n + 1);

    assert_true(n >= 0 && text != NULL);
    rewind(f);
    assert_int_equal(fread(text, 1, (size_t)n, f), n);
    text[n] = '\0';
    fclose(f);
    return text;
}

/* The words in argv[argc], up to a NULL. */
static inline int capture_run(int (*command)(int argc, char **argv), char **argv, char **ret_out,
                              char **ret_err)
{
    FILE *o = tmpfile(), *e = tmpfile();
    const int out = dup(STDOUT_FILENO), err = dup(STDERR_FILENO);
    int argc = 0, status;

    assert_true(o != NULL && e != NULL && out >= 0 && err >= 0);
    while (argv[argc] != NULL)
        argc++;
    fflush(stdout);
    fflush(stderr);
    dup2(fileno(o), STDOUT_FILENO);
    dup2(fileno(e), STDERR_FILENO);
    status = command(argc, argv);
    fflush(stdout);
    fflush(stderr);
    dup2(out, STDOUT_FILENO);
    dup2(err, STDERR_FILENO);
    close(out);
    close(err);
    *ret_out = capture_take(o);
    *ret_err = capture_take(e);
    return status;
}
#endif
