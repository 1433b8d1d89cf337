/* SPDX-License-Identifier: GPL-3.0-or-later */
/* number.h: numbers read and written the same wherever the machine thinks it is. */
#ifndef SM_BASE_NUMBER_H
#define SM_BASE_NUMBER_H
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define SM_NUMBER_SIZE 32

/* The whole of s[n] as a finite decimal number: sign, digits, one point, exponent; no spaces, no
 * hex, no "inf" or "nan".
 *   SM_ESYNTAX  not of that form, or longer than 63 bytes
 *   SM_EVALUE   too large for a double (one too small for a double reads as the nearest, which may
 *               be 0) */
SM_MUST_CHECK enum sm_status sm_number_parse(const char *s, size_t n, double *ret_value);

/* Bytes of the longest such number at the head of s[n], of any length; 0 where there is none. */
size_t sm_number_span(const char *s, size_t n);

/* The whole of s[n] as a whole number, sign and digits, -2^63 … 2^63-1.
 *   SM_ESYNTAX, SM_EVALUE  as above */
SM_MUST_CHECK enum sm_status sm_integer_parse(const char *s, size_t n, int64_t *ret_value);

/* v with the fewest of 15 to 17 significant digits that read back as the same double, in a form
 * that is also JSON (RFC 8259). v must be finite (asserted). Returns the length. */
size_t sm_number_write(char out[SM_NUMBER_SIZE], double v);

/* The step that the digits of a number imply: "-0012.40" 0.01, "7" 1, "1.2e-3" 0.0001. s[n] must
 * parse; else 0, as where the step is outside the range of a double. */
double sm_number_step(const char *s, size_t n);
#endif
