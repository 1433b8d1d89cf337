/* SPDX-License-Identifier: GPL-3.0-or-later */
/* field.h: a line split into fields, and comparing what a meter wrote with what a person wrote. */
#ifndef SM_READING_FIELD_H
#define SM_READING_FIELD_H
#include "base/text.h"
#include "reading/profile.h"

struct sm_span { /* a piece of a line, not NUL-terminated; s NULL: not there */
    const char *s;
    size_t n;
};

/* s without blanks, CR and LF at either end. */
struct sm_span sm_span_trim(struct sm_span s);

/* The first SM_FIELDS_MAX fields of a line: parted by blanks (SPLIT_SPACES) or by c (SPLIT_CHAR;
 * each trimmed, may be empty). Returns how many there are. */
size_t sm_fields_split(enum sm_split split, char c, struct sm_span line,
                       struct sm_span ret_field[SM_FIELDS_MAX]);

/* A meter's bytes are a person's word: as UTF-8, or with each character below U+0100 as one byte (a
 * meter's ° is often the one byte B0). */
bool sm_span_is(struct sm_span s, const char *word);

/* "+" or "-" and nothing else. */
bool sm_span_is_sign(struct sm_span s);

/* Which of a profile's words of one meaning it is; NULL: none of them. */
const char *sm_span_in(struct sm_span s, const char words[SM_WORDS_MAX][SM_WORD_SIZE]);

/* Appends it in quotes, made harmless and cut, for a message. */
void sm_span_quote(struct sm_text *t, struct sm_span s);
#endif
