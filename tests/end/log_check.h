/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_check.h: all log files of one meter, looked at from outside after the fact: each verifies,
 * the chain holds from file to file, no number and no ordinal is used twice; and whether a line
 * that was announced is in them, byte for byte and under a stamp. A test fails where it is not so.
 */
#ifndef SM_TESTS_LOG_CHECK_H
#define SM_TESTS_LOG_CHECK_H
#include "check.h"

#include "record/verify.h"

#define LOG_CHECK_FILES 4096

struct log_check_line {
    int64_t n;
    const char *text;
    size_t len; /* the newline included */
};

struct log_check {
    char *path[LOG_CHECK_FILES];
    char *text[LOG_CHECK_FILES];
    size_t size[LOG_CHECK_FILES];
    size_t n_files;
    struct log_check_line *line; /* under a stamp, in order of n */
    size_t n_lines, cap;
    int64_t after_lines; /* whole lines after last stamps: never announced */
    size_t n_unshown;    /* files that were begun and never shown */
    struct sm_verify last;
};

/* Reads the folder, with all that is said above. what: for messages. */
void log_check_load(struct log_check *c, const char *folder, const char *what);
void log_check_free(struct log_check *c);

/* The line with this number; NULL: none is under a stamp. */
const struct log_check_line *log_check_find(const struct log_check *c, int64_t n);
/* Each line of announced[n] is there. */
void log_check_has(const struct log_check *c, const char *announced, size_t n, const char *what);
/* Lines of this kind, under a stamp. */
size_t log_check_count(const struct log_check *c, const char *kind);

/* What is announced only once it is on disk. */
bool log_check_held_back(const char *line, size_t n);
#endif
