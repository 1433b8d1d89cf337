/* SPDX-License-Identifier: GPL-3.0-or-later */
/* check_setup.h: `stillmarkd --setup FILE --check`, and the setup as every program reads it from
 * disk. */
#ifndef SM_CHECK_SETUP_H
#define SM_CHECK_SETUP_H
#include <stdio.h>

#include "base/text.h"
#include "setup/setup.h"

/* Reads the whole setup; what is wrong goes to standard error, a line each. Exit status 0, or 2 and
 * *ret_setup is left as it is. */
int sm_read_setup(const char *file, struct sm_setup **ret_setup);

/* A line each, and a last one where more were found than are listed. */
void sm_print_blames(const struct sm_blames *b, FILE *err);

/* One line per meter on standard output, what was understood; or all that is wrong on standard
 * error. Exit status 0 or 2. */
int sm_check_setup(const char *file);
/* Sentences on what is possible but doubtful, a line each, into t: a tolerance under three display
 * steps as the profile's example implies them. */
void sm_warn_meter(const struct sm_setup *s, size_t meter, struct sm_text *t);
/* What was understood of one meter, in plain words, safe for a terminal. */
void sm_describe_meter(const struct sm_setup *s, size_t meter, struct sm_text *t);
#endif
