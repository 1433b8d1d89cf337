/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sentence.h: what a meter does now and what comes next, in sentences. Page and terminal take
 * theirs from here; what an entry says is in entry_sentence.h. */
#ifndef SM_VIEW_SENTENCE_H
#define SM_VIEW_SENTENCE_H
#include "base/time.h"
#include "core/core.h"

/* "Settling in sample final for 12 s. Next: duplicate of final." Names are safe for a terminal.
 * now_t_ns: the time of the question, on the clock of the file. */
void sm_sentence(const struct sm_core_status *s, int64_t now_t_ns, struct sm_text *t);
#endif
