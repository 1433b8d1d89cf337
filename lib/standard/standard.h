/* SPDX-License-Identifier: GPL-3.0-or-later */
/* standard.h: standards with their lots, and the value each has at a temperature: from its
 * certificate, else from a published table. */
#ifndef SM_STANDARD_STANDARD_H
#define SM_STANDARD_STANDARD_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "base/text.h"
#include "base/unit.h"

#define SM_STANDARDS_MAX 64
#define SM_TABLE_ROWS_MAX 64
#define SM_TABLE_COLUMNS_MAX 16
#define SM_CERTIFICATE_MAX 16
#define SM_CERTIFICATE_WITHIN_C                                                                    \
    1.0 /* a single certificate value holds this far from its temperature */

/* Values against temperature, °C rising. */
struct sm_table {
    char name[SM_NAME_SIZE];   /* the file */
    char source[SM_NAME_SIZE]; /* published source, from its head */
    enum sm_unit unit;
    size_t n_rows, n_columns;
    char column[SM_TABLE_COLUMNS_MAX][SM_NAME_SIZE];
    double t_c[SM_TABLE_ROWS_MAX];
    double value[SM_TABLE_ROWS_MAX][SM_TABLE_COLUMNS_MAX]; /* NaN: no value there */
};

struct sm_standard {
    char name[SM_NAME_SIZE];
    char lot[SM_NAME_SIZE];
    bool has_expires, has_opened;
    int64_t expires_day, opened_day; /* days since 1970-01-01; the last good day */
    enum sm_unit unit;
    size_t n_values; /* certificate: temperature rising; 0: use the table. A value without a
                      * temperature (concentration) has t_c NaN and stands alone */
    double t_c[SM_CERTIFICATE_MAX], value[SM_CERTIFICATE_MAX];
    double u;         /* expanded (k = 2) as stated on the certificate, in `unit`; 0 = not stated */
    int table_column; /* -1: none */
};

struct sm_standards {
    struct sm_table table; /* n_rows 0: none */
    size_t n;
    struct sm_standard list[SM_STANDARDS_MAX];
};

/* Index by name, or -1. */
int sm_standards_find(const struct sm_standards *s, const char *name);

/* Value of standard i at t_c (°C), linear between the neighbours in temperature. The first and the
 * last certificate value, and so a single one, hold SM_CERTIFICATE_WITHIN_C further; a table ends
 * at its ends. A standard that has certificate values never falls back on the table.
 *   SM_EINVAL  no value for this temperature: ret_why says what there is */
SM_MUST_CHECK enum sm_status sm_standard_value(const struct sm_standards *s, size_t i, double t_c,
                                               double *ret_value, char ret_why[SM_REASON_SIZE]);

/* Reads a table: CSV, `#` lines at the head of which one is "# source: …" and one "# unit: pH",
 * then "t_C,NAME,…", then rows; an empty cell is no value. Pure.
 *   SM_ESYNTAX  ret_line, ret_why (the first fault); no source or no unit named is one
 *   SM_EFULL    more rows or columns than fit: ret_line, ret_why
 * `name` is left empty: the file's name is the caller's. */
SM_MUST_CHECK enum sm_status sm_table_parse(const char *text, size_t n, struct sm_table *ret_table,
                                            unsigned *ret_line, char ret_why[SM_REASON_SIZE]);
#endif
