/* SPDX-License-Identifier: GPL-3.0-or-later */
/* probe.c: see probe.h. */
#include "sim/probe.h"

#include <math.h>
#include <stdlib.h>

static double seconds(int64_t from_t_ns, int64_t to_t_ns)
{
    return (double)(to_t_ns - from_t_ns) / 1e9;
}

/* A scenario that was read or generated holds only values that the electrode feels. */
static double signal_of(const struct sm_scenario *sc, double value, enum sm_unit unit,
                        double celsius)
{
    double signal = 0;

    return sm_scenario_signal(sc, value, unit, celsius, &signal) == SM_OK ? signal : 0;
}

void sm_sim_probe_start(struct sm_sim_probe *p, const struct sm_scenario *sc)
{
    const double start = signal_of(sc, sc->start_value, sc->start_unit, sc->celsius);

    *p = (struct sm_sim_probe){ .response = sc->response,
                                .next_response = sc->response,
                                .from = start,
                                .to = start,
                                .celsius_from = sc->celsius,
                                .celsius_to = sc->celsius,
                                .celsius_s = sc->probe_response_s,
                                .drift_per_s = sc->drift_per_s };
}

static double without_drift(const struct sm_sim_probe *p, int64_t t_ns)
{
    const double t_s = seconds(p->dipped_t_ns, t_ns);

    return p->to + p->to_per_s * t_s + sm_sim_response_left(&p->response, p->from - p->to, t_s);
}

double sm_sim_probe_drift(const struct sm_sim_probe *p, int64_t t_ns)
{
    return p->drift + p->drift_per_s * seconds(p->drift_t_ns, t_ns);
}

double sm_sim_probe_signal(const struct sm_sim_probe *p, int64_t t_ns)
{
    return without_drift(p, t_ns) + sm_sim_probe_drift(p, t_ns);
}

double sm_sim_probe_end(const struct sm_sim_probe *p, int64_t t_ns)
{
    return p->to + p->to_per_s * seconds(p->dipped_t_ns, t_ns) + sm_sim_probe_drift(p, t_ns);
}

double sm_sim_probe_celsius(const struct sm_sim_probe *p, int64_t t_ns)
{
    const double t_s = seconds(p->celsius_t_ns, t_ns);

    return p->celsius_to + (p->celsius_from - p->celsius_to) * exp(-t_s / p->celsius_s);
}

static void warm_towards(struct sm_sim_probe *p, double celsius, int64_t t_ns)
{
    p->celsius_from = sm_sim_probe_celsius(p, t_ns);
    p->celsius_to = celsius;
    p->celsius_t_ns = t_ns;
}

static void dip(struct sm_sim_probe *p, const struct sm_scenario *sc,
                const struct sm_sim_step *step, int64_t t_ns)
{
    const double from = without_drift(p, t_ns);
    const double little = 1e-6 * fabs(step->value) + 1e-9;

    p->solution = step;
    warm_towards(p, step->celsius, t_ns);
    p->to = signal_of(sc, step->value, step->unit, step->celsius);
    p->to_per_s = 0;
    if (step->per_s > 0 || step->per_s < 0) /* for a logarithm: as it is at the beginning */
        p->to_per_s = step->per_s / little *
                      (signal_of(sc, step->value + little, step->unit, step->celsius) - p->to);
    p->from = from;
    p->dipped_t_ns = t_ns;
    p->response = p->next_response;
}

void sm_sim_probe_step(struct sm_sim_probe *p, const struct sm_scenario *sc,
                       const struct sm_sim_step *step, int64_t t_ns)
{
    switch (step->kind) {
    case SM_SIM_STEP_IN:
        p->item = step;
        dip(p, sc, step, t_ns);
        break;
    case SM_SIM_STEP_RINSE:
        dip(p, sc, step, t_ns);
        break;
    case SM_SIM_STEP_BACK:
        if (p->solution == p->item) /* the film on it was that beaker's all the time */
            warm_towards(p, p->item->celsius, t_ns);
        else
            dip(p, sc, p->item, t_ns);
        break;
    case SM_SIM_STEP_AIR:
    case SM_SIM_STEP_LIFT:
        warm_towards(p, sc->celsius, t_ns);
        break;
    case SM_SIM_STEP_DRIFT:
        p->drift = sm_sim_probe_drift(p, t_ns);
        p->drift_per_s = step->amount;
        p->drift_t_ns = t_ns;
        break;
    case SM_SIM_STEP_RESPONSE:
        p->next_response = step->response;
        break;
    default:
        break;
    }
}

int64_t sm_sim_step_span_ns(const struct sm_sim_step *step)
{
    return (int64_t)llround(step->span_s * 1e9);
}

/* What the walk through the steps keeps in mind. */
struct walk {
    struct sm_sim_probe probe;
    struct sm_sim_stay *item; /* the last beaker; NULL: none yet */
    bool in_item;             /* the probe is in it */
    int64_t calm_from_t_ns;
    unsigned items;
};

static void calm_ends(struct walk *w, int64_t t_ns)
{
    if (w->in_item && seconds(w->calm_from_t_ns, t_ns) > w->item->calm_s)
        w->item->calm_s = seconds(w->calm_from_t_ns, t_ns);
}

static double settle_s(const struct walk *w, const struct sm_scenario *sc)
{
    return sm_sim_response_settle_s(&w->probe.response, w->probe.from - w->probe.to, sc->tolerance);
}

static void dipped(struct walk *w, const struct sm_scenario *sc, const struct sm_sim_step *step,
                   struct sm_sim_stay *stay)
{
    stay->value = step->value;
    stay->unit = step->unit;
    stay->celsius = step->celsius;
    stay->end = sm_sim_probe_end(&w->probe, stay->end_t_ns);
    stay->settle_s = settle_s(w, sc);
}

/* The stay that a step makes, if any, into *stay; gives whether it made one. */
static bool walk_step(struct walk *w, const struct sm_scenario *sc, const struct sm_sim_step *step,
                      int64_t t_ns, struct sm_sim_stay *stay)
{
    const int64_t end_t_ns = t_ns + sm_sim_step_span_ns(step);
    const bool leaves = step->kind == SM_SIM_STEP_IN || step->kind == SM_SIM_STEP_AIR ||
                        step->kind == SM_SIM_STEP_LIFT || step->kind == SM_SIM_STEP_RINSE;
    const bool disturbs = step->kind == SM_SIM_STEP_BUBBLE || step->kind == SM_SIM_STEP_SILENCE ||
                          step->kind == SM_SIM_STEP_UNPLUG || step->kind == SM_SIM_STEP_WORD;

    if (leaves || disturbs)
        calm_ends(w, t_ns);
    if (leaves)
        w->in_item = false;
    sm_sim_probe_step(&w->probe, sc, step, t_ns);
    *stay = (struct sm_sim_stay){ .kind = step->kind, .name = "", .celsius = sc->celsius };
    stay->begin_t_ns = t_ns;
    stay->end_t_ns = end_t_ns;
    if (step->kind == SM_SIM_STEP_BACK && !w->in_item) {
        const double again_s = settle_s(w, sc); /* longer than before if it was elsewhere */
        if (w->probe.dipped_t_ns == t_ns && again_s > w->item->settle_s)
            w->item->settle_s = again_s;
        w->in_item = true;
        w->calm_from_t_ns = t_ns;
    }
    if (step->kind == SM_SIM_STEP_IN || step->kind == SM_SIM_STEP_RINSE)
        dipped(w, sc, step, stay);
    if (step->kind == SM_SIM_STEP_IN) {
        stay->item = ++w->items;
        stay->name = step->name;
        stay->role = step->role;
        w->item = stay;
        w->in_item = true;
        w->calm_from_t_ns = t_ns;
    } else if (w->in_item) { /* time goes on in the beaker */
        w->item->end_t_ns = end_t_ns;
        w->item->end = sm_sim_probe_end(&w->probe, end_t_ns);
        if (disturbs)
            w->calm_from_t_ns = end_t_ns;
    }
    return leaves || disturbs;
}

enum sm_status sm_sim_truth_create(const struct sm_scenario *sc, struct sm_sim_truth *ret_truth)
{
    struct walk w = { .item = NULL };
    struct sm_sim_truth t = { NULL, 0, 0 };

    t.stay = calloc(sc->n_steps + 1, sizeof *t.stay);
    if (!t.stay)
        return SM_ENOMEM;
    sm_sim_probe_start(&w.probe, sc);
    for (size_t i = 0; i < sc->n_steps; i++) {
        if (walk_step(&w, sc, &sc->step[i], t.end_t_ns, &t.stay[t.n]))
            t.n++;
        t.end_t_ns += sm_sim_step_span_ns(&sc->step[i]);
    }
    calm_ends(&w, t.end_t_ns);
    for (size_t i = 0; i < t.n; i++)
        t.stay[i].stayed_three = t.stay[i].kind == SM_SIM_STEP_IN &&
                                 t.stay[i].calm_s >= 3 * fmax(t.stay[i].settle_s, sc->dwell_s);
    *ret_truth = t;
    return SM_OK;
}

void sm_sim_truth_free(struct sm_sim_truth *t)
{
    free(t->stay);
    t->stay = NULL;
    t->n = 0;
}
