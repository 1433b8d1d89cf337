/* SPDX-License-Identifier: GPL-3.0-or-later */
/* event.h: the event that has a file of its own. Private to the room. */
#ifndef SM_RECORD_EVENT_H
#define SM_RECORD_EVENT_H
#include "record/entry.h"

void sm_event_curve_write(struct sm_text *t, const struct sm_event_curve *c);
#endif
