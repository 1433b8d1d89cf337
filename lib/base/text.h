/* SPDX-License-Identifier: GPL-3.0-or-later */
/* text.h: text of bounded length, UTF-8, names, and what may go to a terminal. */
#ifndef SM_BASE_TEXT_H
#define SM_BASE_TEXT_H
#include <stdarg.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define SM_NAME_CHARS 64   /* most characters of a name */
#define SM_NAME_SIZE 260   /* bytes that hold any name and its NUL */
#define SM_METER_SIZE 33   /* bytes that hold any meter's name and its NUL */
#define SM_REASON_SIZE 200 /* bytes that hold one sentence to the analyst */

/* Text growing in storage of the caller's, always NUL-terminated. What does not fit is left off and
 * `cut` says so: the last whole character stays, and once cut nothing more is added, so that what
 * stands is always the beginning of what was meant. */
struct sm_text {
    char *buf;
    size_t cap, len;
    bool cut;
};

void sm_text_init(struct sm_text *t, char *buf, size_t cap); /* cap >= 1 */
void sm_text_add(struct sm_text *t, const char *s);
void sm_text_addn(struct sm_text *t, const char *s, size_t n);
__attribute__((format(printf, 2, 3))) void sm_text_addf(struct sm_text *t, const char *fmt, ...);
__attribute__((format(printf, 2, 0))) void sm_text_addv(struct sm_text *t, const char *fmt,
                                                        va_list args);

/* Any bytes, made harmless for a terminal: printable ASCII and well-formed UTF-8 as itself (no C1
 * controls, no direction overrides), everything else as \xNN. */
void sm_text_add_safe(struct sm_text *t, const char *bytes, size_t n);

/* Copies s into out[cap], whole or (cut at a character's end) as much as fits. */
void sm_text_copy(char *out, size_t cap, const char *s);

/* The character at the head of s[n]: its bytes, 1 to 4; 0 where none is well-formed or n is 0.
 * ret_code may be NULL. */
size_t sm_utf8_next(const char *s, size_t n, uint32_t *ret_code);

/* Bytes of well-formed UTF-8 (RFC 3629: no surrogates, no overlong forms) at the head of s[n]. */
size_t sm_utf8_span(const char *s, size_t n);

/* A name: well-formed UTF-8, 1 to 64 characters, no control character (C0, DEL, C1), no direction
 * control (U+061C, U+200E, U+200F, U+202A..202E, U+2066..2069: Unicode's Bidi_Control), no white
 * space at either end. */
bool sm_name_ok(const char *s, size_t n);

/* A meter's name: [a-z0-9-]{1,32}. */
bool sm_meter_name_ok(const char *s, size_t n);

/* Edit distance (insert, delete, replace, swap of neighbours = 1), for "did you mean"; strings over
 * 64 bytes count as 64 apart. */
size_t sm_text_distance(const char *a, const char *b);
#endif
