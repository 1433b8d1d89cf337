/* SPDX-License-Identifier: GPL-3.0-or-later */
/* carried.h: what the writer and the reader of `carried` share. Private to the room. */
#ifndef SM_RECORD_CARRIED_H
#define SM_RECORD_CARRIED_H
#include "record/entry.h"

/* The sections alone, without the braces: the `carried` entry has them beside its head. */
void sm_carried_sections(struct sm_text *t, const struct sm_carried *c);

extern const char *const sm_carried_class[SM_CLASS_COUNT]; /* names in `usual_wait` */
#endif
