/* SPDX-License-Identifier: GPL-3.0-or-later */
/* check.h: what every test needs: cmocka, and a comparison of doubles whose failure can be read. */
#ifndef SM_CHECK_H
#define SM_CHECK_H
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
/* cmocka wants the four above first */
#include <cmocka.h>
#include <stdbool.h>

#define COUNT(a) (sizeof(a) / sizeof((a)[0]))

/* Fails unless |got - want| <= tol; NaN fails. */
void check_close(const char *what, double got, double want, double tol);

/* Fails unless got and want agree to so many significant digits, by NIST's log relative error:
 * -log10(|got - want| / |want|) >= digits. */
void check_digits(const char *what, double got, double want, double digits);

/* The whole file below the source tree, NUL-terminated, in storage the caller frees; fails the test
 * when it cannot be read. */
char *check_read_file(const char *path_from_source_dir, size_t *ret_n);
#endif
