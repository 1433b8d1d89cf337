/* SPDX-License-Identifier: GPL-3.0-or-later */
/* run.h: one run of a bench sheet: which item's turn it is. An item's turn ends with its capture or
 * when it is skipped, never because the value changed. */
#ifndef SM_BENCH_RUN_H
#define SM_BENCH_RUN_H
#include "bench/sheet.h"

struct sm_carried_item {
    unsigned captures; /* how many it has */
    int64_t capture;   /* n of the latest; 0 none */
    bool skipped;
};

struct sm_carried_run {
    bool has;
    int64_t number;           /* count of the meter's sheet acts */
    char sheet[SM_NAME_SIZE]; /* its file */
    size_t n_items;
    size_t next; /* index of the item that is open or that opens next; n_items: done */
    bool open;   /* the probe is in item `next`, which has no capture yet */
    bool left;   /* item `next` was left before it settled: a transit alone may mean it again
                  * or the one after it, so only a mark (or skipping it) goes on */
    struct sm_carried_item item[SM_ITEMS_MAX];
};

/* A new run over a sheet: its first item comes next. */
void sm_run_begin(struct sm_carried_run *r, int64_t number, const struct sm_sheet *sheet);

/* A transit (marked = false) or a mark says that the probe is in something new. True: item `next`
 * is open now. False: it opens no item: there is none left, a duplicate wants its mark, or the item
 * before was left before it settled; ret_why then says so to the analyst. */
bool sm_run_enter(struct sm_carried_run *r, const struct sm_sheet *sheet, bool marked,
                  char ret_why[SM_REASON_SIZE]);

/* The open item has its capture; the next one's turn comes. */
void sm_run_captured(struct sm_carried_run *r, int64_t capture_n);

/* The immersion of the open item ended. settled_late: it had lasted longer than the dwell, so it
 * may have been the item itself and not a rinse. */
void sm_run_left(struct sm_carried_run *r, bool settled_late);

/* Item `next` is passed over. SM_ESHORT: none is left. */
SM_MUST_CHECK enum sm_status sm_run_skip(struct sm_carried_run *r);

/* A standard has just been captured: is the row of standards it belongs to complete? */
bool sm_run_standards_done(const struct sm_carried_run *r, const struct sm_sheet *sheet);

/* A check has just been captured: is the set of checks it belongs to (those that follow one
 * another) complete? */
bool sm_run_checks_done(const struct sm_carried_run *r, const struct sm_sheet *sheet);

/* Item i is the last check of the sheet with nothing but checks behind it. */
bool sm_run_closing(const struct sm_sheet *sheet, size_t i);

size_t sm_run_measured(const struct sm_carried_run *r);
#endif
