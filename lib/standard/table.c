/* SPDX-License-Identifier: GPL-3.0-or-later */
/* table.c: a table of values against temperature, out of its CSV text. */
#include <math.h>
#include <string.h>

#include "base/number.h"
#include "standard/standard.h"

#define FIRST_COLUMN "t_C"

struct reader {
    const char *text;
    size_t n, at;
    unsigned line;
    struct sm_text why;
};

struct piece {
    const char *s;
    size_t n;
};

static struct piece trimmed(const char *s, size_t n)
{
    while (n > 0 && (s[0] == ' ' || s[0] == '\t'))
        s++, n--;
    while (n > 0 && (s[n - 1] == ' ' || s[n - 1] == '\t' || s[n - 1] == '\r'))
        n--;
    return (struct piece){ s, n };
}

/* The next line that is not blank. */
static bool next_line(struct reader *r, struct piece *ret_line)
{
    while (r->at < r->n) {
        const char *start = r->text + r->at;
        const char *end = memchr(start, '\n', r->n - r->at);
        const size_t n = end != NULL ? (size_t)(end - start) : r->n - r->at;

        r->at += n + (end != NULL ? 1 : 0);
        r->line++;
        *ret_line = trimmed(start, n);
        if (ret_line->n > 0)
            return true;
    }
    return false;
}

/* Cuts the first cell off `rest`; false when there is none left. */
static bool next_cell(struct piece *rest, struct piece *ret_cell)
{
    const char *comma;

    if (rest->s == NULL)
        return false;
    comma = memchr(rest->s, ',', rest->n);
    *ret_cell = trimmed(rest->s, comma != NULL ? (size_t)(comma - rest->s) : rest->n);
    if (comma == NULL) {
        rest->s = NULL;
    } else {
        rest->n -= (size_t)(comma - rest->s) + 1;
        rest->s = comma + 1;
    }
    return true;
}

static bool starts(struct piece line, const char *word, struct piece *ret_rest)
{
    const size_t n = strlen(word);

    if (line.n < n || memcmp(line.s, word, n) != 0)
        return false;
    *ret_rest = trimmed(line.s + n, line.n - n);
    return true;
}

static enum sm_status complain(struct reader *r, enum sm_status status, const char *what,
                               struct piece cell)
{
    sm_text_add(&r->why, what);
    if (cell.s != NULL) {
        sm_text_add(&r->why, ", got \"");
        sm_text_add_safe(&r->why, cell.s, cell.n < 40 ? cell.n : 40);
        sm_text_add(&r->why, "\"");
    }
    return status;
}

/* One `#` line of the head. */
static enum sm_status head_line(struct reader *r, struct piece line, struct sm_table *t)
{
    const struct piece text = trimmed(line.s + 1, line.n - 1);
    struct piece rest;

    if (starts(text, "source:", &rest)) {
        if (t->source[0] != '\0')
            return complain(r, SM_ESYNTAX, "a second source", (struct piece){ NULL, 0 });
        if (rest.n == 0 || rest.n >= sizeof t->source || sm_utf8_span(rest.s, rest.n) != rest.n ||
            memchr(rest.s, '\0', rest.n) != NULL)
            return complain(r, SM_ESYNTAX, "source: expected text of 1 to 259 bytes", rest);
        memcpy(t->source, rest.s, rest.n);
        t->source[rest.n] = '\0';
    } else if (starts(text, "unit:", &rest)) {
        if (t->unit != SM_UNIT_NONE || sm_unit_parse(rest.s, rest.n, &t->unit) != SM_OK ||
            t->unit == SM_UNIT_NONE)
            return complain(r, SM_ESYNTAX, "unit: expected one unit such as pH", rest);
    }
    return SM_OK;
}

static enum sm_status header(struct reader *r, struct piece line, struct sm_table *t)
{
    struct piece cell = { NULL, 0 };

    if (!next_cell(&line, &cell) || cell.n != strlen(FIRST_COLUMN) ||
        memcmp(cell.s, FIRST_COLUMN, cell.n) != 0)
        return complain(r, SM_ESYNTAX, "expected the first column to be t_C", cell);
    while (next_cell(&line, &cell)) {
        if (!sm_name_ok(cell.s, cell.n))
            return complain(r, SM_ESYNTAX, "expected the name of a column", cell);
        if (t->n_columns == SM_TABLE_COLUMNS_MAX)
            return complain(r, SM_EFULL, "more than 16 columns", (struct piece){ NULL, 0 });
        char *name = t->column[t->n_columns];
        memcpy(name, cell.s, cell.n);
        name[cell.n] = '\0';
        for (size_t i = 0; i < t->n_columns; i++)
            if (strcmp(t->column[i], name) == 0)
                return complain(r, SM_ESYNTAX, "a second column of that name", cell);
        t->n_columns++;
    }
    if (t->n_columns == 0)
        return complain(r, SM_ESYNTAX, "no column but t_C", (struct piece){ NULL, 0 });
    return SM_OK;
}

static enum sm_status row(struct reader *r, struct piece line, struct sm_table *t)
{
    struct piece cell = { NULL, 0 };
    const size_t at = t->n_rows;
    size_t cells = 0;

    if (at == SM_TABLE_ROWS_MAX)
        return complain(r, SM_EFULL, "more than 64 rows", cell);
    if (!next_cell(&line, &cell) || sm_number_parse(cell.s, cell.n, &t->t_c[at]) != SM_OK)
        return complain(r, SM_ESYNTAX, "expected a temperature in °C", cell);
    if (at > 0 && !(t->t_c[at] > t->t_c[at - 1]))
        return complain(r, SM_ESYNTAX, "expected a temperature above that of the row before", cell);
    for (; next_cell(&line, &cell); cells++) {
        if (cells == t->n_columns)
            return complain(r, SM_ESYNTAX, "more fields than the header has", cell);
        t->value[at][cells] = (double)NAN;
        if (cell.n > 0 && sm_number_parse(cell.s, cell.n, &t->value[at][cells]) != SM_OK)
            return complain(r, SM_ESYNTAX, "expected a number or nothing", cell);
    }
    if (cells < t->n_columns)
        return complain(r, SM_ESYNTAX, "fewer fields than the header has",
                        (struct piece){ NULL, 0 });
    t->n_rows++;
    return SM_OK;
}

static enum sm_status whole(struct reader *r, struct sm_table *t)
{
    const struct piece none = { NULL, 0 };
    struct piece line;
    enum sm_status status = SM_OK;
    bool have_line = false;

    while (status == SM_OK && (have_line = next_line(r, &line)) && line.s[0] == '#')
        status = head_line(r, line, t);
    if (status == SM_OK && t->source[0] == '\0')
        status = complain(r, SM_ESYNTAX, "the head names no source (\"# source: …\")", none);
    else if (status == SM_OK && t->unit == SM_UNIT_NONE)
        status = complain(r, SM_ESYNTAX, "the head names no unit (\"# unit: pH\")", none);
    else if (status == SM_OK && !have_line)
        status = complain(r, SM_ESYNTAX, "no row of column names", none);
    else if (status == SM_OK)
        status = header(r, line, t);
    while (status == SM_OK && next_line(r, &line))
        status = row(r, line, t);
    if (status == SM_OK && t->n_rows == 0)
        status = complain(r, SM_ESYNTAX, "no row of values", none);
    return status;
}

enum sm_status sm_table_parse(const char *text, size_t n, struct sm_table *ret_table,
                              unsigned *ret_line, char ret_why[SM_REASON_SIZE])
{
    static const char bom[] = { '\xef', '\xbb', '\xbf' };
    struct sm_table t = { .n_rows = 0 };
    struct reader r = { .text = text, .n = n };
    enum sm_status status;

    sm_text_init(&r.why, ret_why, SM_REASON_SIZE);
    if (n >= sizeof bom && memcmp(text, bom, sizeof bom) == 0)
        r.at = sizeof bom;
    status = whole(&r, &t);
    if (status == SM_OK)
        *ret_table = t;
    else
        *ret_line = r.line;
    return status;
}
