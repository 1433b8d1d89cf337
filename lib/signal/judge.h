/* SPDX-License-Identifier: GPL-3.0-or-later */
/* judge.h: has this stay settled? One door for all rules; each rule is a file of its own. */
#ifndef SM_SIGNAL_JUDGE_H
#define SM_SIGNAL_JUDGE_H
#include <stdbool.h>

#include "signal/rule.h"
#include "signal/signal.h"
#include "signal/stay.h"

struct sm_judge {
    const struct sm_rule *rule;
    enum sm_class class;
    const struct sm_stay *stay;
    int64_t t_ns; /* of the latest reading, which is in the stay */
    double sd;    /* noise of a reading, u; 0 unknown */
    double step;  /* display step, u; 0 unknown */
};

/* True: it has; ret_settled is complete but for the clock. */
bool sm_judge_settled(const struct sm_judge *j, struct sm_settled *ret_settled);

/* How far back the rule looks: the window keeps so much. */
int64_t sm_judge_over_ns(const struct sm_rule *rule);

/* spread.c: largest less smallest within the tolerance. */
bool sm_spread_settled(const struct sm_judge *j, struct sm_settled *ret_settled);

/* prescribed.c: value, uncertainty and evidence of a capture by a rule that makes no probability.
 */
void sm_prescribed(const struct sm_judge *j, struct sm_settled *ret_settled);
#endif
