/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sheet.h: the bench sheet: the ordered list of what is to be measured. Filled by lib/setup. */
#ifndef SM_BENCH_SHEET_H
#define SM_BENCH_SHEET_H
#include "base/status.h"
#include "base/text.h"
#include "base/unit.h"
#include "bench/method.h"

#define SM_ITEMS_MAX 400
#define SM_SHEET_TEXT_MAX (128u * 1024u) /* bytes of its text */

enum sm_item_kind {
    SM_ITEM_STANDARD,
    SM_ITEM_CHECK,
    SM_ITEM_BLANK,
    SM_ITEM_SAMPLE,
    SM_ITEM_DUPLICATE,
    SM_ITEM_SPIKE,
    SM_ITEM_NONE /* no sheet, or not given to any item */
};
const char *sm_item_kind_name(enum sm_item_kind k); /* "standard", … , "none" */
bool sm_item_kind_known(const char *name, enum sm_item_kind *ret_kind);
enum sm_class sm_item_class(enum sm_item_kind k);

struct sm_item {
    enum sm_item_kind kind;
    char name[SM_NAME_SIZE]; /* of the standard, the check standard, or the sample; DUPLICATE,
                              * SPIKE: the sample it repeats */
    int standard;            /* index into the setup's standards; -1: none */
    char place[SM_NAME_SIZE], by[SM_NAME_SIZE]; /* "" not stated */
    bool has_sampled;
    int64_t sampled_utc_us;
    bool has_band;
    double band_from, band_to; /* plausible, unit of results */
};

struct sm_sheet {
    char file[SM_NAME_SIZE]; /* its name as it was handed over */
    int method;              /* index into the setup's methods */
    char sensor[SM_NAME_SIZE];
    size_t n;
    struct sm_item item[SM_ITEMS_MAX];
};

/* What a person calls item i: "standard B4", "check C7", "duplicate of final". */
void sm_item_title(const struct sm_item *item, struct sm_text *t);
#endif
