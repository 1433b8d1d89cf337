/* SPDX-License-Identifier: GPL-3.0-or-later */
/* run.c: whose turn it is. */
#include "bench/run.h"

#include <assert.h>
#include <string.h>

void sm_run_begin(struct sm_carried_run *r, int64_t number, const struct sm_sheet *sheet)
{
    memset(r, 0, sizeof *r);
    r->has = true;
    r->number = number;
    sm_text_copy(r->sheet, sizeof r->sheet, sheet->file);
    r->n_items = sheet->n;
}

/* "standard B4", "final" … of the item whose turn it is. */
static void title(const struct sm_carried_run *r, const struct sm_sheet *sheet, char *out,
                  size_t cap)
{
    struct sm_text t;

    sm_text_init(&t, out, cap);
    sm_item_title(&sheet->item[r->next], &t);
}

bool sm_run_enter(struct sm_carried_run *r, const struct sm_sheet *sheet, bool marked,
                  char ret_why[SM_REASON_SIZE])
{
    char name[SM_NAME_SIZE + 16];
    struct sm_text why;

    if (r->next >= r->n_items) {
        sm_text_copy(ret_why, SM_REASON_SIZE, "every item of the sheet has been measured");
        return false;
    }
    title(r, sheet, name, sizeof name);
    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    if (!marked && r->left) {
        sm_text_addf(&why,
                     "%.80s was left before it settled: press next when the probe is in it again, "
                     "or skip it",
                     name);
        return false;
    }
    if (!marked && sheet->item[r->next].kind == SM_ITEM_DUPLICATE) {
        sm_text_addf(&why, "%.80s may read like its sample: press next when the probe is in it",
                     name);
        return false;
    }
    r->open = true;
    r->left = false;
    return true;
}

void sm_run_captured(struct sm_carried_run *r, int64_t capture_n)
{
    assert(r->open && r->next < r->n_items);
    r->item[r->next].captures++;
    r->item[r->next].capture = capture_n;
    r->open = false;
    r->next++;
    while (r->next < r->n_items && r->item[r->next].skipped)
        r->next++;
}

void sm_run_left(struct sm_carried_run *r, bool settled_late)
{
    if (r->open && settled_late)
        r->left = true;
    r->open = false;
}

enum sm_status sm_run_skip(struct sm_carried_run *r)
{
    if (r->next >= r->n_items)
        return SM_ESHORT;
    r->item[r->next].skipped = true;
    r->open = r->left = false;
    while (r->next < r->n_items && r->item[r->next].skipped)
        r->next++;
    return SM_OK;
}

bool sm_run_standards_done(const struct sm_carried_run *r, const struct sm_sheet *sheet)
{
    return r->next >= r->n_items || sheet->item[r->next].kind != SM_ITEM_STANDARD;
}

bool sm_run_checks_done(const struct sm_carried_run *r, const struct sm_sheet *sheet)
{
    return r->next >= r->n_items || sheet->item[r->next].kind != SM_ITEM_CHECK;
}

bool sm_run_closing(const struct sm_sheet *sheet, size_t i)
{
    for (; i < sheet->n; i++) {
        if (sheet->item[i].kind != SM_ITEM_CHECK)
            return false;
    }
    return true;
}

size_t sm_run_measured(const struct sm_carried_run *r)
{
    size_t n = 0;

    for (size_t i = 0; i < r->n_items; i++)
        n += r->item[i].captures > 0;
    return n;
}
