/* SPDX-License-Identifier: GPL-3.0-or-later */
/* limit.h: within the room: limits of a method, and when a curve and its checks are accepted. */
#ifndef SM_SETUP_LIMIT_H
#define SM_SETUP_LIMIT_H
#include "setup/parts.h"

/* A limit: a quantity above 0 that converts to `unit`, within what makes sense there. A unit that
 * is not known (SM_UNIT_COUNT: blamed already) takes none, silently. */
bool sm_get_limit(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                  double *ret_value);

/* Levels, R² and the rules beside it, checks and duplicates; after model and units are known. */
void sm_acceptance_fill(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m);

/* What lies between the fields of a filled method becomes zero, so that equal methods are equal in
 * memory. */
void sm_method_plain(struct sm_method *m);
#endif
