/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sim.h: a simulated meter. A scenario goes in, bytes with simulated times come out, as fast as
 * they are taken; nothing here reads a clock. The same scenario gives the same bytes at the same
 * times.
 *
 *     sm_sim_create(&scenario, &sim);
 *     while ((what = sm_sim_next(sim, &t_ns, buf, sizeof buf, &n)) != SM_SIM_END) …
 *
 * A meter that answers says nothing until sm_sim_ask; a driver looks at sm_sim_due to know whether
 * its own deadline (and so a question) comes first. */
#ifndef SM_SIM_SIM_H
#define SM_SIM_SIM_H
#include "sim/probe.h"
#include "sim/scenario.h"

enum sm_sim_what {
    SM_SIM_BYTES, /* n bytes came down the wire */
    SM_SIM_DOWN,  /* the link went */
    SM_SIM_UP,    /* and came back */
    SM_SIM_STEP,  /* a step of the scenario begins (sm_sim_step_now); one that unplugs gives DOWN */
    SM_SIM_QUIET, /* nothing that anyone sees: a reading that never came, say */
    SM_SIM_END    /* the scenario is over */
};

struct sm_sim;

/* sc must outlive the simulator and get no more steps. SM_ENOMEM. */
SM_MUST_CHECK enum sm_status sm_sim_create(const struct sm_scenario *sc, struct sm_sim **ret_sim);
void sm_sim_destroy(struct sm_sim *s); /* NULL is fine */

/* When sm_sim_next has something next (END included); never earlier than what it gave last. */
int64_t sm_sim_due(const struct sm_sim *s);

/* What comes next: one thing, at the time sm_sim_due gave. Bytes go to buf[cap], cap >= 1: a longer
 * piece comes in several calls at the same time. After END only END comes. */
enum sm_sim_what sm_sim_next(struct sm_sim *s, int64_t *ret_t_ns, char *buf, size_t cap,
                             size_t *ret_n);

/* The meter hears bytes at t_ns (not before what sm_sim_next gave last). When they complete a
 * question it knows, the answer is due a little later; a question during an answer replaces it. */
void sm_sim_ask(struct sm_sim *s, int64_t t_ns, const char *bytes, size_t n);

/* The step that began last; NULL: none yet. */
const struct sm_sim_step *sm_sim_step_now(const struct sm_sim *s);

/* Where the meter must be asked: it is asked at the scenario's rate, so that a session can be
 * written without a driver. Before the first sm_sim_next; no effect on a meter that sends by
 * itself. */
void sm_sim_ask_itself(struct sm_sim *s);

/* Runs to the next reading whose line is complete, passing over everything else. False: the
 * scenario is over. ret_text  the value as the display shows it, "-12.4", or the word in its place
 *   ret_word  it is a word */
bool sm_sim_reading(struct sm_sim *s, int64_t *ret_t_ns, char ret_text[SM_SIM_SHAPE_LINE],
                    bool *ret_word);
#endif
