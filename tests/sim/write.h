/* SPDX-License-Identifier: GPL-3.0-or-later */
/* write.h: a session and its truth as files.
 *
 * CSV      time_s,value: the readings as displayed; a word in place of a value leaves no row.
 * lines    t_ns TAB bytes, each byte as in the bench log (printable ASCII as itself, \" and \\,
 * else \u00xx); the link as t_ns TAB TAB down, and up. events   time_s,step,name: what happens
 * when. A name that starts with = + - @ gets an apostrophe. truth
 * item,name,kind,begin_s,end_s,true_value,unit,temperature_c,true_end_mv,t_settle_s,calm_s,
 *          stayed_three: a row per stay and happening (probe.h). true_end_mv is in the signal's own
 *          unit where that is not mV. Cells that do not apply are empty. */
#ifndef SM_SIM_WRITE_H
#define SM_SIM_WRITE_H
#include <stdio.h>

#include "sim/sim.h"

/* All give SM_EIO when something was not written, SM_ENOMEM. */
SM_MUST_CHECK enum sm_status sm_sim_write_truth(const struct sm_scenario *sc, FILE *f);
SM_MUST_CHECK enum sm_status sm_sim_write_csv(const struct sm_scenario *sc, FILE *f);
SM_MUST_CHECK enum sm_status sm_sim_write_lines(const struct sm_scenario *sc, FILE *f);
SM_MUST_CHECK enum sm_status sm_sim_write_events(const struct sm_scenario *sc, FILE *f);

void sm_sim_write_event_head(FILE *f);
void sm_sim_write_event(FILE *f, int64_t t_ns, const struct sm_sim_step *step);
#endif
