/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bench_day.c: an invented bench for tests of the core. */
#include "bench_day.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const struct {
    const char *name;
    double ph;
} solutions[] = { { "B1", 1.68 }, { "B4", 4.00 },   { "B7", 6.88 },
                  { "B9", 9.22 }, { "B10", 10.07 }, { "C7", 7.02 } };

static void channel(struct sm_channel *c, const char *name, enum sm_unit unit, unsigned at)
{
    memset(c, 0, sizeof *c);
    sm_text_copy(c->name, sizeof c->name, name);
    c->unit = unit;
    c->at = at;
    c->raw = true;
    c->scale = 1;
}

static void day_profile(struct day *d)
{
    d->profile.framing.eol = SM_EOL_AUTO;
    d->profile.split = SM_SPLIT_SPACES;
    d->profile.n_channels = 2;
    channel(&d->profile.channel[0], "potential", SM_UNIT_MV, 1);
    channel(&d->profile.channel[1], "probe", SM_UNIT_CELSIUS, 2);
    d->profile.channel[0].has_plausible = true;
    d->profile.channel[0].plausible_from = -1500;
    d->profile.channel[0].plausible_to = 1500;
    sm_text_copy(d->profile.open[0], SM_WORD_SIZE, "----");
    d->profile.status_at = 3;
    sm_text_copy(d->profile.mark[0], SM_WORD_SIZE, "KEY");
}

static void day_method(struct day *d)
{
    struct sm_method *m = &d->method;

    sm_text_copy(m->name, sizeof m->name, "demonstration");
    m->measures = SM_UNIT_PH;
    sm_text_copy(m->signal, sizeof m->signal, "potential");
    m->signal_unit = SM_UNIT_MV;
    sm_text_copy(m->temperature, sizeof m->temperature, "probe");
    m->model = SM_MODEL_NERNST;
    m->ph_iso = 7;
    m->rule.kind = SM_RULE_SPREAD;
    for (int c = 0; c < SM_CLASS_COUNT; c++) {
        m->rule.tolerance[c] = 0.6;
        m->rule.longest_wait_ns[c] = 60 * SM_NS_PER_S;
    }
    m->rule.dwell_ns = 3 * SM_NS_PER_S;
    m->rule.over_ns = 2 * SM_NS_PER_S;
    m->rule.has_plausible = true;
    m->rule.plausible_from = -1500;
    m->rule.plausible_to = 1500;
    m->levels = 5;
    m->r_squared = (struct sm_limit){ true, 0.990 };
    m->residual_sd = (struct sm_limit){ true, 1.2 };
    m->back_calculated = (struct sm_limit){ true, 0.05 };
    m->check = (struct sm_limit){ true, 0.1 };
    m->check_at_end = true;
    m->curve_valid_ns = 8 * 3600 * SM_NS_PER_S;
}

void day_setup(struct day *d)
{
    memset(d, 0, sizeof *d);
    d->seed = 20261201;
    day_profile(d);
    day_method(d);
    for (size_t i = 0; i < COUNT(solutions); i++) {
        struct sm_standard *s = &d->standards.list[d->standards.n++];

        sm_text_copy(s->name, sizeof s->name, solutions[i].name);
        sm_text_copy(s->lot, sizeof s->lot, "F-208");
        s->unit = SM_UNIT_PH;
        s->n_values = 1;
        s->t_c[0] = 20.0;
        s->value[0] = solutions[i].ph;
        s->table_column = -1;
    }
    sm_text_copy(d->setup.meter, sizeof d->setup.meter, "bench-2");
    sm_text_copy(d->setup.sensor, sizeof d->setup.sensor, "el-14");
    d->setup.silence_ns = 10 * SM_NS_PER_S;
    d->setup.profile = &d->profile;
    d->setup.method = &d->method;
    d->setup.n_methods = 1;
    d->setup.standards = &d->standards;
    sm_carried_init(&d->begin);
    sm_text_copy(d->begin.sensor, sizeof d->begin.sensor, "el-14");
    sm_text_copy(d->sheet.file, sizeof d->sheet.file, "morning.yaml");
    d->utc_us = INT64_C(1796112000000000); /* 2026-12-01T08:00:00Z */
    d->t_c = 20.0;
}

void day_item(struct day *d, enum sm_item_kind kind, const char *name)
{
    struct sm_item *i = &d->sheet.item[d->sheet.n++];

    memset(i, 0, sizeof *i);
    i->kind = kind;
    sm_text_copy(i->name, sizeof i->name, name);
    i->standard = kind == SM_ITEM_STANDARD || kind == SM_ITEM_CHECK
                      ? sm_standards_find(&d->standards, name)
                      : -1;
}

void day_usual_sheet(struct day *d)
{
    for (size_t i = 0; i < 5; i++)
        day_item(d, SM_ITEM_STANDARD, solutions[i].name);
    day_item(d, SM_ITEM_CHECK, "C7");
    day_item(d, SM_ITEM_SAMPLE, "a");
    day_item(d, SM_ITEM_SAMPLE, "b");
    day_item(d, SM_ITEM_SAMPLE, "c");
    day_item(d, SM_ITEM_CHECK, "C7");
}

static void keep(struct day *d, const struct sm_event *e)
{
    struct day_kept *k;

    if (e->kind == SM_EVENT_READING || e->kind == SM_EVENT_SETTLING)
        return;
    if (e->kind == SM_EVENT_CARRIED) {
        d->carried = *e->u.carried;
        d->has_carried = true;
    }
    if (d->kept == DAY_KEPT)
        fail_msg("more than %d events", DAY_KEPT);
    k = &d->event[d->kept++];
    memset(k, 0, sizeof *k);
    k->kind = e->kind;
    k->n = e->n;
    k->t_ns = e->t_ns;
    switch (e->kind) {
    case SM_EVENT_CAPTURE:
        k->has_where = e->u.capture.where.has;
        k->item = e->u.capture.where.item;
        k->value = e->u.capture.value;
        if (e->u.capture.n_remarks > 0)
            sm_text_copy(k->why, sizeof k->why, e->u.capture.remark[0]);
        break;
    case SM_EVENT_CURVE:
        k->good = e->u.curve.accepted;
        if (e->u.curve.n_judged > 0)
            sm_text_copy(k->why, sizeof k->why, e->u.curve.judged[0].text);
        break;
    case SM_EVENT_CHECK:
        k->good = e->u.check.pass;
        k->item = e->u.check.where.item;
        k->value = e->u.check.found;
        sm_text_copy(k->why, sizeof k->why, e->u.check.why);
        break;
    case SM_EVENT_RESULT:
        k->item = e->u.result.where.item;
        k->good = e->u.result.has_value;
        k->value = e->u.result.value;
        k->state = e->u.result.state;
        sm_text_copy(k->why, sizeof k->why, e->u.result.why);
        break;
    case SM_EVENT_HOLD:
    case SM_EVENT_RELEASE:
        k->value = (double)e->u.change.n;
        sm_text_copy(k->why, sizeof k->why, e->u.change.why);
        break;
    case SM_EVENT_ANSWER:
        k->good = e->u.answer.done;
        sm_text_copy(k->why, sizeof k->why, e->u.answer.why);
        break;
    case SM_EVENT_MOVED:
        k->has_where = e->u.moved.where.has;
        k->item = e->u.moved.where.item;
        k->by = e->u.moved.by;
        break;
    case SM_EVENT_NOT_SETTLED:
        sm_text_copy(k->why, sizeof k->why, e->u.not_settled.why);
        break;
    case SM_EVENT_UNREAD:
        sm_text_copy(k->why, sizeof k->why, e->u.unread.why);
        break;
    default:
        break;
    }
}

void day_feed(struct day *d, struct sm_input *in)
{
    const struct sm_event *e;
    enum sm_status s;

    in->n = ++d->n;
    in->t_ns = d->t_ns;
    in->utc_us = d->utc_us + d->t_ns / 1000;
    in->chunk.t_ns = d->t_ns;
    s = sm_core_feed(d->core, in);
    if (s != SM_OK)
        fail_msg("input %lld of kind %d: %s", (long long)in->n, (int)in->kind, sm_status_text(s));
    while (sm_core_next(d->core, &e)) {
        if (sm_event_class(e->kind) != SM_LIVE && e->n != ++d->n)
            fail_msg("event numbered %lld, want %lld", (long long)e->n, (long long)d->n);
        if (e->t_ns != d->t_ns)
            fail_msg("event at %lld, its input at %lld", (long long)e->t_ns, (long long)d->t_ns);
        keep(d, e);
        if (d->look != NULL)
            d->look(d->look_arg, e);
    }
    assert_int_equal(sm_core_last_n(d->core), d->n);
}

void day_ticks(struct day *d, int64_t t_ns)
{
    for (unsigned i = 0;; i++) {
        struct sm_input in = { .kind = SM_INPUT_TICK };
        const int64_t due = sm_core_deadline(d->core);

        if (due > t_ns)
            break;
        if (i == 10000)
            fail_msg("the same deadline again and again: %lld", (long long)due);
        if (due > d->t_ns)
            d->t_ns = due;
        day_feed(d, &in);
    }
    d->t_ns = t_ns;
}

void day_bytes(struct day *d, const char *text)
{
    struct sm_input in = { .kind = SM_INPUT_BYTES };

    in.chunk.bytes = (const unsigned char *)text;
    in.chunk.n = strlen(text);
    day_feed(d, &in);
}

static void link_up(struct day *d, bool continues)
{
    struct sm_input in = { .kind = SM_INPUT_LINK };

    in.link.state = SM_LINK_UP;
    in.link.continues = continues;
    day_feed(d, &in);
}

void day_start(struct day *d, bool with_sheet)
{
    char why[SM_REASON_SIZE] = "";

    if (sm_core_start(&d->setup, &d->begin, NULL, &d->core, why) != SM_OK)
        fail_msg("core does not start: %s", why);
    link_up(d, true);
    if (with_sheet) {
        day_act(d, SM_ACT_SHEET, "");
        assert_true(day_last(d, SM_EVENT_ANSWER)->good);
        day_in(d, day_mv(4.5), 2); /* storage solution, for less than the dwell */
    }
}

void day_stop(struct day *d)
{
    sm_core_destroy(d->core);
    d->core = NULL;
}

/* Another core, another file, from d->begin. */
static void begin_again(struct day *d, bool continues)
{
    const struct sm_sheet *sheet = sm_core_sheet(d->core);
    char why[SM_REASON_SIZE] = "";

    if (sheet != NULL)
        d->sheet = *sheet;
    sm_core_destroy(d->core);
    d->utc_us += d->t_ns / 1000;
    d->t_ns = 0;
    if (sm_core_start(&d->setup, &d->begin, sheet == NULL ? NULL : &d->sheet, &d->core, why) !=
        SM_OK)
        fail_msg("core does not start: %s", why);
    link_up(d, continues);
}

void day_roll(struct day *d)
{
    struct sm_input in = { .kind = SM_INPUT_ROLL };

    day_feed(d, &in);
    sm_core_carried(d->core, &d->begin);
    assert_memory_equal(&d->begin, &d->carried, sizeof d->begin);
    begin_again(d, true);
}

void day_restart(struct day *d, double s)
{
    if (d->has_carried)
        d->begin = d->carried;
    sm_carried_interrupt(&d->begin);
    sm_carried_age(&d->begin, (int64_t)(s * 1e9));
    d->utc_us += (int64_t)(s * 1e6);
    begin_again(d, false);
}

void day_link(struct day *d, bool up)
{
    struct sm_input in = { .kind = SM_INPUT_LINK };

    if (up) {
        link_up(d, false);
        return;
    }
    in.link.state = SM_LINK_LOST;
    day_feed(d, &in);
}

static double noise(struct day *d)
{
    double sum = 0;

    for (int i = 0; i < 4; i++) { /* near enough to a normal one, standard deviation 1 */
        d->seed = d->seed * UINT64_C(6364136223846793005) + UINT64_C(1442695040888963407);
        sum += (double)(d->seed >> 11) / 9007199254740992.0 - 0.5;
    }
    return sum * 1.7320508;
}

static void reading(struct day *d)
{
    char line[64];

    snprintf(line, sizeof line, "%+08.2f %4.1f%s\r\n", d->mv + 0.05 * noise(d), d->t_c,
             d->key ? " KEY" : "");
    d->key = false;
    day_bytes(d, line);
}

void day_in(struct day *d, double mv, double s)
{
    for (int i = 0; i < (int)(s * 10 + 0.5); i++) {
        day_ticks(d, d->t_ns + SM_NS_PER_S / 10);
        d->mv = mv + (d->mv - mv) * exp(-0.1 / 0.4);
        reading(d);
    }
}

double day_mv(double ph)
{
    return 3.9 - 0.986 * sm_nernst_mv(20.0) * (ph - 7.0);
}

void day_air(struct day *d, double s)
{
    for (int i = 0; i < (int)(s * 10 + 0.5); i++) {
        day_ticks(d, d->t_ns + SM_NS_PER_S / 10);
        d->mv += 40 * noise(d);
        reading(d);
    }
}

void day_open(struct day *d, double s)
{
    for (int i = 0; i < (int)(s * 10 + 0.5); i++) {
        day_ticks(d, d->t_ns + SM_NS_PER_S / 10);
        day_bytes(d, "---- 20.0\r\n");
    }
}

void day_move(struct day *d, double mv, double s)
{
    day_air(d, 1.0);
    day_in(d, day_mv(6.5), 1.4);
    day_in(d, mv, s);
}

void day_nothing(struct day *d, double s)
{
    day_ticks(d, d->t_ns + (int64_t)(s * 1e9));
}

static int64_t newest_durable(const struct day *d)
{
    for (size_t i = d->kept; i-- > 0;) {
        if (sm_event_class(d->event[i].kind) == SM_DURABLE)
            return d->event[i].n;
    }
    return 0;
}

void day_act(struct day *d, enum sm_act_kind act, const char *text)
{
    static struct sm_input in;

    memset(&in, 0, sizeof in);
    in.kind = SM_INPUT_ACT;
    in.act.act = act;
    snprintf(in.act.id, sizeof in.act.id, "test-%lld", (long long)d->n);
    in.act.has_seen = true;
    in.act.seen = newest_durable(d);
    sm_text_copy(in.act.text, sizeof in.act.text, text);
    sm_text_copy(in.act.why, sizeof in.act.why, text);
    in.act.sheet = act == SM_ACT_SHEET ? &d->sheet : NULL;
    day_feed(d, &in);
}

size_t day_count(const struct day *d, enum sm_event_kind kind)
{
    size_t n = 0;

    for (size_t i = 0; i < d->kept; i++)
        n += d->event[i].kind == kind;
    return n;
}

const struct day_kept *day_nth(const struct day *d, enum sm_event_kind kind, size_t i)
{
    for (size_t k = 0; k < d->kept; k++) {
        if (d->event[k].kind == kind && i-- == 0)
            return &d->event[k];
    }
    fail_msg("no such %s", sm_event_kind_name(kind));
    return NULL;
}

const struct day_kept *day_last(const struct day *d, enum sm_event_kind kind)
{
    return day_nth(d, kind, day_count(d, kind) - 1);
}
