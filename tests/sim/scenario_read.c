/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario_read.c: a scenario's text to struct sm_scenario (the statements are told in scenario.h).
 */
#include "sim/scenario_parts.h"

#include <string.h>

typedef bool setting(struct sm_sim_words *w, struct sm_scenario *sc);

static bool set_seed(struct sm_sim_words *w, struct sm_scenario *sc)
{
    unsigned seed = 0;

    if (!sm_sim_words_count(w, "the seed", 0, 4000000000U, &seed))
        return false;
    sc->seed = seed;
    return true;
}

static bool set_signal(struct sm_sim_words *w, struct sm_scenario *sc)
{
    enum sm_unit unit;

    if (w->at < w->n && sm_unit_parse(w->word[w->at].bytes, w->word[w->at].n, &unit) == SM_OK) {
        sc->signal = sc->rinse_unit = sc->start_unit = unit;
        w->at++;
        return true;
    }
    return sm_sim_words_expected(w, "the unit that the meter shows");
}

static bool set_rate(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_per_s(w, "readings", &sc->rate_per_s);
}

static bool set_jitter(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_time(w, "the jitter", 0, 10, &sc->jitter_s);
}

static bool set_dropout(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_percent(w, "readings that never come", 0, 1, &sc->dropout);
}

static bool set_noise(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_noise(w, sc, &sc->noise);
}

static bool set_display_step(struct sm_sim_words *w, struct sm_scenario *sc)
{
    if (!sm_sim_read_signal(w, "the display step", sc, &sc->display_step))
        return false;
    if (sc->display_step >= 0)
        return true;
    w->at -= 2;
    return sm_sim_words_expected(w, "a display step that is not negative");
}

static bool set_response(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_response(w, sc, &sc->response);
}

static bool set_drift(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_drift(w, sc, &sc->drift_per_s);
}

static bool set_temperature(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_in_unit(w, "the temperature", SM_UNIT_CELSIUS, &sc->celsius);
}

static bool set_probe_response(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_time(w, "the response of the temperature", 1e-6, 3600,
                             &sc->probe_response_s);
}

static bool set_electrode(struct sm_sim_words *w, struct sm_scenario *sc)
{
    struct sm_sim_electrode e = { SM_SIM_ELECTRODE_NONE, 0, 0 };

    if (sm_sim_words_is(w, "line")) {
        e.kind = SM_SIM_ELECTRODE_LINE;
        if (sm_sim_words_need(w, "slope") && sm_sim_words_number(w, "slope", -1e6, 1e6, &e.slope) &&
            sm_sim_words_need(w, "offset"))
            sm_sim_words_number(w, "offset", -1e6, 1e6, &e.offset);
    } else {
        if (sm_sim_words_is(w, "pH"))
            e.kind = SM_SIM_ELECTRODE_PH;
        else if (sm_sim_words_need(w, "log"))
            e.kind = SM_SIM_ELECTRODE_LOG;
        if (sc->signal != SM_UNIT_MV)
            return sm_sim_words_expected(w, "an electrode only with a signal in mV");
        if (sm_sim_words_need(w, "slope") && sm_sim_words_percent(w, "slope", -2, 2, &e.slope) &&
            sm_sim_words_need(w, "offset"))
            sm_sim_read_signal(w, "offset", sc, &e.offset);
    }
    sc->electrode = e;
    return !w->wrong;
}

static bool set_open(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_open(w, sc, &sc->open);
}

static bool set_rinse_water(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_solution(w, "the rinse water's value", sc, &sc->rinse_value,
                                &sc->rinse_unit);
}

static bool set_start(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_read_solution(w, "where the electrode stood", sc, &sc->start_value,
                                &sc->start_unit);
}

static bool set_tolerance(struct sm_sim_words *w, struct sm_scenario *sc)
{
    if (!sm_sim_read_signal(w, "the tolerance", sc, &sc->tolerance))
        return false;
    if (sc->tolerance > 0)
        return true;
    w->at -= 2;
    return sm_sim_words_expected(w, "a tolerance over 0");
}

static bool set_dwell(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_time(w, "the dwell", 0, 3600, &sc->dwell_s);
}

static bool set_shape(struct sm_sim_words *w, struct sm_scenario *sc)
{
    struct sm_sim_shape_text t;

    if (!sm_sim_words_text(w, "a shape's name, or a quoted line", false, &t))
        return false;
    if (!w->word[w->at - 1].quoted) {
        if (sm_sim_shape_known(t.bytes, &sc->shape))
            return true;
        w->at--;
        return sm_sim_words_expected(
            w, "plain-mv, r-mv, semi-comma, star-sum, pause-hex, scpi-volt or a quoted line");
    }
    const char *wrong = sm_sim_shape_wrong(&t);
    if (wrong) {
        w->at--;
        return sm_sim_words_expected(w, wrong);
    }
    sc->shape = (struct sm_sim_shape){ .line = t };
    return true;
}

static bool set_status(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_text(w, "the status word when all is well", false, &sc->shape.ok);
}

static bool set_ask(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_text(w, "the question in quotes", true, &sc->shape.ask);
}

static bool set_identity(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_text(w, "the question in quotes", true, &sc->shape.identity) &&
           sm_sim_words_text(w, "the answer in quotes", true, &sc->shape.identity_answer);
}

static bool set_answer(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_time(w, "the time to an answer", 0, 60, &sc->answer_s);
}

static bool set_split(struct sm_sim_words *w, struct sm_scenario *sc)
{
    return sm_sim_words_count(w, "bytes in a piece", 1, SM_SIM_SHAPE_LINE, &sc->split);
}

static const struct {
    const char *name;
    setting *read;
} settings[] = {
    { "seed", set_seed },
    { "signal", set_signal },
    { "rate", set_rate },
    { "jitter", set_jitter },
    { "dropout", set_dropout },
    { "noise", set_noise },
    { "step", set_display_step },
    { "response", set_response },
    { "drift", set_drift },
    { "temperature", set_temperature },
    { "probe-response", set_probe_response },
    { "electrode", set_electrode },
    { "open", set_open },
    { "rinse-water", set_rinse_water },
    { "start", set_start },
    { "tolerance", set_tolerance },
    { "dwell", set_dwell },
    { "shape", set_shape },
    { "status", set_status },
    { "ask", set_ask },
    { "identity", set_identity },
    { "answer", set_answer },
    { "split", set_split },
};
#define SETTINGS (sizeof settings / sizeof settings[0])

/* A scenario half read. */
struct reading {
    struct sm_scenario *sc;
    bool seen[SETTINGS];
    bool any_item; /* an `in` has been: there is a beaker to be `back` in */
};

static bool seen(const struct reading *r, const char *name)
{
    for (size_t i = 0; i < SETTINGS; i++)
        if (strcmp(settings[i].name, name) == 0)
            return r->seen[i];
    return false;
}

static bool any_seen_but_seed(const struct reading *r)
{
    for (size_t i = 0; i < SETTINGS; i++)
        if (r->seen[i] && strcmp(settings[i].name, "seed") != 0)
            return true;
    return false;
}

/* Once, before the steps, and before what is read by its light. */
static bool setting_in_place(struct sm_sim_words *w, struct reading *r, size_t i)
{
    const char *name = settings[i].name;

    w->at = 0;
    if (r->seen[i])
        return sm_sim_words_expected(w, "each setting once");
    if (r->sc->n_steps > 0)
        return sm_sim_words_expected(w, "a step: settings come before the first step");
    if (strcmp(name, "signal") == 0 && any_seen_but_seed(r))
        return sm_sim_words_expected(w, "the signal's unit before all settings but the seed");
    if (strcmp(name, "shape") == 0 && (seen(r, "ask") || seen(r, "identity") || seen(r, "status")))
        return sm_sim_words_expected(w, "the shape before status, ask and identity");
    r->seen[i] = true;
    w->at = 1;
    return true;
}

/* What was not set and follows from what was. */
static void defaults_complete(struct reading *r)
{
    struct sm_scenario *sc = r->sc;

    if (!seen(r, "rinse-water")) {
        sc->rinse_value = sc->electrode.kind == SM_SIM_ELECTRODE_PH    ? 6.5
                          : sc->electrode.kind == SM_SIM_ELECTRODE_LOG ? 0.01
                                                                       : 0;
        sc->rinse_unit = sc->electrode.kind == SM_SIM_ELECTRODE_PH    ? SM_UNIT_PH
                         : sc->electrode.kind == SM_SIM_ELECTRODE_LOG ? SM_UNIT_MG_L
                                                                      : sc->signal;
    }
    if (!seen(r, "open"))
        sc->open.level = sm_scenario_wide(sc);
    if (!seen(r, "start")) {
        sc->start_value = sc->rinse_value;
        sc->start_unit = sc->rinse_unit;
    }
}

static void step_line(struct sm_sim_words *w, struct reading *r, enum sm_sim_step_kind kind)
{
    struct sm_scenario *sc = r->sc;
    struct sm_sim_step step;

    if (sc->n_steps == 0)
        defaults_complete(r);
    memset(&step, 0, sizeof step);
    step.kind = kind;
    step.celsius = sc->celsius;
    step.open = sc->open;
    step.value = sc->rinse_value;
    step.unit = sc->rinse_unit;
    if (kind == SM_SIM_STEP_BACK && !r->any_item) {
        w->at = 0;
        sm_sim_words_expected(w, "an \"in\" before the first \"back\"");
        return;
    }
    if (!sm_sim_read_step(w, sc, &step) || !sm_sim_words_end(w))
        return;
    r->any_item = r->any_item || kind == SM_SIM_STEP_IN;
    if (sm_scenario_add(sc, &step) != SM_OK) {
        w->at = 0;
        sm_sim_words_expected(w, "fewer steps, or more memory");
    }
}

static void line_read(struct sm_sim_words *w, struct reading *r)
{
    /* drift, noise and response are settings before the first step and steps after it */
    for (unsigned k = 0; k < SM_SIM_STEP_KINDS; k++) {
        const bool both =
            k == SM_SIM_STEP_DRIFT || k == SM_SIM_STEP_NOISE || k == SM_SIM_STEP_RESPONSE;
        if (both && r->sc->n_steps == 0)
            continue;
        if (sm_sim_words_is(w, sm_sim_step_name((enum sm_sim_step_kind)k))) {
            step_line(w, r, (enum sm_sim_step_kind)k);
            return;
        }
    }
    for (size_t i = 0; i < SETTINGS; i++) {
        if (sm_sim_words_is(w, settings[i].name)) {
            if (setting_in_place(w, r, i) && settings[i].read(w, r->sc))
                sm_sim_words_end(w);
            return;
        }
    }
    sm_sim_words_expected(w, "a setting or a step");
}

enum sm_status sm_scenario_read(struct sm_scenario *sc, const char *file, const char *text,
                                size_t n, struct sm_blames *b)
{
    const size_t before = b->n + b->left_out;
    struct reading r = { .sc = sc };
    unsigned line = 0;

    if (n > SM_SCENARIO_BYTES_MAX) {
        sm_blames_add(b, file, 0, 0, "a scenario is at most %d bytes", SM_SCENARIO_BYTES_MAX);
        return SM_ESYNTAX;
    }
    for (size_t at = 0; at < n;) {
        const char *end = memchr(text + at, '\n', n - at);
        size_t length = end ? (size_t)(end - text) - at : n - at;
        const size_t next = at + length + 1;
        struct sm_sim_words w;
        if (length > 0 && text[at + length - 1] == '\r')
            length--;
        sm_sim_words_init(&w, file, ++line, text + at, length, b);
        if (sm_sim_words_left(&w))
            line_read(&w, &r);
        at = next;
    }
    if (b->n + b->left_out != before)
        return SM_ESYNTAX;
    if (sc->n_steps == 0) {
        sm_blames_add(b, file, 0, 0, "expected at least one step");
        return SM_ESYNTAX;
    }
    return SM_OK;
}
