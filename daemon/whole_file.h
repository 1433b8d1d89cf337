/* SPDX-License-Identifier: GPL-3.0-or-later */
/* whole_file.h: a file's text in memory, read only, however large. */
#ifndef SM_DAEMON_WHOLE_FILE_H
#define SM_DAEMON_WHOLE_FILE_H
#include <stddef.h>

struct sm_whole_file {
    const char *text; /* n bytes, not NUL-terminated; valid for an empty file too */
    size_t n;
    void *mapped; /* NULL: empty */
};

/* 0, or -errno. */
int sm_whole_file_open(const char *path, struct sm_whole_file *ret_file);
void sm_whole_file_close(struct sm_whole_file *f);
#endif
