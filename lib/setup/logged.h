/* SPDX-License-Identifier: GPL-3.0-or-later */
/* logged.h: the setup files that a bench log carries in its `file` entries, as a source of setup.
 */
#ifndef SM_SETUP_LOGGED_H
#define SM_SETUP_LOGGED_H
#include "setup/setup.h"

struct sm_logged { /* all zero: nothing yet */
    struct {
        char name[SM_SETUP_PATH_SIZE];
        char *text;
        size_t n;
    } file[SM_SETUP_FILES_MAX];
    size_t n;
};

/* Keeps a copy; a file of the same name is replaced.
 *   SM_EFULL  too many files, or one too large;  SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_logged_add(struct sm_logged *l, const char *name, const char *text,
                                           size_t n);
void sm_logged_finish(struct sm_logged *l);

/* Reads out of l, which must outlive it. */
void sm_logged_source(struct sm_logged *l, struct sm_source *ret_source);
#endif
