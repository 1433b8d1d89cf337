/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_sentence.h: what the analyst should know of an entry of the bench log, in a sentence. Page
 * and terminal take theirs from here. The entry comes over a socket or out of a file and may hold
 * anything: what is missing or of another type is passed over, and nothing that could disturb a
 * terminal comes through. */
#ifndef SM_VIEW_ENTRY_SENTENCE_H
#define SM_VIEW_ENTRY_SENTENCE_H
#include <jansson.h>

#include "base/text.h"

/* One line without newline; false: nothing worth a line, and nothing is added. Says something about
 * capture, curve, check, result, hold, release, question, answer, moved, not-settled, open-circuit,
 * silent, unread, act, link, clock, open, close and raw. */
bool sm_entry_sentence(const json_t *entry, struct sm_text *t);

/* "sample final" of {"kind":"sample","name":"final"}, the form in which status and entries name an
 * item; false: it names none. */
bool sm_item_sentence(const json_t *item, struct sm_text *t);
#endif
