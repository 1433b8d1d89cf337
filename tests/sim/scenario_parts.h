/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario_parts.h: what the statements of a scenario share: parts that settings and steps both
 * read. */
#ifndef SM_SIM_SCENARIO_PARTS_H
#define SM_SIM_SCENARIO_PARTS_H
#include "sim/scenario.h"
#include "sim/words.h"

/* A quantity in the signal's unit. */
bool sm_sim_read_signal(struct sm_sim_words *w, const char *what, const struct sm_scenario *sc,
                        double *ret);
/* A solution's value, which the electrode must feel. */
bool sm_sim_read_solution(struct sm_sim_words *w, const char *what, const struct sm_scenario *sc,
                          double *ret, enum sm_unit *ret_unit);
bool sm_sim_read_noise(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_noise *ret);
bool sm_sim_read_response(struct sm_sim_words *w, const struct sm_scenario *sc,
                          struct sm_sim_response *ret);
bool sm_sim_read_open(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_open *ret);
bool sm_sim_read_drift(struct sm_sim_words *w, const struct sm_scenario *sc, double *ret_per_s);

/* What follows a step's name; step holds its kind and the defaults. */
bool sm_sim_read_step(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_step *step);
#endif
