/* SPDX-License-Identifier: GPL-3.0-or-later */
/* value.h: nodes of a setup file to checked values. Every reader takes NULL for "not there" (false,
 * no blame); on a wrong value it blames what was expected and what was got, and leaves the output
 * alone. */
#ifndef SM_SETUP_VALUE_H
#define SM_SETUP_VALUE_H
#include <stdint.h>

#include "base/text.h"
#include "base/unit.h"
#include "setup/tree.h"

struct sm_reader {
    const char *file;
    struct sm_blames *blames;
};

/* All that were found, those left out included. */
size_t sm_blames_total(const struct sm_blames *b);

/* "slope.from: " and then the text, at the node's place. */
__attribute__((format(printf, 3, 4))) void
sm_blame(const struct sm_reader *r, const struct sm_node *node, const char *fmt, ...);
/* The same, ending in `, got "9.2"`. */
__attribute__((format(printf, 3, 4))) void
sm_blame_got(const struct sm_reader *r, const struct sm_node *node, const char *fmt, ...);

/* The nearest of names to what was written, NULL when none is near. A list of names. */
const char *sm_nearest(const char *written, const char *const *names, size_t n);

/* `node` is a map and knows only these keys (the last one NULL); false when it is no map. */
bool sm_keys_known(const struct sm_reader *r, const struct sm_node *node, const char *const *keys);
/* A map's value by key; NULL when left out or when map is NULL or no map. */
const struct sm_node *sm_key(const struct sm_node *map, const char *key);
/* The same, blamed when left out: "baud: missing: expected …". */
const struct sm_node *sm_need(const struct sm_reader *r, const struct sm_node *map, const char *key,
                              const char *expected);
/* `node` is a list of least to most entries; blames otherwise. */
bool sm_is_list(const struct sm_reader *r, const struct sm_node *node, size_t least, size_t most,
                const char *of_what);
/* `node` is the plain text `word`. */
bool sm_is_word(const struct sm_node *node, const char *word);

/* ---- values ---- */

/* A name (sm_name_ok). */
bool sm_get_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                 char ret_name[SM_NAME_SIZE]);
/* A name that stands for a file, FOLDER/NAME.yaml: no folders in it, no dot at its head. */
bool sm_get_file_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                      char ret_name[SM_NAME_SIZE]);
/* [a-z0-9-]{1,32}: meters and channels. */
bool sm_get_short_name(const struct sm_reader *r, const struct sm_node *node, const char *what,
                       char ret_name[SM_METER_SIZE]);
/* Text of 1 to cap - 1 bytes without control characters. */
bool sm_get_text(const struct sm_reader *r, const struct sm_node *node, const char *what,
                 char *ret_text, size_t cap);
/* One of names[n]: its index. */
bool sm_get_choice(const struct sm_reader *r, const struct sm_node *node, const char *const *names,
                   size_t n, size_t *ret_at);
/* yes no on off true false */
bool sm_get_yes(const struct sm_reader *r, const struct sm_node *node, bool *ret_yes);
bool sm_get_count(const struct sm_reader *r, const struct sm_node *node, unsigned from, unsigned to,
                  unsigned *ret_count);
bool sm_get_number(const struct sm_reader *r, const struct sm_node *node, double from, double to,
                   double *ret_number);
bool sm_get_time(const struct sm_reader *r, const struct sm_node *node, int64_t from_ns,
                 int64_t to_ns, int64_t *ret_ns);
#define SM_ANY_VALUE 1e9 /* a bound that says: no bound that a person would need to hear */
/* A quantity that converts to `unit`, from <= value <= to there. */
bool sm_get_quantity(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                     double from, double to, double *ret_value);
/* Any quantity, as written; its unit is the caller's to judge (sm_blame_got). */
bool sm_get_any_quantity(const struct sm_node *node, struct sm_quantity *ret_q);
bool sm_get_date(const struct sm_reader *r, const struct sm_node *node, int64_t *ret_day);
bool sm_get_utc(const struct sm_reader *r, const struct sm_node *node, int64_t *ret_utc_us);

/* "a percentage between 50 % and 120 %" */
void sm_range_text(struct sm_text *t, enum sm_unit unit, double from, double to);
/* "a pH", "a time", … for any unit */
const char *sm_unit_kind(enum sm_unit unit);
#endif
