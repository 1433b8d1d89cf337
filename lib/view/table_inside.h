/* SPDX-License-Identifier: GPL-3.0-or-later */
/* table_inside.h: what table.c asks of table_readings.c. */
#ifndef SM_VIEW_TABLE_INSIDE_H
#define SM_VIEW_TABLE_INSIDE_H
#include "view/table.h"

struct sm_export_readings; /* made at the first file */

enum sm_status sm_export_readings_add(const struct sm_export_ask *ask,
                                      struct sm_export_readings **readings, const char *text,
                                      size_t n, size_t *rows, char ret_why[SM_LINK_TEXT_SIZE]);
void sm_export_readings_destroy(struct sm_export_readings *r); /* NULL is fine */
#endif
