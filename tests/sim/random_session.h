/* SPDX-License-Identifier: GPL-3.0-or-later */
/* random_session.h: a scenario drawn by a seed: so many beaker changes, each by a transit, with
 * steps, responses, noise, stray readings, lifts, rinses shorter than the dwell and gaps, all at
 * random; its truth is that of any scenario (probe.h). In mV. */
#ifndef SM_SIM_RANDOM_SESSION_H
#define SM_SIM_RANDOM_SESSION_H
#include "sim/scenario.h"

struct sm_random_session {
    unsigned beakers;
    uint64_t seed;
    double tolerance, dwell_s;     /* for which it is meant: mV, s */
    double rate_from, rate_to;     /* readings/s, log-uniform, one for the session */
    double noise_from, noise_to;   /* mV, standard deviation, log-uniform */
    bool white_only;               /* else white, ar, hum or telegraph */
    double display_step;           /* mV */
    unsigned responses;            /* 1 << SM_SIM_RESPONSE_…, those that may be drawn */
    double fast_from_s, fast_to_s; /* log-uniform; the square-root form a hundredth of it */
    double longest_settle_s;       /* of twice the largest step: slower ones are drawn again */
    double step_from, step_to;     /* mV from beaker to beaker, log-uniform */
    double air_shortest_s;         /* between beakers, 6 s at most; also at least five readings:
                                    * what is shorter may be taken for stray readings */
    double air_clear;              /* mV: in air never nearer to the electrode's value, since air
                                    * that happens to read alike cannot be told from a beaker */
    double rinse_clear;            /* mV: the same of rinses, against the beaker before */
    double rinse_longest;          /* in dwells, < 1 */
    double rinse_share, lift_share, stray_share, gap_share; /* 0 … 1, of the beakers */
    double gap_longest_s;                                   /* silences last 3 s to this */
    double short_share; /* beakers left before they have settled */
    double drift_most;  /* mV/h either way */
};

/* Tolerance 0.6 mV, dwell 22 s, 0.5 to 10 readings/s, noise 0.05 mV to 0.1 mV, step 0.1 mV, all
 * responses, 0.3 to 40 s, settling within 400 s; air from 2 s and 10 mV away, rinses as they come.
 */
void sm_random_session_init(struct sm_random_session *r, unsigned beakers, uint64_t seed);

/* Draws it into an initialised sc. The same r gives the same scenario.
 *   SM_EINVAL  a range that is empty, or no response settles soon enough
 *   SM_ENOMEM, SM_EFULL */
SM_MUST_CHECK enum sm_status sm_random_session_make(const struct sm_random_session *r,
                                                    struct sm_scenario *sc);
#endif
