/* SPDX-License-Identifier: GPL-3.0-or-later */
/* accept.c: the part of a method that says when a curve and its checks are accepted. What a file
 * leaves out takes the shipped default where there is one for what the method measures. */
#include "base/time.h"

#include <string.h>
#include "setup/limit.h"

#define MIN (60 * SM_NS_PER_S)
#define HOUR (60 * MIN)
#define LEVELS_LEAST 3
#define LEVELS_MOST 20

/* What makes sense as a limit, by unit: a slip of the pen lies outside. */
static void sense(enum sm_unit unit, double *ret_least, double *ret_most)
{
    static const struct {
        enum sm_unit unit;
        double least, most;
    } table[] = { { SM_UNIT_MV, 0.001, 2000 },   { SM_UNIT_V, 1e-6, 2 },
                  { SM_UNIT_PH, 0.001, 3 },      { SM_UNIT_A, 1e-5, 10 },
                  { SM_UNIT_US_CM, 0.001, 1e6 }, { SM_UNIT_MS_CM, 1e-6, 1000 },
                  { SM_UNIT_MG_L, 1e-6, 1e6 },   { SM_UNIT_UG_L, 0.001, 1e8 },
                  { SM_UNIT_PERCENT, 0.01, 100 } };

    *ret_least = 1e-9;
    *ret_most = 1e9;
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++)
        if (table[i].unit == unit) {
            *ret_least = table[i].least;
            *ret_most = table[i].most;
        }
}

bool sm_get_limit(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                  double *ret_value)
{
    double least, most;

    if (unit == SM_UNIT_COUNT)
        return false;
    sense(unit, &least, &most);
    return sm_get_quantity(r, node, unit, least, most, ret_value);
}

static struct sm_limit limit(double value)
{
    return (struct sm_limit){ .has = true, .value = value };
}

/* A limit that the word none switches off. */
static void fill_limit(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                       struct sm_limit *l)
{
    if (sm_is_word(node, "none"))
        *l = (struct sm_limit){ 0 };
    else if (sm_get_limit(r, node, unit, &l->value))
        l->has = true;
}

static void fill_end(const struct sm_reader *r, const struct sm_node *node, enum sm_unit unit,
                     double from, double to, struct sm_limit *l)
{
    if (sm_get_quantity(r, node, unit, from, to, &l->value))
        l->has = true;
}

/* from < warn-from < warn-to < to, as far as stated. */
static bool in_order(const struct sm_window_limit *w)
{
    const struct sm_limit *row[] = { &w->from, &w->warn_from, &w->warn_to, &w->to };
    const struct sm_limit *last = NULL;

    for (size_t i = 0; i < sizeof row / sizeof row[0]; i++) {
        if (!row[i]->has)
            continue;
        if (last != NULL && !(last->value <= row[i]->value))
            return false;
        last = row[i];
    }
    return true;
}

static void fill_window(const struct sm_reader *r, const struct sm_node *map, enum sm_unit unit,
                        double from, double to, struct sm_window_limit *w)
{
    static const char *const keys[] = { "from", "to", "warn-from", "warn-to", NULL };

    if (sm_is_word(map, "none")) {
        *w = (struct sm_window_limit){ 0 };
        return;
    }
    if (!sm_keys_known(r, map, keys))
        return;
    *w = (struct sm_window_limit){ 0 };
    (void)sm_need(r, map, "from", "a lower limit");
    (void)sm_need(r, map, "to", "an upper limit");
    fill_end(r, sm_key(map, "from"), unit, from, to, &w->from);
    fill_end(r, sm_key(map, "to"), unit, from, to, &w->to);
    fill_end(r, sm_key(map, "warn-from"), unit, from, to, &w->warn_from);
    fill_end(r, sm_key(map, "warn-to"), unit, from, to, &w->warn_to);
    if (!in_order(w))
        sm_blame(r, map, "expected from, warn-from, warn-to, to in rising order");
}

static void fill_levels(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    const unsigned needed = (unsigned)sm_model_coefficients(m->model) + 1;
    const bool quadratic = m->model == SM_MODEL_QUADRATIC;
    unsigned least = needed > LEVELS_LEAST ? needed : LEVELS_LEAST;

    if (quadratic)
        least = 6;
    m->levels = quadratic ? 6 : 5;
    sm_get_count(r, sm_key(root, "levels"), least, LEVELS_MOST, &m->levels);
    m->levels_after_drop = m->levels < 4 ? m->levels : 4;
    sm_get_count(r, sm_key(root, "levels-after-drop"),
                 needed > LEVELS_LEAST ? needed : LEVELS_LEAST, m->levels, &m->levels_after_drop);
}

static void defaults(struct sm_method *m)
{
    m->r_squared = limit(0.990);
    if (m->model == SM_MODEL_NERNST) {
        m->residual_sd = limit(1.2);
        m->slope = (struct sm_window_limit){ limit(90), limit(105), limit(95), limit(102) };
        m->offset.from = limit(-30);
        m->offset.to = limit(30);
        m->back_calculated = limit(0.05);
        m->leave_one_out = limit(0.08);
        m->after_curve = limit(0.1);
        m->after_curve_warn = limit(0.05);
        m->check = limit(0.1);
        m->duplicate = limit(0.1);
        m->duplicate_one_in = 10;
    } else if (m->signal_unit == SM_UNIT_A) {
        m->residual_sd = limit(0.003);
    }
}

/* A rule that is a figure of electrodes only. */
static const struct sm_node *nernst_key(const struct sm_reader *r, const struct sm_node *root,
                                        const struct sm_method *m, const char *key)
{
    const struct sm_node *node = sm_key(root, key);

    if (node == NULL || m->model == SM_MODEL_NERNST)
        return node;
    sm_blame(r, node, "used only with model: nernst");
    return NULL;
}

static void fill_curve_rules(const struct sm_reader *r, const struct sm_node *root,
                             struct sm_method *m)
{
    const struct sm_node *r_squared = sm_key(root, "r-squared");

    if (sm_is_word(r_squared, "none"))
        m->r_squared = (struct sm_limit){ 0 };
    else
        sm_get_number(r, r_squared, 0, 1, &m->r_squared.value);
    fill_limit(r, sm_key(root, "residual-sd"), m->signal_unit, &m->residual_sd);
    fill_window(r, nernst_key(r, root, m, "slope"), SM_UNIT_PERCENT, 50, 120, &m->slope);
    fill_window(r, nernst_key(r, root, m, "offset"), m->signal_unit, -200, 200, &m->offset);
    fill_limit(r, sm_key(root, "back-calculated"), m->measures, &m->back_calculated);
    fill_limit(r, sm_key(root, "leave-one-out"), m->measures, &m->leave_one_out);
    m->curve_valid_ns = 8 * HOUR;
    sm_get_time(r, sm_key(root, "curve-valid"), MIN, 90 * 24 * HOUR, &m->curve_valid_ns);
    /* leave-one-out does not count: a curve is not judged by it yet */
    if (m->signal_unit != SM_UNIT_COUNT && m->measures != SM_UNIT_COUNT && !m->residual_sd.has &&
        !m->slope.from.has && !m->offset.from.has && !m->back_calculated.has)
        sm_blame(r, r_squared != NULL ? r_squared : root,
                 "%sR² alone accepts no curve, a wrong standard hardly changes it: add residual-sd "
                 "or back-calculated",
                 r_squared != NULL ? "" : "r-squared: ");
}

static void fill_within(const struct sm_reader *r, const struct sm_node *map,
                        const struct sm_method *m, struct sm_limit *within, struct sm_limit *warn)
{
    if (!within->has)
        (void)sm_need(r, map, "within", "how far off a check may be");
    if (sm_get_limit(r, sm_key(map, "within"), m->measures, &within->value))
        within->has = true;
    if (sm_key(map, "warn") == NULL && warn->has && warn->value > within->value)
        *warn = (struct sm_limit){ 0 }; /* the default does not go with a narrower limit */
    if (sm_get_limit(r, sm_key(map, "warn"), m->measures, &warn->value))
        warn->has = true;
    if (within->has && warn->has && warn->value > within->value)
        sm_blame(r, sm_key(map, "warn"), "must not be more than within");
}

static void fill_checks(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    static const char *const after_keys[] = { "within", "warn", NULL };
    static const char *const keys[] = { "within", "warn", "every", "at-end", NULL };
    const bool needed = m->model != SM_MODEL_NERNST;
    const struct sm_node *after = sm_key(root, "check-after-curve"), *check = sm_key(root, "check");

    if (needed) {
        after = sm_need(r, root, "check-after-curve", "{ within: … }");
        check = sm_need(r, root, "check", "{ within: …, every: 10, at-end: yes }");
    }
    if (sm_keys_known(r, after, after_keys))
        fill_within(r, after, m, &m->after_curve, &m->after_curve_warn);
    m->check_every = 10;
    m->check_at_end = true;
    if (!sm_keys_known(r, check, keys))
        return;
    fill_within(r, check, m, &m->check, &m->check_warn);
    sm_get_count(r, sm_key(check, "every"), 1, 100, &m->check_every);
    sm_get_yes(r, sm_key(check, "at-end"), &m->check_at_end);
}

static void fill_duplicate(const struct sm_reader *r, const struct sm_node *map,
                           struct sm_method *m)
{
    static const char *const keys[] = { "within", "one-in", NULL };

    if (sm_is_word(map, "none")) {
        m->duplicate = (struct sm_limit){ 0 };
        m->duplicate_one_in = 0;
        return;
    }
    if (!sm_keys_known(r, map, keys))
        return;
    if (!m->duplicate.has)
        (void)sm_need(r, map, "within", "how far two portions may differ");
    if (sm_get_limit(r, sm_key(map, "within"), m->measures, &m->duplicate.value))
        m->duplicate.has = true;
    m->duplicate_one_in = 10;
    sm_get_count(r, sm_key(map, "one-in"), 1, 100, &m->duplicate_one_in);
}

void sm_acceptance_fill(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    defaults(m);
    fill_levels(r, root, m);
    fill_curve_rules(r, root, m);
    fill_checks(r, root, m);
    fill_duplicate(r, sm_key(root, "duplicate"), m);
}

static void plain_limit(struct sm_limit *l)
{
    const bool has = l->has;
    const double value = l->value;

    memset(l, 0, sizeof *l);
    l->has = has;
    l->value = value;
}

void sm_method_plain(struct sm_method *m)
{
    struct sm_limit *const limits[] = {
        &m->r_squared,        &m->residual_sd,      &m->slope.from,      &m->slope.to,
        &m->slope.warn_from,  &m->slope.warn_to,    &m->offset.from,     &m->offset.to,
        &m->offset.warn_from, &m->offset.warn_to,   &m->back_calculated, &m->leave_one_out,
        &m->after_curve,      &m->after_curve_warn, &m->check,           &m->check_warn,
        &m->duplicate,
    };

    for (size_t i = 0; i < sizeof limits / sizeof limits[0]; i++)
        plain_limit(limits[i]);
    for (size_t i = 0; i < SM_CLASS_COUNT; i++) {
        const struct sm_quantity q = m->tolerance_written[i];

        memset(&m->tolerance_written[i], 0, sizeof q);
        m->tolerance_written[i].value = q.value;
        m->tolerance_written[i].unit = q.unit;
    }
}
