/* SPDX-License-Identifier: GPL-3.0-or-later */
/* parse.h: one line to one reading, as a profile says. */
#ifndef SM_READING_PARSE_H
#define SM_READING_PARSE_H
#include "reading/profile.h"

struct sm_parser; /* holds the profile's compiled pattern */

/* Compiles a profile (which must outlive the parser).
 *   SM_EINVAL  the pattern does not compile, lacks a channel's group or is too large; a field
 *              number or scale outside its range: ret_why says it
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_parser_create(const struct sm_profile *p,
                                              struct sm_parser **ret_parser,
                                              char ret_why[SM_REASON_SIZE]);
void sm_parser_destroy(struct sm_parser *p); /* NULL is fine */

/* Reads a line. Allocates nothing. ret_mark: the line carries the profile's `mark` word. A channel
 * that the line leaves out is not `present`; at least one must be. A word in place of a number or
 * as the status sets the flag; a number outside `plausible` is OPEN whatever the status says.
 *   SM_ESYNTAX  no reading in it: ret_why says in a few words what was expected where ("checksum
 *               is 3F, the line says 3E"; "field 1: expected a number, got \"abc\""); ret_reading
 *               untouched */
SM_MUST_CHECK enum sm_status sm_parser_read(struct sm_parser *p, int64_t t_ns, const char *line,
                                            size_t n, struct sm_reading *ret_reading,
                                            bool *ret_mark, char ret_why[SM_REASON_SIZE]);

/* Lines whose pattern hit its limit (their ret_why begins "pattern took too long"): a fault of the
 * profile, not of the meter. */
uint64_t sm_parser_too_long(const struct sm_parser *p);

/* Reads the profile's own example and compares. SM_OK where none is given. SM_EVALUE: ret_why. */
SM_MUST_CHECK enum sm_status sm_parser_check_example(struct sm_parser *p,
                                                     char ret_why[SM_REASON_SIZE]);
#endif
