/* SPDX-License-Identifier: GPL-3.0-or-later */
/* judge.h: is a curve fit to give results? Each rule with its figure, its limit and its verdict; R²
 * comes last and is never enough. */
#ifndef SM_BENCH_JUDGE_H
#define SM_BENCH_JUDGE_H
#include "bench/method.h"

/* One rule applied: the quantity, its figure, the limit and the verdict. */
struct sm_judged {
    char quantity[48]; /* "levels", "r_squared", … */
    double value, from, to;
    bool has_from, has_to;
    bool pass;
    char text[SM_REASON_SIZE]; /* in words, with what to do when failed */
};
#define SM_JUDGED_MAX 12

struct sm_judgement {
    bool fitted, accepted;
    struct sm_curve curve; /* when fitted */
    size_t n;
    struct sm_judged judged[SM_JUDGED_MAX];
};

/* Fits the method's model to the standards' points and applies the method's rules. */
void sm_judge_curve(const struct sm_method *m, const struct sm_point *p, size_t n,
                    struct sm_judgement *ret_judgement);

/* The value of point i read back from the curve; NaN where there is none. */
double sm_judge_read_back(const struct sm_curve *c, const struct sm_point *p);

/* A check standard of value `want` was read as `found`: within the method's limit? Judged before
 * rounding, no allowance. ret_why says it in words. */
bool sm_judge_check(const struct sm_method *m, double want, double found,
                    char ret_why[SM_REASON_SIZE]);
#endif
