/* SPDX-License-Identifier: GPL-3.0-or-later */
/* phrase.h: the parts that all sentences are made of: items, durations, values with their
 * uncertainty. Private to the room. */
#ifndef SM_VIEW_PHRASE_H
#define SM_VIEW_PHRASE_H
#include <stdint.h>

#include "base/text.h"

/* "sample final", "standard B4", "duplicate of final". kind is the log's word for it; the title of
 * a duplicate or a spike says itself what it is. Safe for a terminal. */
void sm_phrase_item(struct sm_text *t, const char *kind, const char *title, size_t title_n);

/* "12 s", "4 min", "2 h 10 min"; a negative one is 0 s. */
void sm_phrase_duration(struct sm_text *t, int64_t ns);

/* "-58.31 mV", with decimals that go with nothing in particular: three. */
void sm_phrase_value(struct sm_text *t, double value, const char *unit);

/* "-58.3 ± 1.1 mV": the uncertainty to two figures. */
void sm_phrase_with_u95(struct sm_text *t, double value, double u95, const char *unit);
#endif
