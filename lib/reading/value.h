/* SPDX-License-Identifier: GPL-3.0-or-later */
/* value.h: one channel's pieces of a line to its value. */
#ifndef SM_READING_VALUE_H
#define SM_READING_VALUE_H
#include "base/status.h"
#include "reading/field.h"

struct sm_pieces {
    struct sm_span value, unit, sign; /* s NULL: the line has none */
    bool unit_wanted;                 /* the profile says where the unit stands: it must be there */
};

/* The flag that a word stands for and the word as the profile has it; SM_FLAG_OK, NULL: none. */
enum sm_flag sm_flag_of_word(const struct sm_profile *p, struct sm_span s, const char **ret_word);

/* Reads channel i into a value that is all zero. Without a value piece it stays not `present`.
 *   SM_ESYNTAX  it is there but is not what the profile says: appended to why */
SM_MUST_CHECK enum sm_status sm_value_read(const struct sm_profile *p, size_t i,
                                           const struct sm_pieces *piece, struct sm_value *v,
                                           struct sm_text *why);
#endif
