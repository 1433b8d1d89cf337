/* SPDX-License-Identifier: GPL-3.0-or-later */
/* load.h: one line of JSON of unknown origin to an object, strictly and with ceilings. */
#ifndef SM_RECORD_LOAD_H
#define SM_RECORD_LOAD_H
#include <jansson.h>

#include "base/status.h"
#include "base/text.h"

#define SM_JSON_DEPTH 16    /* objects and lists within one another */
#define SM_JSON_PARTS 65536 /* objects, lists and commas */

/* The object on line[n], owned by the caller (json_decref). Duplicate keys, bad UTF-8, anything
 * behind the object, more than SM_ENTRY_MAX bytes and what passes the ceilings above is refused.
 *   SM_ESYNTAX  ret_why */
SM_MUST_CHECK enum sm_status sm_json_load(const char *line, size_t n, json_t **ret_object,
                                          char ret_why[SM_REASON_SIZE]);

/* Bytes of the object at the head of s[n], by its brackets alone; 0: it does not end in s[n]. */
size_t sm_json_span(const char *s, size_t n);
#endif
