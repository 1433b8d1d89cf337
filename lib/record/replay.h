/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay.h: a log run again through the same core, and its events compared. Pure: texts in memory.
 */
#ifndef SM_RECORD_REPLAY_H
#define SM_RECORD_REPLAY_H
#include "record/entry.h"

enum sm_compare { SM_COMPARE_BYTES, SM_COMPARE_TOLERANCE };

/* Do two entries' texts agree? BYTES: the same bytes. TOLERANCE: kinds, order, numbers of entries,
 * names and times equal, other reals within 1e-9 relative (a residual or a difference relative to
 * the largest real beside it, since it is known no better than what it is the difference of).
 * ret_why: the first key that differs, with both values. */
bool sm_replay_agree(enum sm_compare how, const char *logged, size_t n_logged, const char *again,
                     size_t n_again, char ret_why[SM_REASON_SIZE]);
#endif
