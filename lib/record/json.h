/* SPDX-License-Identifier: GPL-3.0-or-later */
/* json.h: our own JSON writer, so that one thing is always written as the same bytes: entries of
 * the log, and what the daemon says in the log's words. Commas come by themselves: what was just
 * opened ends with '{' or '[', and a string always ends with its quote. A key of NULL writes an
 * element of a list. */
#ifndef SM_RECORD_JSON_H
#define SM_RECORD_JSON_H
#include <stdbool.h>
#include <stdint.h>

#include "base/text.h"

/* {"n":1201,"t":81234567890,"utc":"2026-12-01T08:13:24.567890Z","k":"bytes"
 * n is left out where it is 0 (a live event). */
void sm_json_head(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, const char *k);
/* Ends what sm_json_head began, with the newline. */
void sm_json_end(struct sm_text *t);

void sm_json_object(struct sm_text *t, const char *key);
void sm_json_list(struct sm_text *t, const char *key);
void sm_json_close_object(struct sm_text *t);
void sm_json_close_list(struct sm_text *t);

void sm_json_int(struct sm_text *t, const char *key, int64_t v);
void sm_json_size(struct sm_text *t, const char *key, size_t v);
/* Only where it is not 0: for numbers of entries, where 0 says "none". */
void sm_json_some(struct sm_text *t, const char *key, int64_t v);
void sm_json_bool(struct sm_text *t, const char *key, bool v);
/* Left out where it is not finite: an unknown number (in a list: null). */
void sm_json_real(struct sm_text *t, const char *key, double v);
/* Text is UTF-8; a byte that is none becomes '?', so that it never grows beyond its storage. */
void sm_json_text(struct sm_text *t, const char *key, const char *s);
void sm_json_textn(struct sm_text *t, const char *key, const char *s, size_t n);
/* Only where it is not "". */
void sm_json_words(struct sm_text *t, const char *key, const char *s);
/* Raw bytes, as sm_bytes_write. */
void sm_json_bytes(struct sm_text *t, const char *key, const void *bytes, size_t n);
#endif
