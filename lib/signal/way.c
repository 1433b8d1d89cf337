/* SPDX-License-Identifier: GPL-3.0-or-later */
/* way.c: stays and the ways between them: lifts, transits, moved. */
#include <assert.h>
#include <math.h>
#include <string.h>

#include "signal/inside.h"

/* How near two levels count as the same: within so many tolerances, or display steps. */
#define ALIKE_TOLERANCES 2.0
#define ALIKE_STEPS 3.0
#define ALIKE_NOISE 6.0          /* … or so many times the noise */
#define ELSEWHERE_TOLERANCES 3.0 /* further from the old level than this is another place */
#define CREEP_TOLERANCES                                                                           \
    4.0 /* a stay that crept more than this in a lift's time is not put back                       \
         */

static void stay_new(struct sm_signal *s, int64_t t_ns)
{
    sm_stay_begin(sm_stay_now(s), t_ns, s->pace.bin_ns);
}

static void stay_again(struct sm_signal *s, int64_t t_ns)
{
    sm_stay_again(sm_stay_now(s), t_ns, s->pace.bin_ns);
}

static void tell_moved(struct sm_signal *s, enum sm_mark_by by)
{
    static const char *const why[] = {
        [SM_MOVED_START] = "first reading",
        [SM_MOVED_TRANSIT] = "air or rinse between",
        [SM_MOVED_MARK] = "marked",
        [SM_MOVED_VALUE] = "the value changed without a transit",
        [SM_MOVED_LINE] = "a line is a capture",
    };
    struct sm_signal_event *e = sm_signal_push(s, SM_SIGNAL_MOVED);
    struct sm_stay *stay = sm_stay_now(s);

    stay->by = by;
    stay->moved_t_ns = stay->anchor_t_ns;
    e->by = by;
    e->from_t_ns = stay->moved_t_ns;
    sm_text_copy(e->why, sizeof e->why, why[by]);
    s->where = SM_STAYING;
    s->away.n = 0;
    s->settling_told = false;
}

static void tell_transit(struct sm_signal *s, int64_t to_t_ns, bool returned)
{
    struct sm_signal_event *e;

    s->open_told = false;
    if (!s->way.from_known)
        return;
    e = sm_signal_push(s, SM_SIGNAL_TRANSIT);
    e->from_t_ns = returned ? s->way.kept_t_ns : s->way.from_t_ns;
    e->to_t_ns = to_t_ns;
    e->how = s->way.transit ? s->way.how : SM_TRANSIT_DEPARTURES;
    e->returned = returned;
}

/* `stay` ended at to_t_ns; `why` is said if it had no capture. A stay shorter than the dwell may
 * have been a rinse: nothing is said of it unless `always`. */
static void tell_not_settled(struct sm_signal *s, const struct sm_stay *stay, int64_t to_t_ns,
                             const char *why, bool always)
{
    struct sm_signal_event *e;

    if (stay->captured || stay->given_up ||
        (!always && to_t_ns - stay->dwell_t_ns < s->pace.dwell_ns))
        return;
    e = sm_signal_push(s, SM_SIGNAL_NOT_SETTLED);
    e->from_t_ns = stay->moved_t_ns;
    e->to_t_ns = to_t_ns;
    sm_text_copy(e->why, sizeof e->why, why);
}

static bool is_transit(const struct sm_way *w)
{
    return w->transit || w->goings >= 2;
}

static struct sm_going going(const struct sm_departure *d)
{
    return (struct sm_going){ d->t_ns, d->level < d->before ? -1 : 1, d->before };
}

/* Begins a way at t_ns out of the stay `now`. `d` is NULL where the circuit opened. */
static void leave(struct sm_signal *s, int64_t t_ns, const struct sm_departure *d)
{
    struct sm_stay *stay = sm_stay_now(s);
    /* The stay has not lasted the dwell since a way led to it: it was a rinse, the way goes on. */
    const bool goes_on = !stay->captured && t_ns - stay->dwell_t_ns < s->pace.dwell_ns &&
                         (stay->by == SM_MOVED_VALUE || stay->by == SM_MOVED_TRANSIT);
    const bool worth =
        !stay->captured && stay->n > 0 && t_ns - stay->anchor_t_ns >= s->pace.worth_ns;
    struct sm_way *w = &s->way;

    memset(w, 0, sizeof *w);
    w->from_t_ns = goes_on ? stay->way_from_t_ns : t_ns;
    w->from_known = true;
    w->last = (struct sm_going){ t_ns, 0, 0 };
    w->goings = d != NULL ? 1 : 0;
    w->transit = goes_on && stay->way_open;
    w->how = stay->way_how;
    if (goes_on)
        w->goings += stay->by == SM_MOVED_VALUE ? 1 : 2;
    if (d != NULL)
        w->last = going(d);
    if (worth) {
        w->kept = true;
        w->kept_t_ns = t_ns;
        if (d != NULL) {
            w->before = d->before;
            w->slope_u_per_s = d->slope_u_per_s;
        } else {
            w->kept = sm_front_level(&s->front, &w->before);
            w->slope_u_per_s = sm_front_slope(&s->front);
        }
        if (w->kept)
            s->now ^= 1;
    }
    s->where = SM_LEAVING;
    s->away.n = 0;
}

/* One going seen twice: a slow start that still speeds up in the same direction, so that the slope
 * before the second departure is no less than the mean one since the first (half of it: noise).
 * Where the signal had slowed down in between, there was a place in between. And a departure
 * straight after an arrival is the approach to the new place. */
static bool same_going(const struct sm_signal *s, const struct sm_going *last,
                       const struct sm_departure *d)
{
    const double since_s = 1e-9 * (double)(d->t_ns - last->t_ns);
    const double gone = (d->before - last->before) * last->direction;

    if (d->t_ns - last->t_ns >= s->pace.calm_ns)
        return false;
    if (last->direction == 0)
        return true;
    return going(d).direction == last->direction && gone > 0 &&
           d->slope_u_per_s * last->direction * since_s >= gone / 2;
}

/* Is `level` that of the stay kept, as far as it may have crept since? `reach`: how far the
 * readings lie about it; a signal that only passes by reaches too far. */
static bool is_back(const struct sm_signal *s, double level, double reach, double noise,
                    int64_t t_ns)
{
    const struct sm_way *w = &s->way;
    const double tolerance = sm_tolerance(s), step = sm_step_now(&s->front.step);
    const double creep = fabs(w->slope_u_per_s) * 1e-9 * (double)(t_ns - w->kept_t_ns);
    const double alike = fmax(fmax(ALIKE_TOLERANCES * tolerance, ALIKE_STEPS * step), noise);

    return w->kept && t_ns - w->kept_t_ns <= s->pace.lift_ns &&
           creep <= CREEP_TOLERANCES * tolerance &&
           fabs(level - w->before) + reach <= alike + fmin(creep, ALIKE_TOLERANCES * tolerance);
}

/* The old window goes on. But what was left before the dwell was over may have been a rinse, dipped
 * into twice: then the dwell counts again from the return, or two rinses would make a stay. So it
 * does when the signal then goes elsewhere: it only passed by the old level
 * (sm_way_look_on). */
static void put_back(struct sm_signal *s, int64_t t_ns)
{
    struct sm_stay *stay = &s->stay[s->now ^ 1];

    tell_transit(s, t_ns, true);
    s->now ^= 1;
    stay->lifts++;
    stay->lift_t_ns = t_ns;
    stay->lift_level = s->way.before;
    if (s->way.kept_t_ns - stay->dwell_t_ns < s->pace.dwell_ns ||
        s->way.kept_t_ns - stay->swift_t_ns < s->pace.dwell_ns)
        stay->dwell_t_ns = t_ns;
    s->way.kept = false;
    s->where = SM_STAYING;
}

void sm_way_look_on(struct sm_signal *s, const struct sm_signal_reading *r)
{
    struct sm_stay *stay = sm_stay_now(s);

    if (s->where == SM_STAYING && stay->lifts > 0 && stay->dwell_t_ns < stay->lift_t_ns &&
        fabs(r->value - stay->lift_level) > ELSEWHERE_TOLERANCES * sm_tolerance(s))
        stay->dwell_t_ns = stay->lift_t_ns;
}

/* The stay kept is given up: it is over since it was left. */
static void let_go(struct sm_signal *s, const char *why, bool always)
{
    if (s->way.kept)
        tell_not_settled(s, &s->stay[s->now ^ 1], s->way.kept_t_ns, why, always);
    s->way.kept = false;
}

void sm_way_tell(struct sm_signal *s, int64_t t_ns)
{
    const struct sm_way *w = &s->way;
    struct sm_stay *stay = sm_stay_now(s);

    if (s->where != SM_LEAVING || s->open_circuit || stay->n == 0 ||
        t_ns - w->last.t_ns < s->pace.calm_ns ||
        (w->kept && t_ns - w->kept_t_ns <= s->pace.lift_ns))
        return;
    let_go(s, "moved on before it settled", false);
    stay->way_from_t_ns = w->from_known ? w->from_t_ns : stay->anchor_t_ns;
    stay->way_open = w->transit;
    stay->way_how = w->how;
    stay->going = w->last;
    if (is_transit(w))
        tell_transit(s, stay->anchor_t_ns, false);
    tell_moved(s, is_transit(w) ? SM_MOVED_TRANSIT : SM_MOVED_VALUE);
}

/* A departure from a told stay. */
static void depart_staying(struct sm_signal *s, const struct sm_departure *d)
{
    struct sm_stay *stay = sm_stay_now(s);

    if (!stay->captured && stay->by != SM_MOVED_MARK && same_going(s, &stay->going, d)) {
        stay->going = going(d);
        stay_again(s, d->t_ns);
        return;
    }
    leave(s, d->t_ns, d);
    stay_new(s, d->t_ns);
    if (!s->way.kept && s->way.goings == 1) { /* told at once; a second one makes it a transit */
        stay = sm_stay_now(s);
        stay->way_from_t_ns = d->t_ns;
        stay->going = s->way.last;
        tell_moved(s, SM_MOVED_VALUE);
    }
}

void sm_way_departed(struct sm_signal *s, const struct sm_departure *d)
{
    const struct sm_stay *stay = sm_stay_now(s);
    struct sm_way *w = &s->way;

    sm_way_tell(s, d->t_ns);
    if (s->where == SM_STAYING) {
        const double alike = fmax(ALIKE_TOLERANCES * sm_tolerance(s), d->alike);

        if (!stay->captured || !(fabs(d->level - stay->value) <= alike))
            depart_staying(s, d);
    } else if (is_back(s, d->level, d->reach, d->alike, d->t_ns)) {
        put_back(s, d->t_ns);
    } else {
        if (!same_going(s, &w->last, d))
            w->goings++;
        w->last = going(d);
        stay_new(s, d->t_ns);
    }
}

void sm_way_away(struct sm_signal *s, int64_t t_ns, double level)
{
    const struct sm_departure d = { .t_ns = t_ns, .level = level, .before = sm_stay_now(s)->value };

    depart_staying(s, &d);
}

void sm_way_open(struct sm_signal *s, int64_t t_ns, enum sm_transit_how how)
{
    struct sm_way *w = &s->way;

    if (s->open_circuit)
        return;
    if (s->where == SM_NOWHERE) {
        *w = (struct sm_way){ .from_t_ns = t_ns, .from_known = true };
        s->where = SM_LEAVING;
    } else if (s->where == SM_STAYING) {
        leave(s, t_ns, NULL);
    } else if (!w->from_known) { /* the way began in the file before; this much of it is known */
        *w = (struct sm_way){ .from_t_ns = t_ns, .from_known = true };
    }
    if (!w->transit)
        w->how = how;
    w->transit = true;
    s->open_circuit = true;
    if (!s->open_told)
        (void)sm_signal_push(s, SM_SIGNAL_OPEN_CIRCUIT);
    s->open_told = true;
}

void sm_way_arrived(struct sm_signal *s, int64_t t_ns)
{
    if (s->where == SM_NOWHERE) {
        stay_new(s, t_ns);
        tell_moved(s, SM_MOVED_START);
    } else if (s->open_circuit ||
               (s->where == SM_LEAVING && !s->way.from_known && sm_stay_now(s)->n == 0)) {
        s->open_circuit = false;
        s->way.last = (struct sm_going){ t_ns, 0, 0 };
        stay_new(s, t_ns);
    }
}

void sm_way_look_back(struct sm_signal *s)
{
    const struct sm_stay *stay = sm_stay_now(s);
    const double noise = ALIKE_NOISE * fmin(s->front.noise.sd, sm_tolerance(s));
    double least, largest;

    if (s->where != SM_LEAVING || stay->n != 3 || !s->way.kept)
        return;
    if (stay->first_t_ns <= s->way.kept_t_ns) /* the first of them was the departure: it was never
                                               * away, it passes by */
        return;
    least = largest = stay->first[0].value;
    for (unsigned i = 1; i < 3; i++) {
        least = fmin(least, stay->first[i].value);
        largest = fmax(largest, stay->first[i].value);
    }
    if (!is_back(s, (least + largest) / 2, (largest - least) / 2, noise, stay->first_t_ns))
        return;
    put_back(s, stay->first_t_ns);
    for (unsigned i = 0; i < 3; i++)
        sm_stay_add(sm_stay_now(s), &stay->first[i], sm_judge_over_ns(&s->rule));
}

void sm_way_mark(struct sm_signal *s, int64_t t_ns)
{
    const char *why = "a mark came before it settled";

    if (s->where == SM_STAYING)
        tell_not_settled(s, sm_stay_now(s), t_ns, why, false);
    let_go(s, why, false);
    if (s->where == SM_LEAVING && !s->open_circuit && is_transit(&s->way))
        tell_transit(s, s->way.last.t_ns, false);
    stay_new(s, t_ns);
    tell_moved(s, SM_MOVED_MARK);
    if (s->open_circuit) { /* still in the air: the transit is told when it is over */
        s->where = SM_LEAVING;
        sm_stay_now(s)->n = 0;
    }
}

void sm_way_end(struct sm_signal *s, const char *why)
{
    if (s->where == SM_STAYING)
        tell_not_settled(s, sm_stay_now(s), s->t_ns, why, true);
    let_go(s, why, true);
    sm_way_drop(s);
}

void sm_way_drop(struct sm_signal *s)
{
    s->where = SM_NOWHERE;
    s->open_circuit = s->open_told = false;
    memset(&s->way, 0, sizeof s->way);
    s->away.n = 0;
    sm_front_forget(&s->front);
}

void sm_way_start(struct sm_signal *s, const struct sm_signal_start *start)
{
    if (start->place == SM_PLACE_STILL) {
        stay_new(s, 0);
        sm_stay_now(s)->captured = true;
        sm_stay_now(s)->value = start->value;
        sm_stay_now(s)->u95 = start->u95;
        s->where = SM_STAYING;
    } else if (start->place == SM_PLACE_LEFT) {
        stay_new(s, 0);
        s->way = (struct sm_way){ .transit = true };
        s->where = SM_LEAVING;
    }
}
