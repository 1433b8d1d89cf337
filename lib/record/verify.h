/* SPDX-License-Identifier: GPL-3.0-or-later */
/* verify.h: does a log still say what was signed? Parses only stamps, and the group that fails.
 *
 * Each stamp must have exactly the form that this program writes, be numbered one past the entries
 * it covers, repeat the t and utc of the entry before it, and hold the right hash; a signature must
 * be by the log's key. What follows the last stamp is counted and is no failure (a torn end),
 * unless it cannot be one: a whole line that is no entry or out of number, something other than a
 * stamp after `close`, a stamp by another name, or more than a newline missing behind a whole
 * entry. */
#ifndef SM_RECORD_VERIFY_H
#define SM_RECORD_VERIFY_H
#include "record/chain.h"

struct sm_verify {
    /* of the whole text; where it does not verify, of what stands before */
    bool good; /* every stamp verifies (also where there is none) */
    int64_t stamps, signed_stamps;
    int64_t ordinal;
    char meter[SM_METER_SIZE];
    char key[SM_KEY_HEX]; /* the log's own, from its `open` */
    char last_stamp[SM_HASH_HEX];
    int64_t last_stamp_n;
    int64_t last_signed_n; /* of the last stamp with a signature; 0 none: all up to it is signed */
    size_t stamped_bytes;  /* up to and including the last stamp's line */
    int64_t first_n, last_n; /* first entry; last entry under a stamp (0 none) */
    int64_t last_line_n;     /* highest n of any whole line, after the last stamp too */
    int64_t after_lines;     /* whole lines after the last stamp: never announced */
    size_t after_bytes;
    struct { /* from `open` */
        bool has;
        int64_t ordinal;
        char stamp[SM_HASH_HEX];
    } previous;
    bool closed;    /* ends with `close` and its stamp */
    bool bad_after; /* what does not verify stands behind the last stamp that does, and no stamp
                     * follows it: a damaged end */
    /* the first that does not verify */
    int64_t bad_from, bad_to; /* entries of its group */
    int64_t bad_line; /* line number in the file (from 1) of the first line in it that does not
                       * parse or is out of number; 0: none does */
    char why[SM_REASON_SIZE];
};

/* key_hex: the signer to compare with; NULL: the log's own. Never fails: what is wrong is in ret.
 */
void sm_verify(const char *text, size_t n, const char *key_hex, struct sm_verify *ret_verify);

/* Across two files of one meter that follow one another: missing ordinals, previous stamp. An
 * ordinal of 0 is not known (its `open` was torn).
 *   SM_EVALUE  ret_why */
SM_MUST_CHECK enum sm_status sm_verify_chain(const struct sm_verify *before,
                                             const struct sm_verify *after,
                                             char ret_why[SM_REASON_SIZE]);
#endif
