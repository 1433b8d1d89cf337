/* SPDX-License-Identifier: GPL-3.0-or-later */
/* play.h: a scenario on a pseudo-terminal, in real time. */
#ifndef SM_SIM_PLAY_H
#define SM_SIM_PLAY_H
#include <stdio.h>

#include "sim/scenario.h"

struct sm_sim_play {
    const char *link; /* NULL: the path is printed */
    bool wait;        /* begin when the terminal is first opened */
    bool stay;        /* stay on the line after the end, until told to stop */
    unsigned replugs; /* so many times the plug is pulled, */
    double every_s;   /* so often, beside what the scenario does, */
    double away_s;    /* and out for so long */
};

/* Returns after the scenario's end and the last replugging, or at SIGINT or SIGTERM. events: what
 * happens, as it happens; NULL: nothing.
 *   SM_EIO   no terminal, or no link: errno says why
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_sim_play(const struct sm_scenario *sc,
                                         const struct sm_sim_play *how, FILE *events);
#endif
