/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario_steps.c: the steps of a scenario, as told in scenario.h. */
#include "sim/scenario_parts.h"

#include <string.h>

static const double longest_s = 7 * 86400.0;

typedef bool statement(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_step *step);

static bool span(struct sm_sim_words *w, struct sm_sim_step *step)
{
    return sm_sim_words_time(w, "how long", 0.001, longest_s, &step->span_s);
}

static bool step_role(struct sm_sim_words *w, struct sm_sim_step *step)
{
    for (unsigned r = 0; r < SM_SIM_ROLE_COUNT; r++) {
        if (sm_sim_words_is(w, sm_sim_role_name((enum sm_sim_role)r))) {
            step->role = (enum sm_sim_role)r;
            return true;
        }
    }
    return sm_sim_words_expected(w, "sample, standard, check, blank, duplicate or spike");
}

static bool sample_change(struct sm_sim_words *w, double sign, struct sm_sim_step *step)
{
    enum sm_unit unit;
    double per_s;

    if (!sm_sim_words_change(w, "the sample's own change", &per_s, &unit))
        return false;
    if (sm_quantity_in((struct sm_quantity){ sign * per_s, unit }, step->unit, &step->per_s) ==
        SM_OK)
        return true;
    w->at--;
    return sm_sim_words_expected(w, "the value's unit per time");
}

static bool step_in(struct sm_sim_words *w, const struct sm_scenario *sc, struct sm_sim_step *step)
{
    struct sm_sim_shape_text name;

    if (!sm_sim_words_text(w, "the name of what the probe is in", false, &name))
        return false;
    if (!sm_name_ok(name.bytes, name.n)) {
        w->at--;
        return sm_sim_words_expected(w, "a name of 1 to 64 characters");
    }
    sm_text_copy(step->name, sizeof step->name, name.bytes);
    if (!sm_sim_read_solution(w, "its value", sc, &step->value, &step->unit) ||
        !sm_sim_words_need(w, "for") || !span(w, step))
        return false;
    while (sm_sim_words_left(w)) {
        if (sm_sim_words_is(w, "at"))
            sm_sim_words_in_unit(w, "its temperature", SM_UNIT_CELSIUS, &step->celsius);
        else if (sm_sim_words_is(w, "falling"))
            sample_change(w, -1, step);
        else if (sm_sim_words_is(w, "rising"))
            sample_change(w, 1, step);
        else if (sm_sim_words_need(w, "as"))
            step_role(w, step);
    }
    return !w->wrong;
}

static bool step_span(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_step *step)
{
    (void)sc;
    return span(w, step);
}

static bool step_air(struct sm_sim_words *w, const struct sm_scenario *sc, struct sm_sim_step *step)
{
    return span(w, step) && (!sm_sim_words_left(w) || sm_sim_read_open(w, sc, &step->open));
}

static bool step_rinse(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_step *step)
{
    if (!span(w, step))
        return false;
    if (sm_sim_words_is(w, "in"))
        return sm_sim_read_solution(w, "the rinse's value", sc, &step->value, &step->unit);
    return true;
}

static bool step_bubble(struct sm_sim_words *w, const struct sm_scenario *sc,
                        struct sm_sim_step *step)
{
    return sm_sim_read_signal(w, "how far", sc, &step->amount) && sm_sim_words_need(w, "for") &&
           span(w, step);
}

static bool step_stray(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_step *step)
{
    if (!sm_sim_words_count(w, "stray readings", 1, 1000, &step->count))
        return false;
    return !sm_sim_words_is(w, "by") || sm_sim_read_signal(w, "how far", sc, &step->amount);
}

static bool step_late(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_step *step)
{
    (void)sc;
    return sm_sim_words_time(w, "how long the next answer takes", 0, 600, &step->amount);
}

static bool step_word(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_step *step)
{
    (void)sc;
    struct sm_sim_shape_text t;

    if (!sm_sim_words_text(w, "the word that is shown", false, &t))
        return false;
    if (t.n >= sizeof step->open.word || strlen(t.bytes) != t.n) {
        w->at--;
        return sm_sim_words_expected(w, "a word of at most 16 bytes");
    }
    step->open.kind = SM_SIM_OPEN_WORD;
    memcpy(step->open.word, t.bytes, t.n + 1);
    return sm_sim_words_need(w, "for") && span(w, step);
}

static bool step_rubbish(struct sm_sim_words *w, const struct sm_scenario *sc,
                         struct sm_sim_step *step)
{
    (void)sc;
    if (!sm_sim_words_count(w, "bytes", 1, 10000000, &step->count))
        return false;
    step->printable = sm_sim_words_is(w, "printable");
    return true;
}

static bool step_say(struct sm_sim_words *w, const struct sm_scenario *sc, struct sm_sim_step *step)
{
    (void)sc;
    step->count = 1;
    if (!sm_sim_words_text(w, "the bytes in quotes", true, &step->text))
        return false;
    return !sm_sim_words_is(w, "times") || sm_sim_words_count(w, "times", 1, 100000, &step->count);
}

static bool step_halfline(struct sm_sim_words *w, const struct sm_scenario *sc,
                          struct sm_sim_step *step)
{
    (void)sc;
    (void)step;
    return !w->wrong;
}

static bool step_drift(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_step *step)
{
    return sm_sim_read_drift(w, sc, &step->amount);
}

static bool step_noise(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_step *step)
{
    return sm_sim_read_noise(w, sc, &step->noise);
}

static bool step_response(struct sm_sim_words *w, const struct sm_scenario *sc,
                          struct sm_sim_step *step)
{
    return sm_sim_read_response(w, sc, &step->response);
}

static statement *const steps[SM_SIM_STEP_KINDS] = {
    [SM_SIM_STEP_IN] = step_in,
    [SM_SIM_STEP_BACK] = step_span,
    [SM_SIM_STEP_AIR] = step_air,
    [SM_SIM_STEP_LIFT] = step_air,
    [SM_SIM_STEP_RINSE] = step_rinse,
    [SM_SIM_STEP_BUBBLE] = step_bubble,
    [SM_SIM_STEP_STRAY] = step_stray,
    [SM_SIM_STEP_SILENCE] = step_span,
    [SM_SIM_STEP_UNPLUG] = step_span,
    [SM_SIM_STEP_WORD] = step_word,
    [SM_SIM_STEP_RUBBISH] = step_rubbish,
    [SM_SIM_STEP_SAY] = step_say,
    [SM_SIM_STEP_HALFLINE] = step_halfline,
    [SM_SIM_STEP_LATE] = step_late,
    [SM_SIM_STEP_DRIFT] = step_drift,
    [SM_SIM_STEP_NOISE] = step_noise,
    [SM_SIM_STEP_RESPONSE] = step_response,
};

bool sm_sim_read_step(struct sm_sim_words *w, const struct sm_scenario *sc,
                      struct sm_sim_step *step)
{
    return steps[step->kind](w, sc, step);
}
