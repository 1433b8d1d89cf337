/* SPDX-License-Identifier: GPL-3.0-or-later */
/* reference.h: values and data sets out of the CSV files beside it, each of which names its source.
 */
#ifndef SM_REFERENCE_H
#define SM_REFERENCE_H
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"

#define REFERENCE_LINE 1024

/* Copies the line at *at into out and moves *at past it; false at the end. */
static inline bool reference_line(const char **at, char out[REFERENCE_LINE])
{
    const char *end = strchr(*at, '\n');
    const size_t n = end != NULL ? (size_t)(end - *at) : strlen(*at);

    if (**at == '\0')
        return false;
    if (n >= REFERENCE_LINE) { /* a long source line: of no use here */
        out[0] = '#';
        out[1] = '\0';
    } else {
        memcpy(out, *at, n);
        out[n] = '\0';
    }
    *at += n + (end != NULL ? 1 : 0);
    return true;
}

/* Cell i (from 0) of a line without quotes, "" where there is none. */
static inline void reference_cell(const char *line, size_t i, char out[REFERENCE_LINE])
{
    for (; i > 0 && line != NULL; i--) {
        line = strchr(line, ',');
        line = line != NULL ? line + 1 : NULL;
    }
    out[0] = '\0';
    if (line != NULL) {
        const size_t n = strcspn(line, ",");
        memcpy(out, line, n);
        out[n] = '\0';
    }
}

/* The text of column `want` (its name in the header) in the row that begins with a and, unless it
 * is NULL, has b in its second column; fails the test where there is none. */
static inline void reference_text(const char *file, const char *a, const char *b, const char *want,
                                  char out[REFERENCE_LINE])
{
    char path[256], line[REFERENCE_LINE], cell[REFERENCE_LINE], second[REFERENCE_LINE];
    size_t column = 0;
    bool header = false;

    snprintf(path, sizeof path, "tests/reference/%s", file);
    char *text = check_read_file(path, NULL);
    const char *at = text;
    while (reference_line(&at, line)) {
        if (line[0] == '#')
            continue;
        if (!header) {
            for (reference_cell(line, 0, cell); strcmp(cell, want) != 0;
                 reference_cell(line, ++column, cell))
                if (column > 32)
                    fail_msg("%s has no column %s", file, want);
            header = true;
            continue;
        }
        reference_cell(line, 0, cell);
        reference_cell(line, 1, second);
        if (strcmp(cell, a) == 0 && (b == NULL || strcmp(second, b) == 0)) {
            reference_cell(line, column, out);
            free(text);
            return;
        }
    }
    fail_msg("%s has no row %s,%s", file, a, b != NULL ? b : "");
}

static inline double reference_value(const char *file, const char *a, const char *b,
                                     const char *want)
{
    char cell[REFERENCE_LINE], *end;
    double v;

    reference_text(file, a, b, want, cell);
    v = strtod(cell, &end);
    if (end == cell || *end != '\0')
        fail_msg("%s, row %s,%s: %s is \"%s\", no number", file, a, b != NULL ? b : "", want, cell);
    return v;
}

/* The first two columns of a data set; returns their number. */
static inline size_t reference_pairs(const char *file, size_t cap, double *x, double *y)
{
    char path[256], line[REFERENCE_LINE], cell[REFERENCE_LINE];
    size_t n = 0;
    bool header = false;

    snprintf(path, sizeof path, "tests/reference/%s", file);
    char *text = check_read_file(path, NULL);
    const char *at = text;
    while (reference_line(&at, line)) {
        if (line[0] == '#')
            continue;
        if (header) {
            if (n == cap)
                fail_msg("%s: more than %zu rows", file, cap);
            reference_cell(line, 0, cell);
            x[n] = strtod(cell, NULL);
            reference_cell(line, 1, cell);
            y[n++] = strtod(cell, NULL);
        }
        header = true;
    }
    free(text);
    return n;
}
#endif
