/* SPDX-License-Identifier: GPL-3.0-or-later */
/* csv.h: x and y out of a CSV file that a person made: the first two columns whatever the header
 * calls them, and columns named ux or uy. Pure: works on text. */
#ifndef SM_BASE_CSV_H
#define SM_BASE_CSV_H
#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"
#include "base/text.h"

struct sm_csv {
    const char *text;
    size_t n, at;
    unsigned line;                 /* of the row given last */
    char separator;                /* ',' ';' or tab, found from the header */
    bool decimal_comma;            /* only where the separator is ; or tab */
    unsigned fields, ux_at, uy_at; /* from 1; 0 = not there */
    char x_name[SM_NAME_SIZE], y_name[SM_NAME_SIZE];
    bool header;
};

struct sm_csv_row {
    double x, y;
    bool has_ux, has_uy;
    double ux, uy;
    double y_step; /* display step implied by y's digits */
};

/* Reads a BOM, `#` lines and the header (a first row that is no numbers).
 *   SM_ESYNTAX  ret_why, with the line in c->line */
SM_MUST_CHECK enum sm_status sm_csv_begin(struct sm_csv *c, const char *text, size_t n,
                                          char ret_why[SM_REASON_SIZE]);

/* The next row. CRLF, quotes (RFC 4180) and blank last lines are fine.
 *   SM_ESHORT   no more rows
 *   SM_ESYNTAX  a row with a wrong number of fields or no number (nan and inf are no numbers) */
SM_MUST_CHECK enum sm_status sm_csv_next(struct sm_csv *c, struct sm_csv_row *ret_row,
                                         char ret_why[SM_REASON_SIZE]);

/* One cell for output (RFC 4180): quoted where needed; a cell that starts with = + - @ and is no
 * number gets a leading apostrophe; control characters become spaces. */
void sm_csv_cell(struct sm_text *t, const char *cell);
#endif
