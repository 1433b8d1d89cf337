/* SPDX-License-Identifier: GPL-3.0-or-later */
/* words.c: see words.h. */
#include "sim/words.h"

#include <string.h>

#include "base/number.h"
#include "base/text.h"

static int hex_digit(char c)
{
    if (c >= '0' && c <= '9')
        return c - '0';
    if (c >= 'a' && c <= 'f')
        return c - 'a' + 10;
    if (c >= 'A' && c <= 'F')
        return c - 'A' + 10;
    return -1;
}

/* The escape behind the backslash at s[at]; 0: none of ours. Returns bytes read, the backslash too.
 */
static size_t escape(const char *s, size_t n, size_t at, char *ret)
{
    static const char from[] = "rnt\\\"", to[] = "\r\n\t\\\"";

    if (at + 1 >= n)
        return 0;
    const char *known = s[at + 1] == '\0' ? NULL : strchr(from, s[at + 1]);
    if (known) {
        *ret = to[known - from];
        return 2;
    }
    if (s[at + 1] != 'x' || at + 3 >= n || hex_digit(s[at + 2]) < 0 || hex_digit(s[at + 3]) < 0)
        return 0;
    *ret = (char)(hex_digit(s[at + 2]) * 16 + hex_digit(s[at + 3]));
    return 4;
}

static void blame(struct sm_sim_words *w, unsigned column, const char *what)
{
    if (!w->wrong)
        sm_blames_add(w->blames, w->file, w->line, column, "%s", what);
    w->wrong = true;
}

/* Reads the quoted text whose quote is s[at]; returns where it ends, or n after blaming. */
static size_t quoted(struct sm_sim_words *w, const char *s, size_t n, size_t at,
                     struct sm_sim_word *word)
{
    word->quoted = true;
    for (at++; at < n && s[at] != '"';) {
        char c = s[at];
        size_t took = 1;
        if (c == '\\')
            took = escape(s, n, at, &c);
        if (took == 0) {
            blame(w, (unsigned)at + 1, "expected \\r \\n \\t \\\\ \\\" or \\xNN");
            return n;
        }
        if (word->n == SM_SIM_SHAPE_TEXT - 1) {
            blame(w, word->column, "the text is too long");
            return n;
        }
        word->bytes[word->n++] = c;
        at += took;
    }
    if (at >= n)
        blame(w, word->column, "the closing quote is missing");
    else if (at + 1 < n && s[at + 1] != ' ' && s[at + 1] != '\t')
        blame(w, (unsigned)at + 2, "expected a blank after the closing quote");
    return at + 1;
}

void sm_sim_words_init(struct sm_sim_words *w, const char *file, unsigned line, const char *text,
                       size_t n, struct sm_blames *blames)
{
    memset(w, 0, sizeof *w);
    w->file = file;
    w->line = line;
    w->blames = blames;
    for (size_t at = 0; at < n && !w->wrong;) {
        if (text[at] == ' ' || text[at] == '\t') {
            at++;
            continue;
        }
        if (text[at] == '#')
            break;
        if (w->n == SM_SIM_WORDS_PER_LINE) {
            blame(w, (unsigned)at + 1, "too many words on this line");
            break;
        }
        struct sm_sim_word *word = &w->word[w->n++];
        word->column = (unsigned)at + 1;
        if (text[at] == '"') {
            at = quoted(w, text, n, at, word);
        } else {
            for (; at < n && text[at] != ' ' && text[at] != '\t'; at++) {
                if (word->n == SM_SIM_SHAPE_TEXT - 1) {
                    blame(w, word->column, "the word is too long");
                    return;
                }
                word->bytes[word->n++] = text[at];
            }
        }
        w->end_column = (unsigned)at + 1;
    }
}

bool sm_sim_words_expected(struct sm_sim_words *w, const char *what)
{
    char text[SM_BLAME_SIZE];
    struct sm_text t;
    const unsigned column = w->at < w->n ? w->word[w->at].column : w->end_column;

    sm_text_init(&t, text, sizeof text);
    sm_text_add(&t, "expected ");
    sm_text_add(&t, what);
    if (w->at < w->n) {
        sm_text_add(&t, ", got \"");
        sm_text_add_safe(&t, w->word[w->at].bytes, w->word[w->at].n);
        sm_text_add(&t, "\"");
    } else {
        sm_text_add(&t, ", got the end of the line");
    }
    blame(w, column, text);
    return false;
}

bool sm_sim_words_left(const struct sm_sim_words *w)
{
    return !w->wrong && w->at < w->n;
}

bool sm_sim_words_is(struct sm_sim_words *w, const char *word)
{
    if (!sm_sim_words_left(w) || w->word[w->at].quoted || strlen(word) != w->word[w->at].n ||
        memcmp(word, w->word[w->at].bytes, w->word[w->at].n) != 0)
        return false;
    w->at++;
    return true;
}

bool sm_sim_words_need(struct sm_sim_words *w, const char *word)
{
    char what[64];
    struct sm_text t;

    if (w->wrong)
        return false;
    if (sm_sim_words_is(w, word))
        return true;
    sm_text_init(&t, what, sizeof what);
    sm_text_addf(&t, "\"%s\"", word);
    return sm_sim_words_expected(w, what);
}

bool sm_sim_words_end(struct sm_sim_words *w)
{
    if (w->wrong)
        return false;
    return w->at == w->n || sm_sim_words_expected(w, "the end of the line");
}

bool sm_sim_words_number(struct sm_sim_words *w, const char *what, double from, double to,
                         double *ret)
{
    double v;

    if (w->wrong)
        return false;
    if (w->at == w->n || w->word[w->at].quoted ||
        sm_number_parse(w->word[w->at].bytes, w->word[w->at].n, &v) != SM_OK || v < from ||
        v > to) {
        char text[160], low[SM_NUMBER_SIZE], high[SM_NUMBER_SIZE];
        struct sm_text t;
        sm_number_write(low, from);
        sm_number_write(high, to);
        sm_text_init(&t, text, sizeof text);
        sm_text_addf(&t, "%s, a number from %s to %s", what, low, high);
        return sm_sim_words_expected(w, text);
    }
    w->at++;
    *ret = v;
    return true;
}

bool sm_sim_words_count(struct sm_sim_words *w, const char *what, unsigned from, unsigned to,
                        unsigned *ret)
{
    int64_t v;

    if (w->wrong)
        return false;
    if (w->at == w->n || w->word[w->at].quoted ||
        sm_integer_parse(w->word[w->at].bytes, w->word[w->at].n, &v) != SM_OK || v < from ||
        v > to) {
        char text[160];
        struct sm_text t;
        sm_text_init(&t, text, sizeof text);
        sm_text_addf(&t, "%s, a whole number from %u to %u", what, from, to);
        return sm_sim_words_expected(w, text);
    }
    w->at++;
    *ret = (unsigned)v;
    return true;
}

bool sm_sim_words_text(struct sm_sim_words *w, const char *what, bool needs_quotes,
                       struct sm_sim_shape_text *ret)
{
    if (w->wrong)
        return false;
    if (w->at == w->n || w->word[w->at].n == 0 || (needs_quotes && !w->word[w->at].quoted))
        return sm_sim_words_expected(w, what);
    const struct sm_sim_word *word = &w->word[w->at++];
    memset(ret, 0, sizeof *ret);
    memcpy(ret->bytes, word->bytes, word->n);
    ret->n = word->n;
    return true;
}

bool sm_sim_words_quantity(struct sm_sim_words *w, const char *what, double *ret,
                           enum sm_unit *ret_unit)
{
    double v;
    enum sm_unit unit;

    if (!sm_sim_words_number(w, what, -1e9, 1e9, &v))
        return false;
    if (w->at == w->n || w->word[w->at].quoted ||
        sm_unit_parse(w->word[w->at].bytes, w->word[w->at].n, &unit) != SM_OK)
        return sm_sim_words_expected(w, "a unit");
    w->at++;
    *ret = v;
    *ret_unit = unit;
    return true;
}

bool sm_sim_words_in_unit(struct sm_sim_words *w, const char *what, enum sm_unit unit, double *ret)
{
    double v;
    enum sm_unit given;

    if (!sm_sim_words_quantity(w, what, &v, &given))
        return false;
    if (sm_quantity_in((struct sm_quantity){ v, given }, unit, ret) == SM_OK)
        return true;
    w->at--;
    return sm_sim_words_expected(w, sm_unit_name(unit));
}

bool sm_sim_words_time(struct sm_sim_words *w, const char *what, double from_s, double to_s,
                       double *ret_s)
{
    double s = 0;
    const size_t began = w->at;

    if (!sm_sim_words_in_unit(w, what, SM_UNIT_S, &s))
        return false;
    if (s >= from_s && s <= to_s) {
        *ret_s = s;
        return true;
    }
    char text[160];
    struct sm_text t;
    sm_text_init(&t, text, sizeof text);
    sm_text_addf(&t, "%s from %g s to %g s", what, from_s, to_s);
    w->at = began;
    return sm_sim_words_expected(w, text);
}

bool sm_sim_words_percent(struct sm_sim_words *w, const char *what, double from, double to,
                          double *ret)
{
    double v;

    if (!sm_sim_words_number(w, what, 100 * from, 100 * to, &v) || !sm_sim_words_need(w, "%"))
        return false;
    *ret = v / 100;
    return true;
}

bool sm_sim_words_per_s(struct sm_sim_words *w, const char *what, double *ret)
{
    return sm_sim_words_number(w, what, 0.001, 1000, ret) && sm_sim_words_need(w, "/s");
}

bool sm_sim_words_change(struct sm_sim_words *w, const char *what, double *ret_per_s,
                         enum sm_unit *ret_unit)
{
    static const struct {
        const char *name;
        double s;
    } per[] = { { "/s", 1 }, { "/min", 60 }, { "/h", 3600 } };
    double v;

    if (!sm_sim_words_number(w, what, -1e6, 1e6, &v))
        return false;
    for (size_t i = 0; i < sizeof per / sizeof per[0] && w->at < w->n; i++) {
        const struct sm_sim_word *word = &w->word[w->at];
        const size_t n = strlen(per[i].name);
        if (word->n > n && memcmp(word->bytes + word->n - n, per[i].name, n) == 0 &&
            sm_unit_parse(word->bytes, word->n - n, ret_unit) == SM_OK) {
            w->at++;
            *ret_per_s = v / per[i].s;
            return true;
        }
    }
    return sm_sim_words_expected(w, "a unit per time, such as mV/h");
}
