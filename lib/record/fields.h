/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fields.h: taking a JSON object of unknown origin apart, key by key, with bounds. The first thing
 * that is wrong is kept in words and everything after it is passed over, so that a reader is a
 * plain list of keys. Private to the room. */
#ifndef SM_RECORD_FIELDS_H
#define SM_RECORD_FIELDS_H
#include <jansson.h>
#include <stdbool.h>
#include <stdint.h>

#include "base/text.h"

struct sm_taking {
    bool bad;
    char *why;            /* [SM_REASON_SIZE], the caller's */
    unsigned passed_over; /* keys that are not known here */
};

struct sm_fields {
    struct sm_taking *taking;
    const char *where; /* what the object is, for the reason: "run" */
    const json_t *o;
    size_t known; /* keys that were asked for and are there */
};

void sm_taking_begin(struct sm_taking *k, char why[SM_REASON_SIZE]);
/* Only the first one counts. */
__attribute__((format(printf, 2, 3))) void sm_taking_refuse(struct sm_taking *k, const char *fmt,
                                                            ...);

/* False: no object (refused), or refused before. */
bool sm_fields_begin(struct sm_fields *f, struct sm_taking *k, const json_t *o, const char *where);
/* Counts the keys that nobody asked for. */
void sm_fields_end(struct sm_fields *f);

/* NULL: not there (or refused before). */
const json_t *sm_fields_get(struct sm_fields *f, const char *key);
/* The same, refused where it is not there. */
const json_t *sm_fields_need(struct sm_fields *f, const char *key);
/* A list of at most so many; NULL: not there, or refused. */
const json_t *sm_fields_list(struct sm_fields *f, const char *key, size_t most);

/* Each gives true where the key is there and good; *ret is untouched otherwise. A real that is a
 * whole number is a whole number, and the other way round. */
bool sm_fields_int(struct sm_fields *f, const char *key, int64_t from, int64_t to, int64_t *ret);
bool sm_fields_size(struct sm_fields *f, const char *key, size_t most, size_t *ret);
bool sm_fields_unsigned(struct sm_fields *f, const char *key, unsigned *ret);
bool sm_fields_real(struct sm_fields *f, const char *key, double *ret);
bool sm_fields_bool(struct sm_fields *f, const char *key, bool *ret);
/* Text without NUL that fits into out[cap]. */
bool sm_fields_text(struct sm_fields *f, const char *key, char *out, size_t cap);
/* The same, without control and direction-override characters: a name or a title. */
bool sm_fields_plain(struct sm_fields *f, const char *key, char *out, size_t cap);

bool sm_json_is_int(const json_t *v, int64_t *ret);
#endif
