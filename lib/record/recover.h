/* SPDX-License-Identifier: GPL-3.0-or-later */
/* recover.h: what a new file begins from: the last stamped state of the one before. */
#ifndef SM_RECORD_RECOVER_H
#define SM_RECORD_RECOVER_H
#include "record/entry.h"
#include "record/verify.h"

struct sm_recovered {
    int64_t next_n;         /* past every whole line, left out or not */
    int64_t last_utc_us;    /* of the last stamped entry */
    int64_t carried_utc_us; /* when carried was stated */
    bool closed;
    struct sm_verify verify;
    struct sm_carried carried;     /* the last stamped one (an `open`'s counts) */
    char sheet_file[SM_NAME_SIZE]; /* the sheet in force; "" none */
    char *sheet_text;              /* malloc'd; NULL none */
    size_t sheet_text_n;
};

/* Works on a whole file's text. A stamped part that does not verify is refused: the file is
 * damaged, not torn.
 *   SM_EVALUE  damaged before its last stamp: ret->verify says where; still fills what verified
 *              before
 *   SM_ESHORT  no stamped `open` in it: nothing to begin from (next_n is still set)
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_recover(const char *text, size_t n, struct sm_recovered *ret);
void sm_recovered_finish(struct sm_recovered *r);
#endif
