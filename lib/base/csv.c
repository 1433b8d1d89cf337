/* SPDX-License-Identifier: GPL-3.0-or-later */
/* csv.c: the reader cuts one row at a time into cells (RFC 4180) where they lie in the text, and
 * turns the two to four cells it wants into numbers. Nothing is passed over: what is no row of the
 * table's shape is an error with its line. */
#include "base/csv.h"

#include <string.h>

#include "base/number.h"

#define CELL_SIZE 64

/* ---- a row, cut into cells ---- */

/* A cell where it lies: with its quotes taken off at the ends but doubled ones still inside. */
struct cell {
    const char *s;
    size_t n;
    bool quoted;
};

/* The first two cells of a row and those of ux and uy, as far as they are there. */
struct row {
    struct cell x, y, ux, uy;
    unsigned fields;
    unsigned line; /* on which it starts */
};

static void say(char ret_why[SM_REASON_SIZE], const char *what)
{
    sm_text_copy(ret_why, SM_REASON_SIZE, what);
}

static bool at_line_end(const struct sm_csv *c, size_t at)
{
    return at == c->n || c->text[at] == '\n' ||
           (c->text[at] == '\r' && at + 1 < c->n && c->text[at + 1] == '\n') ||
           (c->text[at] == '\r' && at + 1 == c->n);
}

/* Past the line's end at `at`. */
static size_t after_line_end(const struct sm_csv *c, size_t at)
{
    if (at < c->n && c->text[at] == '\r')
        at++;
    if (at < c->n && c->text[at] == '\n')
        at++;
    return at;
}

/* Reads a quoted cell from its opening quote; *at ends behind the closing one. */
static bool take_quoted(struct sm_csv *c, size_t *at, unsigned *lines, struct cell *ret_cell)
{
    const size_t begin = ++*at;

    for (; *at < c->n; ++*at) {
        if (c->text[*at] == '\n')
            ++*lines;
        if (c->text[*at] != '"')
            continue;
        if (*at + 1 < c->n && c->text[*at + 1] == '"') {
            ++*at;
            continue;
        }
        *ret_cell = (struct cell){ c->text + begin, *at - begin, true };
        ++*at;
        return true;
    }
    return false;
}

static bool is_control(char ch)
{
    return ((unsigned char)ch < 0x20 && ch != '\t') || ch == 0x7F;
}

/* Reads a cell without quotes up to a separator or the line's end. */
static const char *take_plain(const struct sm_csv *c, size_t *at, struct cell *ret_cell)
{
    const size_t begin = *at;

    for (; !at_line_end(c, *at) && c->text[*at] != c->separator; ++*at) {
        if (c->text[*at] == '"')
            return "a quote inside a cell that does not begin with one";
        if (c->text[*at] == '\r')
            return "a carriage return that no line feed follows: lines end with LF or CRLF";
        if (is_control(c->text[*at]))
            return "a control character: expected plain text in UTF-8";
    }
    *ret_cell = (struct cell){ c->text + begin, *at - begin, false };
    return NULL;
}

static void keep(const struct sm_csv *c, struct row *r, const struct cell *cell)
{
    if (r->fields == 1)
        r->x = *cell;
    else if (r->fields == 2)
        r->y = *cell;
    else if (r->fields == c->ux_at)
        r->ux = *cell;
    else if (r->fields == c->uy_at)
        r->uy = *cell;
}

static bool is_blank(char ch)
{
    return ch == ' ' || ch == '\t';
}

/* The cell without blanks at its ends and with doubled quotes made single; cut (and said so) where
 * it does not fit. */
static void cell_text(const struct cell *cell, struct sm_text *t)
{
    size_t from = 0, to = cell->n;

    while (from < to && is_blank(cell->s[from]))
        from++;
    while (to > from && is_blank(cell->s[to - 1]))
        to--;
    for (size_t i = from; i < to;) {
        const char *quote = cell->quoted ? memchr(cell->s + i, '"', to - i) : NULL;
        const size_t end = quote == NULL ? to : (size_t)(quote - cell->s) + 1;
        sm_text_addn(t, cell->s + i, end - i);
        i = quote == NULL ? to : end + 1;
    }
}

/* Notes the columns that a header calls ux and uy. */
static const char *find_columns(struct sm_csv *c, unsigned field, const struct cell *cell)
{
    char buf[4];
    struct sm_text t;
    unsigned *at = NULL;

    sm_text_init(&t, buf, sizeof buf);
    cell_text(cell, &t);
    if (field > 2 && strcmp(buf, "ux") == 0 && !t.cut)
        at = &c->ux_at;
    if (field > 2 && strcmp(buf, "uy") == 0 && !t.cut)
        at = &c->uy_at;
    if (at == NULL)
        return NULL;
    if (*at != 0)
        return "two columns of the same name: expected one \"ux\" and one \"uy\" at most";
    *at = field;
    return NULL;
}

/* Cuts the row at c->at and goes on behind it; after a failure the text counts as ended, because
 * where the next row starts is then a guess. */
static enum sm_status take_row(struct sm_csv *c, bool header, struct row *ret_row,
                               char ret_why[SM_REASON_SIZE])
{
    struct row r = { .line = c->next_line };
    size_t at = c->at;
    unsigned lines = 0;
    const char *wrong = NULL;

    do {
        struct cell cell = { 0 };

        if (r.fields > 0)
            at++; /* the separator */
        if (at < c->n && c->text[at] == '"') {
            if (!take_quoted(c, &at, &lines, &cell))
                wrong = "a quoted cell that is never closed";
            else if (!at_line_end(c, at) && c->text[at] != c->separator)
                wrong = "expected a separator or the line's end after a closing quote";
        } else {
            wrong = take_plain(c, &at, &cell);
        }
        r.fields++;
        keep(c, &r, &cell);
        if (wrong == NULL && header)
            wrong = find_columns(c, r.fields, &cell);
    } while (wrong == NULL && !at_line_end(c, at));

    c->line = r.line;
    c->at = wrong == NULL ? after_line_end(c, at) : c->n;
    c->next_line += lines + 1;
    if (wrong != NULL) {
        say(ret_why, wrong);
        return SM_ESYNTAX;
    }
    *ret_row = r;
    return SM_OK;
}

/* ---- cells to text and numbers ---- */

/* A number with a decimal mark that this file may have. The first mark met decides for the file:
 * one that has both could mean a thousand or one. */
static bool read_number(struct sm_csv *c, const struct cell *cell, double *ret_value,
                        double *ret_step)
{
    char buf[CELL_SIZE];
    struct sm_text t;
    char *comma, mark = '\0';

    sm_text_init(&t, buf, sizeof buf);
    cell_text(cell, &t);
    if (t.cut || strlen(buf) != t.len)
        return false;
    comma = c->separator == ',' ? NULL : strchr(buf, ',');
    if (comma != NULL)
        mark = ',';
    else if (strchr(buf, '.') != NULL)
        mark = '.';
    if (comma != NULL) {
        if (strchr(buf, '.') != NULL)
            return false;
        *comma = '.';
    }
    if (sm_number_parse(buf, t.len, ret_value) != SM_OK)
        return false;
    if (mark != '\0' && c->mark != '\0' && mark != c->mark)
        return false;
    if (mark != '\0')
        c->mark = mark;
    c->decimal_comma = c->mark == ',';
    *ret_step = sm_number_step(buf, t.len);
    return true;
}

static void blame_number(const struct sm_csv *c, const struct cell *cell, const char *column,
                         char ret_why[SM_REASON_SIZE])
{
    char buf[CELL_SIZE];
    struct sm_text got, why;

    sm_text_init(&got, buf, sizeof buf);
    cell_text(cell, &got);
    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    sm_text_addf(&why, "%s: expected a number", column);
    if (c->mark != '\0')
        sm_text_addf(&why, " with a decimal %s as above", c->mark == ',' ? "comma" : "point");
    sm_text_add(&why, ", got \"");
    sm_text_add_safe(&why, buf, got.len);
    sm_text_add(&why, got.cut ? "…\"" : "\"");
}

/* ---- the head ---- */

static void skip_line(struct sm_csv *c)
{
    const char *lf = memchr(c->text + c->at, '\n', c->n - c->at);

    c->at = lf == NULL ? c->n : (size_t)(lf - c->text) + 1;
    c->next_line++;
}

/* Nothing but blanks up to the line's end. */
static bool is_blank_line(const struct sm_csv *c)
{
    size_t at = c->at;

    while (at < c->n && is_blank(c->text[at]))
        at++;
    return at_line_end(c, at);
}

/* Tab, else semicolon, else comma: whichever stands outside quotes in the first row. */
static char find_separator(const struct sm_csv *c)
{
    bool quoted = false, semicolon = false;

    for (size_t at = c->at; at < c->n && (quoted || !at_line_end(c, at)); at++) {
        if (c->text[at] == '"')
            quoted = !quoted;
        if (quoted)
            continue;
        if (c->text[at] == '\t')
            return '\t';
        if (c->text[at] == ';')
            semicolon = true;
    }
    return semicolon ? ';' : ',';
}

static bool is_any_of(const char *s, const char *const *words, size_t n)
{
    for (size_t i = 0; i < n; i++) {
        const char *w = words[i], *a = s;
        while (*w != '\0' && (*a | 0x20) == *w)
            w++, a++;
        if (*w == '\0' && *a == '\0')
            return true;
    }
    return false;
}

/* What stands for a value, though not a usable one: nothing, the words for "none", or a beginning
 * like a number's. A row of these is data, not a header. */
static bool is_like_a_value(const char *name)
{
    static const char *const none[] = { "nan", "inf", "infinity", "na", "n/a", "null", "none" };

    name += strspn(name, "+-.#");
    return *name == '\0' || (*name >= '0' && *name <= '9') ||
           is_any_of(name, none, sizeof none / sizeof none[0]);
}

/* Decides whether the first row is a header, and reads it or goes back to its start. */
static enum sm_status read_first_row(struct sm_csv *c, char ret_why[SM_REASON_SIZE])
{
    const struct sm_csv before = *c;
    struct row r;
    struct sm_text x, y;
    double v, step;
    enum sm_status st = take_row(c, true, &r, ret_why);

    if (st != SM_OK)
        return st;
    if (r.fields < 2) {
        say(ret_why, "expected two columns or more, with , ; or tab between them");
        return SM_ESYNTAX;
    }
    sm_text_init(&x, c->x_name, sizeof c->x_name);
    sm_text_init(&y, c->y_name, sizeof c->y_name);
    cell_text(&r.x, &x);
    cell_text(&r.y, &y);
    c->header = !read_number(c, &r.x, &v, &step) && !read_number(c, &r.y, &v, &step) &&
                !(is_like_a_value(c->x_name) && is_like_a_value(c->y_name));
    if (!c->header) { /* a row of data, or what must be blamed as one */
        *c = before;
        c->line = r.line;
    }
    c->fields = r.fields;
    return SM_OK;
}

enum sm_status sm_csv_begin(struct sm_csv *c, const char *text, size_t n,
                            char ret_why[SM_REASON_SIZE])
{
    static const char bom[] = "\xEF\xBB\xBF";

    *c = (struct sm_csv){ .text = text, .n = n, .separator = ',', .line = 1, .next_line = 1 };
    if (n >= 3 && memcmp(text, bom, 3) == 0)
        c->at = 3;
    while (c->at < n && (text[c->at] == '#' || is_blank_line(c)))
        skip_line(c);
    if (c->at == n) {
        c->line = c->next_line;
        say(ret_why, "no rows");
        return SM_ESYNTAX;
    }
    c->separator = find_separator(c);
    return read_first_row(c, ret_why);
}

/* ---- the rows ---- */

static enum sm_status read_u(struct sm_csv *c, const struct cell *cell, const char *column,
                             double *ret_u, char ret_why[SM_REASON_SIZE])
{
    double v, step;

    if (!read_number(c, cell, &v, &step)) {
        blame_number(c, cell, column, ret_why);
        return SM_ESYNTAX;
    }
    if (v < 0) {
        struct sm_text why;
        sm_text_init(&why, ret_why, SM_REASON_SIZE);
        sm_text_addf(&why, "%s: an uncertainty cannot be negative", column);
        return SM_ESYNTAX;
    }
    *ret_u = v;
    return SM_OK;
}

static enum sm_status read_values(struct sm_csv *c, const struct row *r, struct sm_csv_row *ret_row,
                                  char ret_why[SM_REASON_SIZE])
{
    struct sm_csv_row v = { .has_ux = c->ux_at > 0, .has_uy = c->uy_at > 0 };
    double x_step;
    enum sm_status st = SM_OK;

    if (!read_number(c, &r->x, &v.x, &x_step)) {
        blame_number(c, &r->x, "column 1", ret_why);
        return SM_ESYNTAX;
    }
    if (!read_number(c, &r->y, &v.y, &v.y_step)) {
        blame_number(c, &r->y, "column 2", ret_why);
        return SM_ESYNTAX;
    }
    if (v.has_ux)
        st = read_u(c, &r->ux, "column ux", &v.ux, ret_why);
    if (st == SM_OK && v.has_uy)
        st = read_u(c, &r->uy, "column uy", &v.uy, ret_why);
    if (st == SM_OK)
        *ret_row = v;
    return st;
}

enum sm_status sm_csv_next(struct sm_csv *c, struct sm_csv_row *ret_row,
                           char ret_why[SM_REASON_SIZE])
{
    struct row r;
    unsigned blank_line = 0;
    enum sm_status st;

    while (c->at < c->n && is_blank_line(c)) {
        if (blank_line == 0)
            blank_line = c->next_line;
        skip_line(c);
    }
    if (c->at == c->n)
        return SM_ESHORT;
    if (blank_line > 0) {
        c->line = blank_line;
        say(ret_why, "an empty line between rows");
        return SM_ESYNTAX;
    }
    st = take_row(c, false, &r, ret_why);
    if (st != SM_OK)
        return st;
    if (r.fields != c->fields) {
        struct sm_text why;
        sm_text_init(&why, ret_why, SM_REASON_SIZE);
        sm_text_addf(&why, "expected %u fields as in the first row, got %u", c->fields, r.fields);
        return SM_ESYNTAX;
    }
    return read_values(c, &r, ret_row, ret_why);
}

/* ---- output ---- */

/* The character's bytes as they may stand in a cell: control characters as a space. */
static void add_character(struct sm_text *t, const char *s, size_t n, size_t *at)
{
    uint32_t code = 0;
    const size_t len = sm_utf8_next(s + *at, n - *at, &code);

    if (len > 0 && (code < 0x20 || (code >= 0x7F && code <= 0x9F)))
        sm_text_add(t, " ");
    else if (code == '"')
        sm_text_add(t, "\"\"");
    else
        sm_text_add_safe(t, s + *at, len > 0 ? len : 1);
    *at += len > 0 ? len : 1;
}

/* Would a spreadsheet take it for a formula? Blanks and control characters in front do not hide it.
 */
static bool is_like_a_formula(const char *cell, size_t n)
{
    size_t at = 0;

    while (at < n && (unsigned char)cell[at] <= ' ')
        at++;
    return at < n && strchr("=+-@", cell[at]) != NULL;
}

void sm_csv_cell(struct sm_text *t, const char *cell)
{
    const size_t n = strlen(cell);
    double v;
    const bool formula = is_like_a_formula(cell, n) && sm_number_parse(cell, n, &v) != SM_OK;
    const bool quote = strpbrk(cell, ",;\"\t\r\n") != NULL || (n > 0 && cell[0] == ' ') ||
                       (n > 0 && cell[n - 1] == ' ');

    if (quote)
        sm_text_add(t, "\"");
    if (formula)
        sm_text_add(t, "'");
    for (size_t at = 0; at < n;)
        add_character(t, cell, n, &at);
    if (quote)
        sm_text_add(t, "\"");
}
