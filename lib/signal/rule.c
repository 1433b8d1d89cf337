/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rule.c: the names of the rules, and which are built. */
#include "signal/rule.h"

#include <assert.h>
#include <string.h>

/* A rule is built when judge.c has a case for it. */
static const struct {
    const char *name;
    bool built;
} rules[SM_RULE_COUNT] = {
    [SM_RULE_ARRIVAL] = { "arrival", false }, [SM_RULE_HALVES] = { "halves", false },
    [SM_RULE_SPREAD] = { "spread", true },    [SM_RULE_SUCCESSIVE] = { "successive", false },
    [SM_RULE_DRIFT] = { "drift", false },     [SM_RULE_TIMED] = { "timed", false },
    [SM_RULE_SINGLE] = { "single", false },
};

const char *sm_rule_name(enum sm_rule_kind k)
{
    assert((unsigned)k < SM_RULE_COUNT);
    return rules[k].name;
}

bool sm_rule_known(const char *name, enum sm_rule_kind *ret_kind)
{
    for (unsigned k = 0; k < SM_RULE_COUNT; k++) {
        if (strcmp(rules[k].name, name) == 0) {
            *ret_kind = (enum sm_rule_kind)k;
            return true;
        }
    }
    return false;
}

bool sm_rule_built(enum sm_rule_kind k)
{
    return (unsigned)k < SM_RULE_COUNT && rules[k].built;
}
