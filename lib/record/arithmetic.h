/* SPDX-License-Identifier: GPL-3.0-or-later */
/* arithmetic.h: what this machine's arithmetic is like, as a hash. */
#ifndef SM_RECORD_ARITHMETIC_H
#define SM_RECORD_ARITHMETIC_H
/* SHA-256 (hex, first 16 digits) over exp, log, pow, erfc and two GSL quantiles at 1,000 fixed
 * arguments, written to 17 digits, with the GSL version. All zeros: no memory (two such do not
 * agree). The compiler's constant folding plays no part: arguments are computed. */
void sm_arithmetic(char ret_hex[17]);
#endif
