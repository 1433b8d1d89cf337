/* SPDX-License-Identifier: GPL-3.0-or-later */
/* probe.h: the electrode without noise: where its signal and its temperature stand at any time, as
 * it is moved from solution to solution; and the truth of a whole scenario, worked out from that.
 */
#ifndef SM_SIM_PROBE_H
#define SM_SIM_PROBE_H
#include <stdint.h>

#include "sim/scenario.h"

struct sm_sim_probe {
    const struct sm_sim_step *item,
        *solution;                        /* the last IN; what it is in or was in last (lent) */
    struct sm_sim_response response;      /* of the solution it is in */
    struct sm_sim_response next_response; /* from the next solution on */
    int64_t dipped_t_ns;
    double from, to; /* signal at the dip, and the end of this solution at the dip */
    double to_per_s; /* the solution's own change, in signal */
    double celsius_from, celsius_to, celsius_s; /* first order, from the dip or the lift */
    int64_t celsius_t_ns;
    double drift, drift_per_s; /* of the electrode, on top of all this */
    int64_t drift_t_ns;
};

/* sc must outlive p and get no more steps. */
void sm_sim_probe_start(struct sm_sim_probe *p, const struct sm_scenario *sc);

/* Begins a step at its time; steps that do not concern the electrode change nothing. */
void sm_sim_probe_step(struct sm_sim_probe *p, const struct sm_scenario *sc,
                       const struct sm_sim_step *step, int64_t t_ns);

double sm_sim_probe_signal(const struct sm_sim_probe *p, int64_t t_ns);
double sm_sim_probe_end(const struct sm_sim_probe *p,
                        int64_t t_ns); /* where it is heading, drift included */
double sm_sim_probe_drift(const struct sm_sim_probe *p,
                          int64_t t_ns); /* the electrode's part in both */
double sm_sim_probe_celsius(const struct sm_sim_probe *p, int64_t t_ns);

/* How long a step lasts. */
int64_t sm_sim_step_span_ns(const struct sm_sim_step *step);

/* One row of the truth: a stay in a solution (its `back`s included), or something that happened. */
struct sm_sim_stay {
    enum sm_sim_step_kind kind; /* IN, AIR, LIFT, RINSE, BUBBLE, SILENCE, UNPLUG, WORD */
    unsigned item;              /* IN: from 1; else 0 */
    const char *name;           /* IN: lent by the scenario; else "" */
    enum sm_sim_role role;      /* IN */
    int64_t begin_t_ns, end_t_ns;
    double value; /* IN, RINSE: in unit, at the beginning */
    enum sm_unit unit;
    double celsius;    /* of the solution */
    double end;        /* IN, RINSE: the end of the response, signal, on the drift line at end_t */
    double settle_s;   /* IN, RINSE: from begin_t: the first time after which the noiseless signal
                        * stays within the scenario's tolerance of its end */
    double calm_s;     /* IN: longest stretch without lift, bubble, silence, word, unplugging */
    bool stayed_three; /* IN: calm_s >= 3 * settle_s, and 3 * the scenario's dwell */
};

struct sm_sim_truth {
    struct sm_sim_stay *stay;
    size_t n;
    int64_t end_t_ns; /* of the session */
};

SM_MUST_CHECK enum sm_status sm_sim_truth_create(const struct sm_scenario *sc,
                                                 struct sm_sim_truth *ret_truth);
void sm_sim_truth_free(struct sm_sim_truth *t);
#endif
