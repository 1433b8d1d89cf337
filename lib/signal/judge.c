/* SPDX-License-Identifier: GPL-3.0-or-later */
/* judge.c: the door to the rules. */
#include "signal/judge.h"

bool sm_judge_settled(const struct sm_judge *j, struct sm_settled *ret_settled)
{
    if (j->stay->n == 0 || j->t_ns - j->stay->dwell_t_ns < j->rule->dwell_ns ||
        j->t_ns - j->stay->swift_t_ns < j->rule->dwell_ns)
        return false;
    switch (j->rule->kind) {
    case SM_RULE_SPREAD:
        return sm_spread_settled(j, ret_settled);
    case SM_RULE_ARRIVAL: /* a rule that is not built is refused when the signal is made */
    case SM_RULE_HALVES:
    case SM_RULE_SUCCESSIVE:
    case SM_RULE_DRIFT:
    case SM_RULE_TIMED:
    case SM_RULE_SINGLE:
    case SM_RULE_COUNT:
        break;
    }
    return false;
}

int64_t sm_judge_over_ns(const struct sm_rule *rule)
{
    return rule->over_ns;
}
