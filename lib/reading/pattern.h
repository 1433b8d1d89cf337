/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pattern.h: a pattern with named groups (PCRE2, interpreter only) for whole lines, with limits
 * that no pattern and no line can pass. Matching allocates nothing: the memory is taken at
 * creation. */
#ifndef SM_READING_PATTERN_H
#define SM_READING_PATTERN_H
#include "base/status.h"
#include "reading/field.h"

struct sm_pattern;

/*   SM_EINVAL  it does not compile, or is too large: ret_why with the place
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_pattern_create(const char *text, struct sm_pattern **ret_pattern,
                                               char ret_why[SM_REASON_SIZE]);
void sm_pattern_destroy(struct sm_pattern *p); /* NULL is fine */

/* The number of a named group; 0: there is none; -1: several share the name. */
int sm_pattern_group(const struct sm_pattern *p, const char *name);

/* Matches the whole line (at most SM_LINE_MAX bytes).
 *   SM_ESYNTAX  it does not match
 *   SM_EFULL    it hit a limit: the pattern took too long */
SM_MUST_CHECK enum sm_status sm_pattern_match(struct sm_pattern *p, struct sm_span line);

/* What a group took in the last match; s NULL: nothing, or no such group. */
struct sm_span sm_pattern_span(const struct sm_pattern *p, int group, struct sm_span line);
#endif
