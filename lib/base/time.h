/* SPDX-License-Identifier: GPL-3.0-or-later */
/* time.h: the two clocks. `t_ns`: int64_t ns since the log file was opened, on a clock that never
 * steps, for arithmetic. `utc_us`: int64_t µs since 1970-01-01T00:00:00Z, for people. */
#ifndef SM_BASE_TIME_H
#define SM_BASE_TIME_H
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define SM_NS_PER_S INT64_C(1000000000)
#define SM_NS_PER_MS INT64_C(1000000)
#define SM_US_PER_DAY INT64_C(86400000000)
#define SM_NEVER INT64_MAX /* a deadline that does not exist */
#define SM_UTC_SIZE 28     /* "2026-12-01T08:13:24.567890Z" and its NUL */

/* RFC 3339 with six decimals and Z; years 0000 to 9999 (asserted). Returns the length, 27. */
size_t sm_utc_write(char out[SM_UTC_SIZE], int64_t utc_us);

/* RFC 3339: "T" or "t" (or one space), 0 to 9 decimals (cut to µs), "Z", "z" or ±hh:mm; a leap
 * second
 * (:60, only as the last second of a UTC month) reads as the second after it. What is read can be
 * written.
 *   SM_ESYNTAX  anything else: a day that does not exist, or not in years 0000 to 9999 of UTC */
SM_MUST_CHECK enum sm_status sm_utc_parse(const char *s, size_t n, int64_t *ret_utc_us);

/* Whole days since 1970-01-01, downwards. */
int64_t sm_utc_day(int64_t utc_us);

/* A calendar date "2027-03-31" as days since 1970-01-01. SM_ESYNTAX otherwise. */
SM_MUST_CHECK enum sm_status sm_date_parse(const char *s, size_t n, int64_t *ret_day);
#endif
