/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rerun.h: one file of a bench log run again: its logged inputs through the same core, every logged
 * event and every `carried` compared with what comes out now. Pure: the text lies in memory. */
#ifndef SM_VIEW_RERUN_H
#define SM_VIEW_RERUN_H
#include "record/entry.h"
#include "record/replay.h"

struct sm_rerun_ask {
    const char *text; /* the file, up to and including its last stamp */
    size_t n;
    /* What outlived the file before, as rerun told it; NULL: the first file asked for. */
    const struct sm_carried *before;
    int64_t before_ordinal;
    /* A method's text in place of the one in the log (by the file's name without folder); NULL:
     * none. */
    const char *method_name, *method_text;
    size_t method_n;
    /* Told of each difference, in one line; at most most_told times. */
    void (*tell)(void *arg, const char *line);
    void *arg;
    size_t most_told;
    /* Told of every event that comes out, the live ones too; lent during the call. NULL: not. */
    void (*event)(void *arg, const struct sm_event *e, const struct sm_core_setup *setup);
    void *event_arg;
};

struct sm_rerun_told {
    enum sm_compare how; /* bytes where the arithmetic agrees */
    bool other_core;     /* the log was made by another core number */
    int64_t core, ordinal;
    char meter[SM_METER_SIZE];
    size_t inputs, events, differences, passed_over;
    bool chained;                /* it was compared with what the file before ended with */
    bool rolled;                 /* the file ends in a change of file */
    struct sm_carried *last;     /* what outlives this file; malloc'd, the caller frees */
    char why[SM_LINK_TEXT_SIZE]; /* could not be run: why */
};

/*   SM_ESYNTAX  the file cannot be run again: ret_told->why
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_rerun(const struct sm_rerun_ask *ask,
                                      struct sm_rerun_told *ret_told);
#endif
