/* SPDX-License-Identifier: GPL-3.0-or-later */
/* words.h: one line of a scenario as words, taken from the left. The first thing that is not as
 * expected is blamed with its column; after that everything fails quietly. */
#ifndef SM_SIM_WORDS_H
#define SM_SIM_WORDS_H
#include <stdbool.h>
#include <stddef.h>

#include "base/blame.h"
#include "base/unit.h"
#include "sim/shape.h"

#define SM_SIM_WORDS_PER_LINE 24

struct sm_sim_word {
    char bytes[SM_SIM_SHAPE_TEXT];
    size_t n;
    bool quoted;
    unsigned column;
};

struct sm_sim_words {
    const char *file;
    unsigned line;
    struct sm_blames *blames;
    struct sm_sim_word word[SM_SIM_WORDS_PER_LINE];
    size_t n, at;
    unsigned end_column;
    bool wrong;
};

/* Parts text[n] (one line, without its end) into words. */
void sm_sim_words_init(struct sm_sim_words *w, const char *file, unsigned line, const char *text,
                       size_t n, struct sm_blames *blames);

/* Blames the word to come (or the end of the line): "expected WHAT, got …". Gives false. */
bool sm_sim_words_expected(struct sm_sim_words *w, const char *what);

bool sm_sim_words_left(const struct sm_sim_words *w); /* something is left, nothing was wrong */
bool sm_sim_words_is(struct sm_sim_words *w,
                     const char *word); /* takes the word if it is this one */
bool sm_sim_words_need(struct sm_sim_words *w, const char *word); /* it must be this one */
bool sm_sim_words_end(struct sm_sim_words *w);                    /* nothing may be left */

bool sm_sim_words_number(struct sm_sim_words *w, const char *what, double from, double to,
                         double *ret);
bool sm_sim_words_count(struct sm_sim_words *w, const char *what, unsigned from, unsigned to,
                        unsigned *ret);
bool sm_sim_words_text(struct sm_sim_words *w, const char *what, bool needs_quotes,
                       struct sm_sim_shape_text *ret);
/* Number and unit. */
bool sm_sim_words_quantity(struct sm_sim_words *w, const char *what, double *ret,
                           enum sm_unit *ret_unit);
/* A quantity in (or convertible to) this unit. */
bool sm_sim_words_in_unit(struct sm_sim_words *w, const char *what, enum sm_unit unit, double *ret);
/* A time from `from` to `to` seconds. */
bool sm_sim_words_time(struct sm_sim_words *w, const char *what, double from_s, double to_s,
                       double *ret_s);
/* A percentage; from, to and the answer are shares (1 = 100 %). */
bool sm_sim_words_percent(struct sm_sim_words *w, const char *what, double from, double to,
                          double *ret);
/* "3 /s" */
bool sm_sim_words_per_s(struct sm_sim_words *w, const char *what, double *ret);
/* "5 mV/h", "0.004 pH/min", "1 mV/s": per second, and the unit before the slash. */
bool sm_sim_words_change(struct sm_sim_words *w, const char *what, double *ret_per_s,
                         enum sm_unit *ret_unit);
#endif
