/* SPDX-License-Identifier: GPL-3.0-or-later */
/* result.h: from a capture and an accepted curve to a result, between the standards only. */
#ifndef SM_BENCH_RESULT_H
#define SM_BENCH_RESULT_H
#include "bench/method.h"

enum sm_result_state {
    SM_RESULT_PROVISIONAL,
    SM_RESULT_RELEASED,
    SM_RESULT_HELD,
    SM_RESULT_AMENDED,
    SM_RESULT_VOIDED
};
const char *sm_result_state_name(enum sm_result_state s);

struct sm_made_result {
    bool has_value;
    double value, u95; /* in the method's unit; 95 % by Student's t of the curve */
    char shown[24];    /* outside the standards: "< 1.68" or "> 10.07"; "" otherwise */
    bool held;
    char why[SM_REASON_SIZE]; /* held: why, and what would bring it inside */
};

/* signal, u95_signal: the capture; t_c: its temperature (NERNST), unknown when !has_t.
 * Uncertainty (JCGM 100): position of the curve, the capture, and what the residuals show beyond
 * the standards' own captures (mean_u2: mean squared standard uncertainty of those, signal unit).
 */
void sm_result_make(const struct sm_method *m, const struct sm_curve *curve, double signal,
                    double u95_signal, bool has_t, double t_c, double mean_u2,
                    struct sm_made_result *ret_result);
#endif
