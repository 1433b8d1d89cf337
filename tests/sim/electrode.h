/* SPDX-License-Identifier: GPL-3.0-or-later */
/* electrode.h: what the meter would show in a solution once everything has settled, and the ways in
 * which an electrode gets there. The simulator's own formulas: nothing here comes from the program
 * under test. */
#ifndef SM_SIM_ELECTRODE_H
#define SM_SIM_ELECTRODE_H
#include "base/unit.h"

enum sm_sim_electrode_kind {
    SM_SIM_ELECTRODE_NONE, /* the meter shows the solution's value itself */
    SM_SIM_ELECTRODE_PH,   /* offset - slope * kN(t) * (pH - 7) */
    SM_SIM_ELECTRODE_LOG,  /* offset + slope * kN(t) * log10(x), x in mg/L; slope negative for an
                            * anion
                            */
    SM_SIM_ELECTRODE_LINE  /* offset + slope * x */
};

struct sm_sim_electrode {
    enum sm_sim_electrode_kind kind;
    double slope;  /* PH, LOG: share of the theoretical one (0.986); LINE: signal per unit of x */
    double offset; /* in the signal's unit: at pH 7, at 1 mg/L, at 0 */
};

/* ln(10) R T / F in mV; R and F exact since the SI of 2019. */
double sm_sim_electrode_nernst_mv(double celsius);

/* The settled signal; LOG needs value > 0. */
double sm_sim_electrode_signal(const struct sm_sim_electrode *e, double value, double celsius);

/* Published shapes of the way there. */
enum sm_sim_response_kind {
    SM_SIM_RESPONSE_EXPONENTIAL, /* exp(-t/fast) */
    SM_SIM_RESPONSE_DOUBLE, /* (1-share) exp(-t/fast) + share exp(-t/slow); share < 0 overshoots */
    SM_SIM_RESPONSE_HYPERBOLIC, /* 1 / (1 + t/fast) */
    SM_SIM_RESPONSE_SQRT,       /* 1 / (1 + sqrt(t/fast)) */
    SM_SIM_RESPONSE_LAYER,      /* logarithm of an exponential: a diffusion layer in front of the
                                 * membrane, with RT/F at 20 °C; signal in mV only */
    SM_SIM_RESPONSE_COUNT
};

struct sm_sim_response {
    enum sm_sim_response_kind kind;
    double fast_s;
    double slow_s, share; /* DOUBLE */
};

const char *sm_sim_response_name(enum sm_sim_response_kind k);

/* What is left at t_s >= 0 after immersion of a step (signal at immersion less its end). */
double sm_sim_response_left(const struct sm_sim_response *r, double step, double t_s);

/* The first time after which what is left stays within tolerance (> 0). */
double sm_sim_response_settle_s(const struct sm_sim_response *r, double step, double tolerance);
#endif
