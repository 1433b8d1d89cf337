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
    unsigned line; /* of the row given last, or of what was wrong */
    unsigned next_line;
    char separator;                /* ',' ';' or tab, found from the header */
    char mark;                     /* the decimal mark met first, '.' or ','; 0 = none yet */
    bool decimal_comma;            /* mark is ','; only where the separator is ; or tab */
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

/* Reads a BOM, `#` and empty lines and the header: a first row whose first two cells are no numbers
 * and not both what stands for one (empty, nan, "1.2.3"). Blanks around cells do not count.
 *   SM_ESYNTAX  ret_why, with the line in c->line */
SM_MUST_CHECK enum sm_status sm_csv_begin(struct sm_csv *c, const char *text, size_t n,
                                          char ret_why[SM_REASON_SIZE]);

/* The next row. CRLF, quotes (RFC 4180) and blank last lines are fine. After a row with wrong
 * values the next can be asked for; after one whose quotes are wrong the text has ended.
 *   SM_ESHORT   no more rows
 *   SM_ESYNTAX  a wrong number of fields, or no number: nan, inf, empty, too large, a decimal mark
 *               other than that of the rows before, a negative ux or uy; or text that is no CSV */
SM_MUST_CHECK enum sm_status sm_csv_next(struct sm_csv *c, struct sm_csv_row *ret_row,
                                         char ret_why[SM_REASON_SIZE]);

/* One cell for output (RFC 4180): quoted where needed; a cell that starts with = + - @ and is no
 * number gets a leading apostrophe; control characters become spaces. */
void sm_csv_cell(struct sm_text *t, const char *cell);
#endif
