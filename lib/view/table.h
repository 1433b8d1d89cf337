/* SPDX-License-Identifier: GPL-3.0-or-later */
/* table.h: one table out of bench logs, as CSV (RFC 4180, CRLF): results, captures, curves or
 * readings. Pure: texts lie in memory, lines go to a function. Only what a log says is in it:
 * nothing is computed again, save that readings are what the same core reads out of the logged
 * bytes. */
#ifndef SM_VIEW_TABLE_H
#define SM_VIEW_TABLE_H
#include "record/entry.h"

enum sm_export_kind {
    SM_EXPORT_RESULTS,  /* a row per result, in the state that it has at the end of what was read */
    SM_EXPORT_CAPTURES, /* a row per capture */
    SM_EXPORT_CURVE,    /* a row per point of each curve */
    SM_EXPORT_READINGS  /* a row per reading; columns are the profile's channels */
};

struct sm_export_ask {
    enum sm_export_kind kind;
    bool has_run; /* only what belongs to this run */
    int64_t run;
    void (*write)(void *arg, const char *bytes, size_t n); /* whole lines */
    void *arg;
};

struct sm_export;

/* Writes the header row, except of readings, whose channels are not known yet. SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_export_create(const struct sm_export_ask *ask,
                                              struct sm_export **ret_table);
/* One file's text up to its last stamp, in the order of ordinals. later: it is not asked for; it is
 * read for what it changes in the results of those before (SM_EXPORT_RESULTS; else passed over).
 *   SM_ESYNTAX  it cannot be read: ret_why
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_export_add(struct sm_export *t, const char *text, size_t n,
                                           bool later, char ret_why[SM_LINK_TEXT_SIZE]);
/* Writes what had to wait for the end. Returns the number of rows in all. */
size_t sm_export_end(struct sm_export *t);
void sm_export_destroy(struct sm_export *t);
#endif
