/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario_parts.c: see scenario_parts.h. */
#include "sim/scenario_parts.h"

#include <string.h>

bool sm_sim_read_signal(struct sm_sim_words *w, const char *what, const struct sm_scenario *sc,
                        double *ret)
{
    return sm_sim_words_in_unit(w, what, sc->signal, ret);
}

/* A solution's value, which the electrode must feel. */
bool sm_sim_read_solution(struct sm_sim_words *w, const char *what, const struct sm_scenario *sc,
                          double *ret, enum sm_unit *ret_unit)
{
    const size_t began = w->at;
    double signal;

    if (!sm_sim_words_quantity(w, what, ret, ret_unit))
        return false;
    if (sm_scenario_signal(sc, *ret, *ret_unit, 20, &signal) == SM_OK)
        return true;
    w->at = began;
    return sm_sim_words_expected(
        w, "a value that the electrode feels (the signal's unit, or that of the "
           "electrode; over 0 for a logarithm)");
}

bool sm_sim_read_noise(struct sm_sim_words *w, const struct sm_scenario *sc,
                       struct sm_sim_noise *ret)
{
    struct sm_sim_noise n = { SM_SIM_NOISE_WHITE, 0, 0 };

    if (!sm_sim_read_signal(w, "the noise of a reading", sc, &n.sd))
        return false;
    if (n.sd < 0) {
        w->at -= 2;
        return sm_sim_words_expected(w, "a noise that is not negative");
    }
    if (sm_sim_words_is(w, "ar")) {
        n.kind = SM_SIM_NOISE_AR;
        sm_sim_words_number(w, "the lag-1 coefficient", 0, 0.999, &n.how);
    } else if (sm_sim_words_is(w, "hum")) {
        n.kind = SM_SIM_NOISE_HUM;
        sm_sim_words_per_s(w, "the frequency of the hum", &n.how);
    } else if (sm_sim_words_is(w, "telegraph")) {
        n.kind = SM_SIM_NOISE_TELEGRAPH;
        sm_sim_words_number(w, "the chance of a flip", 0, 1, &n.how);
    } else if (sm_sim_words_left(w)) {
        sm_sim_words_need(w, "white");
    }
    *ret = n;
    return !w->wrong;
}

bool sm_sim_read_response(struct sm_sim_words *w, const struct sm_scenario *sc,
                          struct sm_sim_response *ret)
{
    struct sm_sim_response r = { SM_SIM_RESPONSE_EXPONENTIAL, 0, 0, 0 };

    for (unsigned k = 0; k < SM_SIM_RESPONSE_COUNT; k++)
        if (sm_sim_words_is(w, sm_sim_response_name((enum sm_sim_response_kind)k)))
            r.kind = (enum sm_sim_response_kind)k;
    if (r.kind == SM_SIM_RESPONSE_LAYER && sc->signal != SM_UNIT_MV)
        return sm_sim_words_expected(w, "another response: \"layer\" is for a signal in mV");
    if (!sm_sim_words_time(w, "a response time", 1e-6, 3600, &r.fast_s))
        return false;
    if (r.kind == SM_SIM_RESPONSE_DOUBLE) {
        sm_sim_words_time(w, "the slow response time", 1e-6, 36000, &r.slow_s);
        sm_sim_words_percent(w, "the slow share", -1, 1, &r.share);
    }
    *ret = r;
    return !w->wrong;
}

bool sm_sim_read_open(struct sm_sim_words *w, const struct sm_scenario *sc, struct sm_sim_open *ret)
{
    struct sm_sim_open o = { SM_SIM_OPEN_WANDER, sm_scenario_wide(sc), 0, "" };
    struct sm_sim_shape_text t;

    if (sm_sim_words_is(w, "wander")) {
        if (sm_sim_words_left(w))
            sm_sim_read_signal(w, "how wide it wanders", sc, &o.level);
        if (sm_sim_words_is(w, "clear"))
            sm_sim_read_signal(w, "how far it stays away", sc, &o.clear);
    } else if (sm_sim_words_is(w, "rail")) {
        o.kind = SM_SIM_OPEN_RAIL;
        sm_sim_read_signal(w, "the rail", sc, &o.level);
    } else if (sm_sim_words_need(w, "word")) {
        o.kind = SM_SIM_OPEN_WORD;
        if (sm_sim_words_text(w, "the word that is shown", false, &t)) {
            if (t.n >= sizeof o.word || strlen(t.bytes) != t.n) {
                w->at--;
                return sm_sim_words_expected(w, "a word of at most 16 bytes");
            }
            memcpy(o.word, t.bytes, t.n + 1);
        }
    }
    *ret = o;
    return !w->wrong;
}

bool sm_sim_read_drift(struct sm_sim_words *w, const struct sm_scenario *sc, double *ret_per_s)
{
    double per_s;
    enum sm_unit unit;

    if (!sm_sim_words_change(w, "the drift", &per_s, &unit))
        return false;
    if (sm_quantity_in((struct sm_quantity){ per_s, unit }, sc->signal, ret_per_s) == SM_OK)
        return true;
    w->at--;
    return sm_sim_words_expected(w, "the signal's unit per time");
}
