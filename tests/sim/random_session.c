/* SPDX-License-Identifier: GPL-3.0-or-later */
/* random_session.c: see random_session.h. */
#include "sim/random_session.h"

#include <math.h>
#include <stdio.h>

#include "sim/probe.h"
#include "sim/prng.h"

#define STEPS_PER_BEAKER 12            /* at most */
static const double farthest_mv = 400; /* beakers stay within this of 0 */

void sm_random_session_init(struct sm_random_session *r, unsigned beakers, uint64_t seed)
{
    *r = (struct sm_random_session){
        .beakers = beakers,
        .seed = seed,
        .tolerance = 0.6,
        .dwell_s = 22,
        .rate_from = 0.5,
        .rate_to = 10,
        .noise_from = 0.05,
        .noise_to = 0.1,
        .display_step = 0.1,
        .responses = (1U << SM_SIM_RESPONSE_COUNT) - 1,
        .fast_from_s = 0.3,
        .fast_to_s = 40,
        .longest_settle_s = 400,
        .step_from = 1,
        .step_to = 180,
        .air_shortest_s = 2,
        .air_clear = 10,
        .rinse_clear = 10,
        .rinse_longest = 0.9,
        .rinse_share = 0.7,
        .lift_share = 0.2,
        .stray_share = 0.3,
        .gap_share = 0.1,
        .gap_longest_s = 15,
        .short_share = 0.1,
        .drift_most = 2,
    };
}

struct draw {
    const struct sm_random_session *r;
    struct sm_scenario *sc;
    struct sm_sim_prng p;
    enum sm_status status; /* of the first step that could not be added */
    double least_s;        /* five readings: what is shorter cannot be seen */
    struct sm_sim_response response;
    double value;              /* of the last beaker */
    struct sm_sim_probe probe; /* where the electrode is after what was added, */
    int64_t t_ns;              /* at this time */
};

static void add(struct draw *d, const struct sm_sim_step *step)
{
    if (d->status == SM_OK)
        d->status = sm_scenario_add(d->sc, step);
    if (d->status != SM_OK)
        return;
    const struct sm_sim_step *added = &d->sc->step[d->sc->n_steps - 1];
    sm_sim_probe_step(&d->probe, d->sc, added, d->t_ns);
    d->t_ns += sm_sim_step_span_ns(added);
}

/* Whole milliseconds, so that a session written as text would be the same. */
static double draw_s(struct draw *d, double from, double to)
{
    const double s = sm_sim_prng_between(&d->p, from, to);

    return round(1000 * fmax(s, from)) / 1000;
}

static double at_least(double s, double least_s)
{
    return s > least_s ? s : least_s;
}

/* Where the electrode stands, but for its drift. */
static double now_mv(const struct draw *d)
{
    return sm_sim_probe_signal(&d->probe, d->t_ns) - sm_sim_probe_drift(&d->probe, d->t_ns);
}

static void add_air(struct draw *d, enum sm_sim_step_kind kind)
{
    struct sm_sim_step step = { .kind = kind, .celsius = d->sc->celsius, .open = d->sc->open };

    const double shortest_s = kind == SM_SIM_STEP_LIFT ? 1 : d->r->air_shortest_s;
    step.span_s = at_least(draw_s(d, shortest_s, 6), d->least_s);
    add(d, &step);
}

static void add_rinse(struct draw *d)
{
    const double longest_s = d->r->rinse_longest * d->r->dwell_s;
    struct sm_sim_step step = { .kind = SM_SIM_STEP_RINSE,
                                .celsius = d->sc->celsius,
                                .unit = SM_UNIT_MV };

    step.span_s = draw_s(d, fmin(at_least(2, d->least_s), longest_s), longest_s);
    step.value = round(sm_sim_prng_between(&d->p, -200, 200) * 10) / 10;
    const double off = step.value - now_mv(d);
    if (fabs(off) < d->r->rinse_clear)
        step.value += copysign(d->r->rinse_clear, off) - off;
    add(d, &step);
}

static void add_span(struct draw *d, enum sm_sim_step_kind kind, double span_s)
{
    const struct sm_sim_step step = { .kind = kind, .celsius = d->sc->celsius, .span_s = span_s };

    add(d, &step);
}

static bool draw_response(struct draw *d)
{
    for (int tries = 0; tries < 1000; tries++) {
        struct sm_sim_response x = { .kind = (enum sm_sim_response_kind)sm_sim_prng_below(
                                         &d->p, SM_SIM_RESPONSE_COUNT) };
        x.fast_s = sm_sim_prng_log_between(&d->p, d->r->fast_from_s, d->r->fast_to_s);
        x.slow_s = x.fast_s * sm_sim_prng_log_between(&d->p, 5, 60);
        x.share = sm_sim_prng_between(&d->p, 0.05, 0.2) * (sm_sim_prng_chance(&d->p, 0.2) ? -1 : 1);
        if (x.kind == SM_SIM_RESPONSE_SQRT)
            x.fast_s /= 100;
        if ((d->r->responses >> x.kind & 1) &&
            sm_sim_response_settle_s(&x, 2 * d->r->step_to, d->r->tolerance) <=
                d->r->longest_settle_s) {
            d->response = x;
            return true;
        }
    }
    return false;
}

/* Air, perhaps one or two rinses, air. */
static void add_transit(struct draw *d)
{
    const struct sm_sim_step response = { .kind = SM_SIM_STEP_RESPONSE, .response = d->response };

    add(d, &response);
    add_air(d, SM_SIM_STEP_AIR);
    if (!sm_sim_prng_chance(&d->p, d->r->rinse_share))
        return;
    for (unsigned rinses = 1 + sm_sim_prng_below(&d->p, 2); rinses > 0; rinses--) {
        add_rinse(d);
        add_air(d, SM_SIM_STEP_AIR);
    }
}

/* Disturbances come early, so that the calm part behind them is whole. */
static void add_disturbance(struct draw *d)
{
    if (sm_sim_prng_chance(&d->p, d->r->lift_share)) {
        add_air(d, SM_SIM_STEP_LIFT);
    } else if (sm_sim_prng_chance(&d->p, d->r->gap_share)) {
        add_span(d, SM_SIM_STEP_SILENCE, draw_s(d, 3, d->r->gap_longest_s));
    }
}

static void add_stray(struct draw *d)
{
    struct sm_sim_step step = { .kind = SM_SIM_STEP_STRAY, .celsius = d->sc->celsius };

    if (!sm_sim_prng_chance(&d->p, d->r->stray_share))
        return;
    step.count = 1 + sm_sim_prng_below(&d->p, 3);
    add(d, &step);
}

static void add_beaker(struct draw *d, unsigned number)
{
    struct sm_sim_step in = { .kind = SM_SIM_STEP_IN, .unit = SM_UNIT_MV };
    const double step = sm_sim_prng_log_between(&d->p, d->r->step_from, d->r->step_to);
    const bool up = sm_sim_prng_chance(&d->p, 0.5);

    d->value +=
        (d->value + step > farthest_mv || (!up && d->value - step > -farthest_mv)) ? -step : step;
    snprintf(in.name, sizeof in.name, "b%u", number);
    in.value = d->value;
    in.celsius = round(sm_sim_prng_between(&d->p, 8, 25) * 10) / 10;
    const double settle_s =
        sm_sim_response_settle_s(&d->response, now_mv(d) - d->value, d->r->tolerance);
    const double need_s = 3 * at_least(settle_s, d->r->dwell_s);
    if (sm_sim_prng_chance(&d->p, d->r->short_share)) {
        in.span_s = at_least(draw_s(d, 0.1 * settle_s, 0.9 * settle_s), 2);
        add(d, &in);
        return;
    }
    in.span_s = draw_s(d, 1, 0.5 * d->r->dwell_s + 1);
    add(d, &in);
    add_disturbance(d);
    add_span(d, SM_SIM_STEP_BACK, draw_s(d, 0.5 * need_s, 0.9 * need_s));
    add_stray(d);
    add_span(d, SM_SIM_STEP_BACK, draw_s(d, 0.6 * need_s, 0.9 * need_s));
}

static void draw_settings(struct draw *d)
{
    const struct sm_random_session *r = d->r;
    struct sm_scenario *sc = d->sc;
    struct sm_sim_noise n = { SM_SIM_NOISE_WHITE, 0, 0 };

    sc->seed = r->seed;
    sc->rate_per_s = sm_sim_prng_log_between(&d->p, r->rate_from, r->rate_to);
    sc->jitter_s = 0.1 / sc->rate_per_s;
    sc->dropout = sm_sim_prng_chance(&d->p, 0.3) ? 0.01 : 0;
    n.sd = sm_sim_prng_log_between(&d->p, r->noise_from, r->noise_to);
    if (!r->white_only)
        n.kind = (enum sm_sim_noise_kind)sm_sim_prng_below(&d->p, 4);
    n.how = n.kind == SM_SIM_NOISE_AR    ? sm_sim_prng_between(&d->p, 0.3, 0.9)
            : n.kind == SM_SIM_NOISE_HUM ? sm_sim_prng_between(&d->p, 0.05, 0.45) * sc->rate_per_s
                                         : 0.05;
    sc->noise = n;
    sc->display_step = r->display_step;
    sc->tolerance = r->tolerance;
    sc->dwell_s = r->dwell_s;
    if (sm_sim_prng_chance(&d->p, 0.4))
        sc->drift_per_s = sm_sim_prng_between(&d->p, -r->drift_most, r->drift_most) / 3600;
    d->least_s = 5 / sc->rate_per_s;
    sc->open.clear = r->air_clear;
}

static bool sound(const struct sm_random_session *r)
{
    return r->beakers > 0 && r->tolerance > 0 && r->dwell_s > 0 && r->rate_from > 0 &&
           r->rate_to >= r->rate_from && r->noise_from > 0 && r->noise_to >= r->noise_from &&
           r->fast_from_s > 0 && r->fast_to_s >= r->fast_from_s && r->step_from > 0 &&
           r->step_to >= r->step_from && r->step_to < farthest_mv && r->rinse_longest > 0 &&
           r->rinse_longest < 1 && r->air_shortest_s > 0 && r->air_shortest_s <= 6 &&
           r->air_clear >= 0 && r->rinse_clear >= 0 && r->gap_longest_s >= 3 &&
           r->display_step >= 0;
}

enum sm_status sm_random_session_make(const struct sm_random_session *r, struct sm_scenario *sc)
{
    struct draw d = { .r = r, .sc = sc, .status = SM_OK };

    if (!sound(r))
        return SM_EINVAL;
    sm_sim_prng_init(&d.p, r->seed, 77);
    draw_settings(&d);
    d.status = sm_scenario_reserve(sc, STEPS_PER_BEAKER * (size_t)r->beakers + 1);
    sm_sim_probe_start(&d.probe, sc);
    for (unsigned i = 0; i < r->beakers && d.status == SM_OK; i++) {
        if (!draw_response(&d))
            return SM_EINVAL;
        add_transit(&d);
        add_beaker(&d, i + 1);
    }
    add_air(&d, SM_SIM_STEP_AIR);
    return d.status;
}
