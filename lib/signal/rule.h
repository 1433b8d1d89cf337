/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rule.h: the rule for "settled" with its parameters, resolved in the signal's own unit. */
#ifndef SM_SIGNAL_RULE_H
#define SM_SIGNAL_RULE_H
#include <stdbool.h>
#include <stdint.h>

enum sm_rule_kind {
    SM_RULE_ARRIVAL,
    SM_RULE_HALVES,
    SM_RULE_SPREAD,
    SM_RULE_SUCCESSIVE,
    SM_RULE_DRIFT,
    SM_RULE_TIMED,
    SM_RULE_SINGLE,
    SM_RULE_COUNT
};
const char *sm_rule_name(enum sm_rule_kind k); /* "arrival", "spread", … */
bool sm_rule_known(const char *name, enum sm_rule_kind *ret_kind);
bool sm_rule_built(enum sm_rule_kind k); /* false: known, and not possible yet */

/* What the probe is in, as far as the signal cares: tolerance, doubt and waits may differ. */
enum sm_class { SM_CLASS_STANDARD, SM_CLASS_CHECK, SM_CLASS_SAMPLE, SM_CLASS_COUNT };

struct sm_rule {
    enum sm_rule_kind kind;
    double tolerance[SM_CLASS_COUNT];           /* u (the signal's unit), > 0 */
    double doubt[SM_CLASS_COUNT];               /* 0 … 1 */
    double drift_allowed_per_s[SM_CLASS_COUNT]; /* u/s, >= 0 */
    int64_t dwell_ns;                           /* least time in one place */
    int64_t longest_wait_ns[SM_CLASS_COUNT];    /* from the move; then "not settled" */
    int64_t over_ns;                            /* spread, drift: the span that is judged */
    unsigned readings;                          /* successive: how many */
    int64_t apart_ns;                           /* successive: how far apart */
    double limit;                               /* successive: u; drift: u/min */
    double single_u;                            /* single: standard uncertainty, u */
    bool has_plausible;                         /* else none is too far */
    double plausible_from, plausible_to;        /* outside: open circuit */
};
#endif
