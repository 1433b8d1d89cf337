/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sheet.c: names of what can stand on a bench sheet. */
#include "bench/sheet.h"

#include <string.h>

static const struct {
    const char *name;
    enum sm_class class;
} kinds[] = {
    [SM_ITEM_STANDARD] = { "standard", SM_CLASS_STANDARD },
    [SM_ITEM_CHECK] = { "check", SM_CLASS_CHECK },
    [SM_ITEM_BLANK] = { "blank", SM_CLASS_CHECK },
    [SM_ITEM_SAMPLE] = { "sample", SM_CLASS_SAMPLE },
    [SM_ITEM_DUPLICATE] = { "duplicate", SM_CLASS_SAMPLE },
    [SM_ITEM_SPIKE] = { "spike", SM_CLASS_SAMPLE },
    [SM_ITEM_NONE] = { "none", SM_CLASS_SAMPLE },
};

const char *sm_item_kind_name(enum sm_item_kind k)
{
    return kinds[k].name;
}

bool sm_item_kind_known(const char *name, enum sm_item_kind *ret_kind)
{
    for (int k = SM_ITEM_STANDARD; k <= SM_ITEM_NONE; k++) {
        if (strcmp(name, kinds[k].name) == 0) {
            *ret_kind = (enum sm_item_kind)k;
            return true;
        }
    }
    return false;
}

enum sm_class sm_item_class(enum sm_item_kind k)
{
    return kinds[k].class;
}

void sm_item_title(const struct sm_item *item, struct sm_text *t)
{
    switch (item->kind) {
    case SM_ITEM_STANDARD:
    case SM_ITEM_CHECK:
    case SM_ITEM_BLANK:
        sm_text_addf(t, "%s %s", sm_item_kind_name(item->kind), item->name);
        break;
    case SM_ITEM_DUPLICATE:
        sm_text_addf(t, "duplicate of %s", item->name);
        break;
    case SM_ITEM_SPIKE:
        sm_text_addf(t, "spike of %s", item->name);
        break;
    case SM_ITEM_SAMPLE:
    case SM_ITEM_NONE:
        sm_text_add(t, item->name);
        break;
    }
}
