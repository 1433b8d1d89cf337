/* SPDX-License-Identifier: GPL-3.0-or-later */
/* method.c: a file of conf/methods/ to struct sm_method: what settled means, here; what is
 * accepted, in accept.c. Limits are resolved in the signal's unit; for pH by the theoretical slope
 * at 25 °C. */
#include <string.h>

#include "base/time.h"
#include "curve/curve.h"
#include "setup/limit.h"

#define MIN (60 * SM_NS_PER_S)
#define HOUR (60 * MIN)
#define SLOPE_AT_C 25.0 /* fixed, so that 0.01 pH is always the same potential */

/* ---- units ---- */

static const enum sm_unit result_units[] = { SM_UNIT_PH,    SM_UNIT_MG_L,   SM_UNIT_UG_L,
                                             SM_UNIT_US_CM, SM_UNIT_MS_CM,  SM_UNIT_A,
                                             SM_UNIT_MV,    SM_UNIT_PERCENT };
static const enum sm_unit signal_units[] = { SM_UNIT_MV, SM_UNIT_V, SM_UNIT_A, SM_UNIT_US_CM,
                                             SM_UNIT_MS_CM };

static bool is_among(enum sm_unit u, const enum sm_unit *units, size_t n)
{
    for (size_t i = 0; i < n; i++)
        if (units[i] == u)
            return true;
    return false;
}

/* Per minute of a unit; false where no rate of it has a name. */
static bool rate_of(enum sm_unit u, enum sm_unit *ret_rate)
{
    static const enum sm_unit pairs[][2] = { { SM_UNIT_MV, SM_UNIT_MV_MIN },
                                             { SM_UNIT_PH, SM_UNIT_PH_MIN },
                                             { SM_UNIT_US_CM, SM_UNIT_US_CM_MIN },
                                             { SM_UNIT_A, SM_UNIT_A_MIN } };

    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++)
        if (pairs[i][0] == u) {
            *ret_rate = pairs[i][1];
            return true;
        }
    return false;
}

static bool is_nernst(const struct sm_method *m)
{
    return m->model == SM_MODEL_NERNST;
}

/* ---- what is measured, with what ---- */

static void fill_model(const struct sm_reader *r, const struct sm_node *node, struct sm_method *m)
{
    const char *names[SM_MODEL_COUNT];
    size_t at = 0;

    for (size_t i = 0; i < SM_MODEL_COUNT; i++)
        names[i] = sm_model_name((enum sm_model)i);
    m->model = m->measures == SM_UNIT_PH ? SM_MODEL_NERNST : SM_MODEL_LINE; /* if blamed: likely */
    if (!sm_get_choice(r, node, names, SM_MODEL_COUNT, &at))
        return;
    m->model = (enum sm_model)at;
    if (!sm_model_built(m->model))
        sm_blame(r, node, "model %s is not possible yet", names[at]);
}

static void fill_measures(const struct sm_reader *r, const struct sm_node *node,
                          struct sm_method *m)
{
    enum sm_unit u;

    m->measures = SM_UNIT_COUNT;
    if (node == NULL)
        return;
    if (node->kind != SM_NODE_TEXT || sm_unit_parse(node->text, node->n, &u) != SM_OK ||
        !is_among(u, result_units, sizeof result_units / sizeof result_units[0])) {
        sm_blame_got(r, node,
                     "expected the unit of the results: pH, mg/L, µg/L, µS/cm, mS/cm, A, "
                     "mV or %%");
        return;
    }
    m->measures = u;
}

static void fill_temperature(const struct sm_reader *r, const struct sm_node *node,
                             struct sm_method *m)
{
    static const char assumed[] = "assumed ";
    struct sm_quantity q;

    if (node == NULL)
        return;
    if (sm_is_word(node, "typed")) {
        m->temperature_from = SM_TEMPERATURE_TYPED;
    } else if (node->kind == SM_NODE_TEXT && sm_meter_name_ok(node->text, node->n)) {
        m->temperature_from = SM_TEMPERATURE_CHANNEL;
        sm_text_copy(m->temperature, sizeof m->temperature, node->text);
    } else if (node->kind == SM_NODE_TEXT && node->n > strlen(assumed) &&
               memcmp(node->text, assumed, strlen(assumed)) == 0 &&
               sm_quantity_parse(node->text + strlen(assumed), node->n - strlen(assumed), &q) ==
                   SM_OK &&
               q.unit == SM_UNIT_CELSIUS && q.value >= 0 && q.value <= 100) {
        m->temperature_from = SM_TEMPERATURE_ASSUMED;
        m->assumed_c = q.value;
    } else {
        sm_blame_got(r, node,
                     "expected a channel's name, typed, or assumed 20 °C (0 °C to 100 °C)");
    }
}

static void fill_isopotential(const struct sm_reader *r, const struct sm_node *map,
                              struct sm_method *m)
{
    static const char *const keys[] = { "at", "half-width", NULL };

    m->ph_iso = 7.0;
    m->ph_iso_half_width = 0.5;
    if (map != NULL && !is_nernst(m)) {
        sm_blame(r, map, "used only with model: nernst");
        return;
    }
    if (!sm_keys_known(r, map, keys))
        return;
    sm_get_quantity(r, sm_key(map, "at"), SM_UNIT_PH, 0, 14, &m->ph_iso);
    sm_get_quantity(r, sm_key(map, "half-width"), SM_UNIT_PH, 0, 3, &m->ph_iso_half_width);
}

/* The signal's unit: mV for nernst; else that of the tolerance, which can be stated in no other. */
static void find_signal_unit(const struct sm_reader *r, const struct sm_node *root,
                             struct sm_method *m)
{
    const struct sm_node *node = sm_key(root, "tolerance");
    struct sm_quantity q;

    m->signal_unit = SM_UNIT_MV;
    if (is_nernst(m)) {
        if (m->measures != SM_UNIT_PH && m->measures != SM_UNIT_COUNT)
            sm_blame_got(r, sm_key(root, "measures"), "expected pH with model: nernst");
        return;
    }
    m->signal_unit = SM_UNIT_COUNT;
    if (node != NULL && node->kind == SM_NODE_MAP)
        node = sm_key(node, "standards");
    if (node == NULL)
        return; /* blamed as missing */
    if (sm_get_any_quantity(node, &q) &&
        is_among(q.unit, signal_units, sizeof signal_units / sizeof signal_units[0]))
        m->signal_unit = q.unit;
    else
        sm_blame_got(r, node, "expected a change of the signal in mV, V, A, µS/cm or mS/cm");
}

/* ---- by class: one value for all, or { standards: …, samples: … }; checks are as standards ----
 */

struct by_class {
    const struct sm_node *standards, *samples; /* NULL: left out */
};

static struct by_class classes(const struct sm_reader *r, const struct sm_node *node)
{
    static const char *const keys[] = { "standards", "samples", NULL };
    struct by_class c = { node, node };

    if (node == NULL || node->kind != SM_NODE_MAP)
        return c;
    (void)sm_keys_known(r, node, keys);
    c.standards = sm_need(r, node, "standards", "a value");
    c.samples = sm_need(r, node, "samples", "a value");
    return c;
}

/* A quantity in the signal's unit, or in the results' where theory says what that is in the signal.
 */
static bool in_signal(const struct sm_reader *r, const struct sm_node *node,
                      const struct sm_method *m, struct sm_quantity *ret_written, double *ret_u)
{
    struct sm_quantity q = { 0 };
    double v = 0;

    if (node == NULL)
        return false;
    if (is_nernst(m) && sm_get_any_quantity(node, &q) && q.unit == SM_UNIT_PH) {
        if (!sm_get_limit(r, node, SM_UNIT_PH, &v))
            return false;
        v *= sm_nernst_mv(SLOPE_AT_C);
    } else if (is_nernst(m) &&
               (!sm_get_any_quantity(node, &q) || sm_quantity_in(q, m->signal_unit, &v) != SM_OK)) {
        sm_blame_got(r, node, "expected a pH or a potential, 0.02 pH or 0.6 mV say");
        return false;
    } else if (!sm_get_limit(r, node, m->signal_unit, &v)) {
        return false;
    }
    (void)sm_get_any_quantity(node, ret_written);
    *ret_u = v;
    return true;
}

static void set_tolerance(struct sm_method *m, enum sm_class c, double u,
                          struct sm_quantity written)
{
    m->rule.tolerance[c] = u;
    m->tolerance_written[c] = written;
}

static void fill_tolerance(const struct sm_reader *r, const struct sm_node *root,
                           struct sm_method *m)
{
    const struct sm_node *node = sm_key(root, "tolerance");
    struct sm_quantity standards = { 0.01, SM_UNIT_PH }, samples = { 0.02, SM_UNIT_PH };
    double u_standards = standards.value * sm_nernst_mv(SLOPE_AT_C);
    double u_samples = samples.value * sm_nernst_mv(SLOPE_AT_C);
    struct by_class by;

    if (!is_nernst(m))
        node = sm_need(r, root, "tolerance", "how close is close enough, 0.6 mV say");
    by = classes(r, node);
    in_signal(r, by.standards, m, &standards, &u_standards);
    if (by.samples == by.standards && node != NULL) {
        samples = standards;
        u_samples = u_standards;
    } else {
        in_signal(r, by.samples, m, &samples, &u_samples);
    }
    set_tolerance(m, SM_CLASS_STANDARD, u_standards, standards);
    set_tolerance(m, SM_CLASS_CHECK, u_standards, standards);
    set_tolerance(m, SM_CLASS_SAMPLE, u_samples, samples);
}

static void fill_doubt(const struct sm_reader *r, const struct sm_node *node, struct sm_rule *rule)
{
    const struct by_class by = classes(r, node);
    double standards = 1, samples = 3;

    sm_get_quantity(r, by.standards, SM_UNIT_PERCENT, 0.01, 50, &standards);
    if (by.samples == by.standards && node != NULL)
        samples = standards;
    else
        sm_get_quantity(r, by.samples, SM_UNIT_PERCENT, 0.01, 50, &samples);
    rule->doubt[SM_CLASS_STANDARD] = rule->doubt[SM_CLASS_CHECK] = standards / 100;
    rule->doubt[SM_CLASS_SAMPLE] = samples / 100;
}

static void fill_waits(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    const struct sm_node *node = sm_key(root, "longest-wait");
    int64_t standards = 5 * MIN, samples = 15 * MIN;
    struct by_class by;

    m->rule.dwell_ns = 30 * SM_NS_PER_S;
    if (!is_nernst(m)) {
        (void)sm_need(r, root, "dwell", "the least time in one place, 10 s say");
        node = sm_need(r, root, "longest-wait", "the most time in one place, 5 min say");
    }
    sm_get_time(r, sm_key(root, "dwell"), SM_NS_PER_S, HOUR, &m->rule.dwell_ns);
    by = classes(r, node);
    sm_get_time(r, by.standards, SM_NS_PER_S, 24 * HOUR, &standards);
    if (by.samples == by.standards && node != NULL)
        samples = standards;
    else
        sm_get_time(r, by.samples, SM_NS_PER_S, 24 * HOUR, &samples);
    m->rule.longest_wait_ns[SM_CLASS_STANDARD] = standards;
    m->rule.longest_wait_ns[SM_CLASS_CHECK] = standards;
    m->rule.longest_wait_ns[SM_CLASS_SAMPLE] = samples;
    if (m->rule.dwell_ns >= standards || m->rule.dwell_ns >= samples)
        sm_blame(r, node != NULL ? node : sm_key(root, "dwell"),
                 "the longest wait must be longer than the dwell");
}

/* A change per minute of the sample itself, to u/s. */
static void get_drift(const struct sm_reader *r, const struct sm_node *node,
                      const struct sm_method *m, double *ret_per_s)
{
    enum sm_unit rate = SM_UNIT_MV_MIN;
    struct sm_quantity q;
    double v = 0;

    if (node == NULL || m->signal_unit == SM_UNIT_COUNT)
        return;
    if (is_nernst(m) && sm_get_any_quantity(node, &q) && q.unit == SM_UNIT_PH_MIN) {
        if (sm_get_quantity(r, node, SM_UNIT_PH_MIN, 0, 1, &v))
            *ret_per_s = v * sm_nernst_mv(SLOPE_AT_C) / 60;
    } else if (!rate_of(m->signal_unit, &rate)) {
        sm_blame(r, node, "a signal in %s has no drift allowance", sm_unit_name(m->signal_unit));
    } else if (sm_get_quantity(r, node, rate, 0, 100, &v)) {
        *ret_per_s = v / 60;
    }
}

static void fill_drift(const struct sm_reader *r, const struct sm_node *node, struct sm_method *m)
{
    const struct by_class by = classes(r, node);
    double standards = 0, samples = is_nernst(m) ? 0.005 * sm_nernst_mv(SLOPE_AT_C) / 60 : 0;

    get_drift(r, by.standards, m, &standards);
    if (by.samples == by.standards && node != NULL)
        samples = standards;
    else
        get_drift(r, by.samples, m, &samples);
    m->rule.drift_allowed_per_s[SM_CLASS_STANDARD] = standards;
    m->rule.drift_allowed_per_s[SM_CLASS_CHECK] = standards;
    m->rule.drift_allowed_per_s[SM_CLASS_SAMPLE] = samples;
}

/* ---- the rule and its own keys ---- */

static bool uses(enum sm_rule_kind kind, const char *key)
{
    switch (kind) {
    case SM_RULE_SPREAD:
        return strcmp(key, "over") == 0;
    case SM_RULE_SUCCESSIVE:
        return strcmp(key, "readings") == 0 || strcmp(key, "apart") == 0 ||
               strcmp(key, "limit") == 0;
    case SM_RULE_DRIFT:
        return strcmp(key, "over") == 0 || strcmp(key, "limit") == 0;
    case SM_RULE_SINGLE:
        return strcmp(key, "u") == 0;
    case SM_RULE_ARRIVAL:
    case SM_RULE_HALVES:
    case SM_RULE_TIMED:
    case SM_RULE_COUNT:
        break;
    }
    return false;
}

/* The value of a key that only some rules have: needed there, refused elsewhere. */
static const struct sm_node *rule_key(const struct sm_reader *r, const struct sm_node *root,
                                      const struct sm_method *m, const char *key,
                                      const char *expected)
{
    const struct sm_node *node = sm_key(root, key);

    if (uses(m->rule.kind, key))
        return sm_need(r, root, key, expected);
    if (node != NULL)
        sm_blame(r, node, "rule %s does not use it", sm_rule_name(m->rule.kind));
    return NULL;
}

static void fill_limit(const struct sm_reader *r, const struct sm_node *node, struct sm_method *m)
{
    struct sm_quantity written;
    double per_s = 0;

    if (node == NULL)
        return;
    if (m->rule.kind == SM_RULE_DRIFT) {
        get_drift(r, node, m, &per_s);
        m->rule.limit = per_s * 60;
    } else {
        in_signal(r, node, m, &written, &m->rule.limit);
    }
}

static void fill_rule(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    const struct sm_node *node = sm_key(root, "rule");
    const char *names[SM_RULE_COUNT];
    struct sm_rule *rule = &m->rule;
    struct sm_quantity written;
    size_t at = SM_RULE_ARRIVAL;

    for (size_t i = 0; i < SM_RULE_COUNT; i++)
        names[i] = sm_rule_name((enum sm_rule_kind)i);
    if (node != NULL && !sm_get_choice(r, node, names, SM_RULE_COUNT, &at))
        return;
    rule->kind = (enum sm_rule_kind)at;
    if (!sm_rule_built(rule->kind))
        sm_blame(r, node != NULL ? node : root, "%srule %s is not possible yet: say rule: spread",
                 node != NULL ? "" : "rule: left out, and the default ", names[at]);
    sm_get_time(r, rule_key(r, root, m, "over", "the span that is judged, 20 s say"), SM_NS_PER_S,
                HOUR, &rule->over_ns);
    sm_get_count(r, rule_key(r, root, m, "readings", "how many readings"), 2, 100, &rule->readings);
    sm_get_time(r, rule_key(r, root, m, "apart", "how far apart the readings are, 10 s say"),
                100 * SM_NS_PER_MS, HOUR, &rule->apart_ns);
    fill_limit(r, rule_key(r, root, m, "limit", "the limit, 0.6 mV say"), m);
    in_signal(r, rule_key(r, root, m, "u", "the standard uncertainty of a reading"), m, &written,
              &rule->single_u);
    for (int c = 0; c < SM_CLASS_COUNT; c++)
        if (rule->over_ns > rule->longest_wait_ns[c]) {
            sm_blame(r, sm_key(root, "over"), "longer than the longest wait");
            break;
        }
}

/* ---- cautions and odds ---- */

static void fill_caution(const struct sm_reader *r, const struct sm_node *map, struct sm_caution *c)
{
    static const char *const keys[] = { "at", "text", NULL };
    static const char *const steps[] = { "loading", "standard", "check", "sample" };
    static const char end[] = "Follow your local rules and safety data sheets.";
    const struct sm_node *text;
    size_t at = 0;

    if (!sm_keys_known(r, map, keys))
        return;
    if (sm_get_choice(r, sm_need(r, map, "at", "loading, standard, check or sample"), steps, 4,
                      &at))
        c->when = (enum sm_caution_when)at;
    text = sm_need(r, map, "text", "the caution");
    if (sm_get_text(r, text, "the caution", c->text, sizeof c->text) &&
        (text->n < strlen(end) || strcmp(text->text + text->n - strlen(end), end) != 0))
        sm_blame(r, text, "expected a text that ends \"%s\"", end);
}

static void fill_cautions(const struct sm_reader *r, const struct sm_node *list,
                          struct sm_method *m)
{
    if (!sm_is_list(r, list, 0, SM_CAUTIONS_MAX, "cautions"))
        return;
    for (const struct sm_node *c = list->child; c != NULL; c = c->next)
        fill_caution(r, c, &m->caution[m->n_cautions++]);
}

static void fill_odds(const struct sm_reader *r, const struct sm_node *root, struct sm_method *m)
{
    static const char *const marks[] = { "ask", "required", "none" };
    static const char *const redo[] = { "for cause", "mean", "first" };
    size_t at = 0;

    m->marks = SM_MARKS_ASK;
    if (sm_get_choice(r, sm_key(root, "marks"), marks, 3, &at))
        m->marks = (enum sm_marks)at;
    m->redo = SM_REDO_FOR_CAUSE;
    if (sm_get_choice(r, sm_key(root, "redo"), redo, 3, &at))
        m->redo = (enum sm_redo)at;
    m->idle_ns = 5 * MIN;
    sm_get_time(r, sm_key(root, "idle"), 10 * SM_NS_PER_S, 24 * HOUR, &m->idle_ns);
    m->gap_ns = 2 * MIN;
    sm_get_time(r, sm_key(root, "gap"), SM_NS_PER_S, 24 * HOUR, &m->gap_ns);
    sm_get_text(r, sm_key(root, "note"), "a sentence", m->note, sizeof m->note);
    fill_cautions(r, sm_key(root, "cautions"), m);
}

void sm_method_fill(const struct sm_reader *r, const struct sm_node *root, const char *name,
                    struct sm_method *m)
{
    static const char *const keys[] = { "measures",
                                        "signal",
                                        "temperature",
                                        "model",
                                        "isopotential",
                                        "rule",
                                        "tolerance",
                                        "doubt",
                                        "dwell",
                                        "longest-wait",
                                        "drift-allowed",
                                        "over",
                                        "readings",
                                        "apart",
                                        "limit",
                                        "u",
                                        "levels",
                                        "levels-after-drop",
                                        "r-squared",
                                        "residual-sd",
                                        "slope",
                                        "offset",
                                        "back-calculated",
                                        "leave-one-out",
                                        "curve-valid",
                                        "check-after-curve",
                                        "check",
                                        "duplicate",
                                        "marks",
                                        "redo",
                                        "idle",
                                        "gap",
                                        "note",
                                        "cautions",
                                        NULL };

    if (!sm_keys_known(r, root, keys))
        return;
    sm_text_copy(m->name, sizeof m->name, name);
    fill_measures(r, sm_need(r, root, "measures", "the unit of the results, pH say"), m);
    fill_model(r, sm_need(r, root, "model", "nernst, line, …"), m);
    sm_get_short_name(r, sm_need(r, root, "signal", "the channel that must settle"),
                      "a channel's name", m->signal);
    fill_temperature(r, sm_need(r, root, "temperature", "a channel, typed, or assumed 20 °C"), m);
    fill_isopotential(r, sm_key(root, "isopotential"), m);
    find_signal_unit(r, root, m);
    fill_tolerance(r, root, m);
    fill_doubt(r, sm_key(root, "doubt"), &m->rule);
    fill_waits(r, root, m);
    fill_drift(r, sm_key(root, "drift-allowed"), m);
    fill_rule(r, root, m);
    sm_acceptance_fill(r, root, m);
    fill_odds(r, root, m);
    sm_method_plain(m);
}
