/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_list.h: the log files that a command was given, folders opened up, in the order in which they
 * were written. */
#ifndef SM_DAEMON_LOG_LIST_H
#define SM_DAEMON_LOG_LIST_H
#include <stdint.h>

#include "base/status.h"
#include "record/verify.h"
#include "whole_file.h"

struct sm_log_file {
    char *path;
    int64_t ordinal; /* from its `open`, else from its name; 0 neither says */
    struct sm_verify verify;
};

struct sm_log_list {
    struct sm_log_file *file; /* [n], one meter after the other, rising ordinals */
    size_t n, cap;
    char why[512]; /* of a failure */
};

void sm_log_list_init(struct sm_log_list *l);
void sm_log_list_finish(struct sm_log_list *l);
/* A file, or all log files of a folder.
 *   SM_EIO     l->why
 *   SM_ENOMEM  l->why */
SM_MUST_CHECK enum sm_status sm_log_list_add(struct sm_log_list *l, const char *path);
/* Later files in the folders of those already there, that are not there themselves. */
SM_MUST_CHECK enum sm_status sm_log_list_add_later(struct sm_log_list *l);
/* Verifies each (key_hex NULL: against its own key) and puts them in order.
 *   SM_EIO  l->why */
SM_MUST_CHECK enum sm_status sm_log_list_verify(struct sm_log_list *l, const char *key_hex);
#endif
