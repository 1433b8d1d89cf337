/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry_sentence.c: one small function per kind of entry. */
#include "view/entry_sentence.h"

#include <math.h>
#include <string.h>

#include "base/time.h"
#include "view/phrase.h"

/* ---- out of an object that may hold anything ---- */

static const char *words(const json_t *o, const char *key)
{
    const char *s = json_string_value(json_object_get(o, key));

    return s != NULL ? s : "";
}

static bool has(const json_t *o, const char *key)
{
    return json_string_length(json_object_get(o, key)) > 0;
}

static bool real(const json_t *o, const char *key, double *ret_value)
{
    const json_t *v = json_object_get(o, key);

    if (!json_is_number(v) || !isfinite(json_number_value(v)))
        return false;
    *ret_value = json_number_value(v);
    return true;
}

static bool is_true(const json_t *o, const char *key)
{
    return json_is_true(json_object_get(o, key));
}

static void add(struct sm_text *t, const json_t *o, const char *key)
{
    const json_t *v = json_object_get(o, key);

    if (json_is_string(v))
        sm_text_add_safe(t, json_string_value(v), json_string_length(v));
}

/* With a capital letter first. */
static void add_sentence(struct sm_text *t, const json_t *o, const char *key)
{
    const size_t at = t->len;

    add(t, o, key);
    if (t->buf[at] >= 'a' && t->buf[at] <= 'z')
        t->buf[at] = (char)(t->buf[at] - 'a' + 'A');
}

/* "before TEXT", where there is a text. */
static void add_after(struct sm_text *t, const char *before, const json_t *o, const char *key)
{
    if (!has(o, key))
        return;
    sm_text_add(t, before);
    add(t, o, key);
}

bool sm_item_sentence(const json_t *item, struct sm_text *t)
{
    const json_t *title = json_object_get(item, has(item, "title") ? "title" : "name");

    if (json_string_length(title) == 0)
        return false;
    sm_phrase_item(t, words(item, "kind"), json_string_value(title), json_string_length(title));
    return true;
}

static void remarks(const json_t *e, struct sm_text *t)
{
    const json_t *list = json_object_get(e, "remarks"), *one;
    size_t i;

    json_array_foreach(list, i, one)
    {
        if (!json_is_string(one))
            continue;
        sm_text_add(t, " (");
        sm_text_add_safe(t, json_string_value(one), json_string_length(one));
        sm_text_add(t, ")");
    }
}

/* ---- events ---- */

static void capture(const json_t *e, struct sm_text *t)
{
    double value, u95, since;

    sm_text_add(t, "Settled: ");
    if (!sm_item_sentence(e, t))
        sm_text_add(t, "a capture");
    if (real(e, "value", &value) && real(e, "expanded_uncertainty", &u95)) {
        sm_text_add(t, ", ");
        sm_phrase_with_u95(t, value, u95, words(e, "unit"));
    }
    if (real(e, "since_moved", &since) && since >= 0 && since < 1e18) {
        sm_text_add(t, " after ");
        sm_phrase_duration(t, (int64_t)since);
    }
    remarks(e, t);
}

static void accepted_curve(const json_t *e, struct sm_text *t)
{
    const json_t *fit = json_object_get(e, "fit");
    double v;

    if (real(fit, "slope", &v))
        sm_text_addf(t, "slope %.1f %%, ", 100 * v);
    if (real(fit, "offset", &v))
        sm_text_addf(t, "offset %.1f mV, ", v);
    if (real(fit, "residual_sd", &v)) {
        sm_text_addf(t, "residual SD %.2g ", v);
        add(t, e, "unit_y");
        sm_text_add(t, ", ");
    }
    if (real(fit, "r_squared", &v))
        sm_text_addf(t, "R² %.5f", v);
}

static void refused_curve(const json_t *e, struct sm_text *t)
{
    const json_t *list = json_object_get(e, "judged"), *one;
    bool first = true;
    size_t i;

    if (!json_is_object(json_object_get(e, "fit"))) {
        sm_text_add(t, "no curve goes through these standards");
        first = false;
    }
    json_array_foreach(list, i, one)
    {
        if (!json_is_false(json_object_get(one, "pass")))
            continue;
        sm_text_add(t, first ? "" : ". ");
        add(t, one, has(one, "text") ? "text" : "quantity");
        first = false;
    }
}

static void curve(const json_t *e, struct sm_text *t)
{
    sm_text_add(t, is_true(e, "accepted") ? "Curve accepted: " : "Curve refused: ");
    if (is_true(e, "accepted"))
        accepted_curve(e, t);
    else
        refused_curve(e, t);
}

static void check(const json_t *e, struct sm_text *t)
{
    double found;

    sm_text_add(t, is_true(e, "pass") ? "Check passed: " : "Check failed: ");
    add(t, e, "name");
    add_after(t, real(e, "found", &found) ? " " : ": ", e, "why");
}

static void result(const json_t *e, struct sm_text *t)
{
    double value, u95;

    if (!sm_item_sentence(e, t))
        sm_text_add(t, "Result");
    sm_text_add(t, ": ");
    if (real(e, "value", &value) && real(e, "expanded_uncertainty", &u95)) {
        sm_phrase_with_u95(t, value, u95, words(e, "unit"));
    } else if (real(e, "value", &value)) {
        sm_phrase_value(t, value, words(e, "unit"));
    } else if (has(e, "shown")) {
        add(t, e, "shown");
        add_after(t, " ", e, "unit");
    } else {
        sm_text_add(t, "no value");
    }
    /* never without its state: a result is provisional until a check releases it */
    sm_text_add(t, ", ");
    if (has(e, "state"))
        add(t, e, "state");
    else
        sm_text_add(t, "state unknown");
    add_after(t, ": ", e, "why");
    remarks(e, t);
}

static void change(const json_t *e, struct sm_text *t)
{
    const size_t n = json_array_size(json_object_get(e, "results"));

    sm_text_addf(t, "%zu result%s %s", n, n == 1 ? "" : "s",
                 strcmp(words(e, "k"), "hold") == 0 ? "held" : "released");
    add_after(t, ": ", e, "why");
}

static void question(const json_t *e, struct sm_text *t)
{
    sm_text_add(t, "Question: ");
    add(t, e, "text");
}

static void answer(const json_t *e, struct sm_text *t)
{
    if (is_true(e, "done")) {
        sm_text_add(t, "Done");
        return;
    }
    sm_text_add(t, "Refused");
    add_after(t, ": ", e, "why");
}

static void moved(const json_t *e, struct sm_text *t)
{
    const char *by = words(e, "by");

    if (strcmp(by, "value") == 0 && has(e, "why")) {
        add_sentence(t, e, "why"); /* it says that the value changed */
        return;
    }
    if (strcmp(by, "value") == 0)
        sm_text_add(t, "The value changed");
    else if (strcmp(by, "start") == 0)
        sm_text_add(t, "Readings begin");
    else
        sm_text_add(t, "The probe was moved");
    if (!has(e, "name")) {
        add_after(t, ": ", e, "why");
        return;
    }
    add_after(t, " (", e, "why");
    sm_text_add(t, has(e, "why") ? "): " : ": ");
    if (strcmp(by, "transit") != 0) {
        sm_text_add(t, "now in ");
        (void)sm_item_sentence(e, t);
        return;
    }
    sm_text_add(t, "what settles next is "); /* it may still be in air or rinse */
    (void)sm_item_sentence(e, t);
}

static void not_settled(const json_t *e, struct sm_text *t)
{
    sm_text_add(t, "Not settled, no value taken");
    if (has(e, "name"))
        sm_text_add(t, ": ");
    (void)sm_item_sentence(e, t);
    add_after(t, ": ", e, "why");
}

static void open_circuit(const json_t *e, struct sm_text *t)
{
    (void)e;
    sm_text_add(t, "Open circuit: the probe is in air, or its cable is loose");
}

static void silent(const json_t *e, struct sm_text *t)
{
    (void)e;
    sm_text_add(t, "The meter has fallen silent: check that it is on and sending");
}

static void unread(const json_t *e, struct sm_text *t)
{
    double count;

    if (real(e, "count", &count)) {
        sm_text_addf(t, "%.0f more lines gave no reading", count);
        return;
    }
    sm_text_add(t, "A line gave no reading");
    add_after(t, ": ", e, "why");
}

/* ---- what came in ---- */

static void act(const json_t *e, struct sm_text *t)
{
    const bool sheet = strcmp(words(e, "act"), "sheet") == 0;
    double t_c;

    sm_text_add(t, "Told: ");
    add(t, e, "act");
    if (real(e, "temperature", &t_c))
        sm_text_addf(t, " %.1f °C", t_c);
    add_after(t, " ", e, sheet ? "file" : "text");
    add_after(t, ", because: ", e, "why");
    add_after(t, ", by ", e, "who");
}

static void link_changed(const json_t *e, struct sm_text *t)
{
    const char *state = words(e, "state");

    if (strcmp(state, "up") == 0) {
        sm_text_add(t, "Listening to the meter");
        add_after(t, " on ", e, "device");
        add_after(t, ", ", e, "settings");
    } else if (strcmp(state, "refused") == 0) {
        sm_text_add(t, "The port cannot be used");
    } else {
        sm_text_add(t, "The link to the meter is lost");
    }
    add_after(t, ": ", e, "why");
}

static void clock_changed(const json_t *e, struct sm_text *t)
{
    const bool slept = strcmp(words(e, "what"), "suspend") == 0;
    double by_us = 0;

    (void)real(e, "by_us", &by_us);
    if (slept)
        sm_text_add(t, "The machine was asleep for ");
    else
        sm_text_addf(t, "The wall clock jumped %s by ", by_us < 0 ? "back" : "forward");
    if (fabs(by_us) < 1e6)
        sm_text_addf(t, "%.0f ms", fabs(by_us) / 1e3);
    else if (fabs(by_us) < 1e15)
        sm_phrase_duration(t, (int64_t)fabs(by_us) * 1000);
    else
        sm_text_add(t, "more than 30 years");
}

static void opened(const json_t *e, struct sm_text *t)
{
    sm_text_add(t, "A new log file begins");
    add_after(t, " (", e, "how");
    if (has(e, "how"))
        sm_text_add(t, ")");
    add_after(t, ". Not logged: ", e, "missed");
    add_after(t, ". Signing key: ", e, "key_note");
}

static void closed(const json_t *e, struct sm_text *t)
{
    sm_text_add(t, "The log file is closed");
    add_after(t, ": ", e, "why");
}

static void raw(const json_t *e, struct sm_text *t)
{
    (void)e;
    sm_text_add(t, "Not logged: the meter sends, but its log cannot be written");
}

bool sm_entry_sentence(const json_t *entry, struct sm_text *t)
{
    static const struct {
        const char *k;
        void (*say)(const json_t *e, struct sm_text *t);
    } kinds[] = {
        { "capture", capture },
        { "curve", curve },
        { "check", check },
        { "result", result },
        { "hold", change },
        { "release", change },
        { "question", question },
        { "answer", answer },
        { "moved", moved },
        { "not-settled", not_settled },
        { "open-circuit", open_circuit },
        { "silent", silent },
        { "unread", unread },
        { "act", act },
        { "link", link_changed },
        { "clock", clock_changed },
        { "open", opened },
        { "close", closed },
        { "raw", raw },
    };
    const char *k = words(entry, "k");

    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++) {
        if (strcmp(k, kinds[i].k) == 0) {
            kinds[i].say(entry, t);
            return true;
        }
    }
    return false;
}
