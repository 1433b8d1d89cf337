/* SPDX-License-Identifier: GPL-3.0-or-later */
/* source_disk.h: setup files from the file system, for lib/setup. Only plain files that lie, links
 * followed, in or below the folder of the setup file. */
#ifndef SM_SOURCE_DISK_H
#define SM_SOURCE_DISK_H
#include "setup/setup.h"

struct sm_disk {
    char root[4096];               /* the setup file's folder, links followed; "" none: any file */
    char file[SM_SETUP_PATH_SIZE]; /* the setup file itself: it may be a link to anywhere */
};

/* Sources of the setup in `file`. d must outlive it. A folder that is not there makes every get
 * fail with its reason. */
void sm_source_disk(struct sm_disk *d, const char *file, struct sm_source *ret_source);

/* The whole of a plain file of at most limit bytes, NUL behind it, in malloc'd storage.
 *   SM_EIO, SM_EFULL  ret_why;  SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_disk_read(const char *path, size_t limit, char **ret_text,
                                          size_t *ret_n, char ret_why[SM_REASON_SIZE]);
#endif
