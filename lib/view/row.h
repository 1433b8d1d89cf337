/* SPDX-License-Identifier: GPL-3.0-or-later */
/* row.h: one row of a table under way: cells out of an entry's JSON. Private to the room. */
#ifndef SM_VIEW_ROW_H
#define SM_VIEW_ROW_H
#include <jansson.h>

#include "base/text.h"

#define SM_ROW_SIZE (64u * 1024u) /* bytes that hold any row */

struct sm_row {
    struct sm_text t;
    bool first;
};

void sm_row_begin(struct sm_row *r, char *buf); /* [SM_ROW_SIZE] */
void sm_row_end(struct sm_row *r);              /* adds CRLF */

void sm_row_cell(struct sm_row *r, const char *text);
void sm_row_real(struct sm_row *r, double v); /* NaN: empty */
/* The value of o's key, whatever it is; empty where it is not there (o may be NULL). */
void sm_row_key(struct sm_row *r, const json_t *o, const char *key);
/* ns as seconds. */
void sm_row_seconds(struct sm_row *r, const json_t *ns);
/* A list of sentences, or an object's names and values, joined by "; ". */
void sm_row_joined(struct sm_row *r, const json_t *v);
#endif
