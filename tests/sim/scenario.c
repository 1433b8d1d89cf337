/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario.c: what a simulated meter lives through; scenario_read.c reads it from text. */
#include "sim/scenario.h"

#include <stdlib.h>
#include <string.h>

const char *sm_sim_step_name(enum sm_sim_step_kind k)
{
    static const char *const name[SM_SIM_STEP_KINDS] = {
        "in",   "back",    "air", "lift",     "rinse", "bubble", "stray", "silence", "unplug",
        "word", "rubbish", "say", "halfline", "late",  "drift",  "noise", "response"
    };
    return name[k];
}

const char *sm_sim_role_name(enum sm_sim_role r)
{
    static const char *const name[SM_SIM_ROLE_COUNT] = { "sample", "standard",  "check",
                                                         "blank",  "duplicate", "spike" };
    return name[r];
}

void sm_scenario_init(struct sm_scenario *sc)
{
    *sc = (struct sm_scenario){
        .seed = 1,
        .signal = SM_UNIT_MV,
        .rate_per_s = 1,
        .response = { SM_SIM_RESPONSE_EXPONENTIAL, 1, 0, 0 },
        .celsius = 20,
        .probe_response_s = 3,
        .open = { SM_SIM_OPEN_WANDER, 300, 0, "" },
        .rinse_unit = SM_UNIT_MV,
        .start_unit = SM_UNIT_MV,
        .tolerance = 0.6,
        .answer_s = 0.1,
    };
    const bool found = sm_sim_shape_known("plain-mv", &sc->shape);
    (void)found;
}

void sm_scenario_free(struct sm_scenario *sc)
{
    free(sc->step);
    sc->step = NULL;
    sc->n_steps = sc->cap_steps = 0;
}

enum sm_status sm_scenario_reserve(struct sm_scenario *sc, size_t n)
{
    if (n > SM_SCENARIO_STEPS_MAX)
        return SM_EFULL;
    if (n <= sc->cap_steps)
        return SM_OK;
    struct sm_sim_step *more = realloc(sc->step, n * sizeof *more);
    if (!more)
        return SM_ENOMEM;
    sc->step = more;
    sc->cap_steps = n;
    return SM_OK;
}

enum sm_status sm_scenario_add(struct sm_scenario *sc, const struct sm_sim_step *step)
{
    if (sc->n_steps == sc->cap_steps) {
        size_t cap = sc->cap_steps == 0 ? 64 : 2 * sc->cap_steps;
        if (cap > SM_SCENARIO_STEPS_MAX && sc->cap_steps < SM_SCENARIO_STEPS_MAX)
            cap = SM_SCENARIO_STEPS_MAX;
        const enum sm_status status = sm_scenario_reserve(sc, cap);
        if (status != SM_OK)
            return status;
    }
    sc->step[sc->n_steps++] = *step;
    return SM_OK;
}

double sm_scenario_wide(const struct sm_scenario *sc)
{
    switch (sc->signal) {
    case SM_UNIT_V:
        return 0.3;
    case SM_UNIT_PH:
        return 5;
    case SM_UNIT_A:
        return 1;
    default:
        return 300;
    }
}

/* The unit in which the electrode feels a solution. */
static enum sm_unit felt_unit(const struct sm_scenario *sc)
{
    switch (sc->electrode.kind) {
    case SM_SIM_ELECTRODE_PH:
        return SM_UNIT_PH;
    case SM_SIM_ELECTRODE_LOG:
    case SM_SIM_ELECTRODE_LINE:
        return SM_UNIT_MG_L;
    case SM_SIM_ELECTRODE_NONE:
        break;
    }
    return sc->signal;
}

enum sm_status sm_scenario_signal(const struct sm_scenario *sc, double value, enum sm_unit unit,
                                  double celsius, double *ret_signal)
{
    double v;

    if (sm_quantity_in((struct sm_quantity){ value, unit }, sc->signal, &v) == SM_OK) {
        *ret_signal = v;
        return SM_OK;
    }
    if (sm_quantity_in((struct sm_quantity){ value, unit }, felt_unit(sc), &v) != SM_OK ||
        (sc->electrode.kind == SM_SIM_ELECTRODE_LOG && !(v > 0)))
        return SM_EINVAL;
    *ret_signal = sm_sim_electrode_signal(&sc->electrode, v, celsius);
    return SM_OK;
}
