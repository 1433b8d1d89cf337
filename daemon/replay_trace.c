/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_trace.c: `stillmark-replay trace FILE.csv …`. */
#include "replay_trace.h"

#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#include "base/csv.h"
#include "base/number.h"
#include "base/text.h"
#include "base/time.h"
#include "base/unit.h"
#include "say.h"
#include "signal/trace.h"
#include "whole_file.h"

#define ME "stillmark-replay trace"
#define FILE_MAX ((size_t)1 << 30) /* bytes of the CSV file */
#define DONE 0
#define NOT_DONE 2

static const char HELP[] = ME
    " FILE.csv --tolerance \"0.6 mV\" --rule spread\n"
    "\n"
    "When would a recording (first column time in s, second the value) have been taken as\n"
    "settled? Prints CSV, a row per capture. The unit is that of column two; a bare number will "
    "do.\n"
    "  --tolerance T      how close is close enough\n"
    "  --rule R           spread: largest less smallest within T over a time (so far the only "
    "one)\n"
    "  --over T           that time; 20 s\n"
    "  --dwell T          least time in one place; 22 s\n"
    "  --longest-wait T   most time; 1800 s\n"
    "  --value window     what is reported: the mean of the window of readings (so far the only "
    "one)\n"
    "  --doubt P, --readings N, --apart T, --limit L\n"
    "                     for rules that are not built yet\n"
    "Figures for \"settled\" rest on simulated signals until real electrodes have been recorded.\n"
    "Exit status: 0 done; 2 could not be done.\n";

enum { TOLERANCE, RULE, DOUBT, DWELL, LONGEST_WAIT, VALUE, OVER, READINGS, APART, LIMIT, OPTIONS };

static const char *const names[OPTIONS] = {
    [TOLERANCE] = "--tolerance",
    [RULE] = "--rule",
    [DOUBT] = "--doubt",
    [DWELL] = "--dwell",
    [LONGEST_WAIT] = "--longest-wait",
    [VALUE] = "--value",
    [OVER] = "--over",
    [READINGS] = "--readings",
    [APART] = "--apart",
    [LIMIT] = "--limit",
};

struct options {
    const char *file;
    const char *value[OPTIONS]; /* NULL: not given */
    bool help;
};

/* ---- the command line ---- */

/* The option that argv[*i] is, as "--name VALUE" or "--name=VALUE"; OPTIONS if it is none. */
static unsigned which(const char *arg)
{
    for (unsigned o = 0; o < OPTIONS; o++) {
        const size_t n = strlen(names[o]);

        if (strncmp(arg, names[o], n) == 0 && (arg[n] == '\0' || arg[n] == '='))
            return o;
    }
    return OPTIONS;
}

static bool understand(int argc, char **argv, struct options *o)
{
    for (int i = 0; i < argc; i++) {
        const unsigned at = which(argv[i]);
        const char *equals = strchr(argv[i], '=');

        if (strcmp(argv[i], "--help") == 0) {
            o->help = true;
        } else if (at == OPTIONS && (argv[i][0] == '-' || o->file != NULL)) {
            sm_say(ME, "\"%s\" is not understood; see " ME " --help", argv[i]);
            return false;
        } else if (at == OPTIONS) {
            o->file = argv[i];
        } else if (o->value[at] != NULL) {
            sm_say(ME, "%s is given twice", names[at]);
            return false;
        } else if (equals != NULL) {
            o->value[at] = equals + 1;
        } else if (i + 1 < argc) {
            o->value[at] = argv[++i];
        } else {
            sm_say(ME, "%s needs a value", names[at]);
            return false;
        }
    }
    return true;
}

static bool expected(const struct options *o, unsigned at, const char *what)
{
    sm_say(ME, "%s: expected %s, got \"%s\"", names[at], what, o->value[at]);
    return false;
}

/* A time; a bare number is in seconds. */
static bool choose_time(const struct options *o, unsigned at, const char *otherwise,
                        int64_t *ret_ns)
{
    const char *text = o->value[at] != NULL ? o->value[at] : otherwise;
    struct sm_quantity q;

    if (sm_quantity_parse(text, strlen(text), &q) == SM_OK) {
        if (q.unit == SM_UNIT_NONE)
            q.unit = SM_UNIT_S;
        if (sm_quantity_ns(q, ret_ns) == SM_OK)
            return true;
    }
    return expected(o, at, "a time such as \"22 s\"");
}

/* A positive number in the unit of column two, whatever that is called. */
static bool choose_amount(const struct options *o, unsigned at, double *ret_value)
{
    struct sm_quantity q;

    if (sm_quantity_parse(o->value[at], strlen(o->value[at]), &q) != SM_OK || !(q.value > 0))
        return expected(o, at, "a positive number such as \"0.6 mV\"");
    *ret_value = q.value;
    return true;
}

static bool choose_rule(const struct options *o, enum sm_rule_kind *ret_kind)
{
    const char *name = o->value[RULE];

    if (name == NULL && !sm_rule_built(SM_RULE_ARRIVAL))
        sm_say(ME, "--rule is needed until the rule arrival exists: --rule spread");
    else if (name != NULL && !sm_rule_known(name, ret_kind))
        sm_say(ME, "--rule: expected arrival, halves, spread, successive or drift, got \"%s\"",
               name);
    else if (name != NULL && !sm_rule_built(*ret_kind))
        sm_say(ME, "--rule %s: not possible yet", name);
    else {
        if (name == NULL)
            *ret_kind = SM_RULE_ARRIVAL;
        return true;
    }
    return false;
}

static bool choose_doubt(const struct options *o, double *ret_doubt)
{
    struct sm_quantity q = { 3, SM_UNIT_PERCENT };
    const char *text = o->value[DOUBT];

    if (text != NULL && (sm_quantity_parse(text, strlen(text), &q) != SM_OK ||
                         (q.unit != SM_UNIT_PERCENT && q.unit != SM_UNIT_NONE)))
        return expected(o, DOUBT, "a percentage such as \"3 %\"");
    *ret_doubt = q.unit == SM_UNIT_PERCENT ? q.value / 100 : q.value;
    if (!(*ret_doubt > 0 && *ret_doubt < 1))
        return expected(o, DOUBT, "more than 0 % and less than 100 %");
    return true;
}

static bool choose_value(const struct options *o)
{
    const char *value = o->value[VALUE];

    if (value == NULL || strcmp(value, "window") == 0)
        return true;
    if (strcmp(value, "end") == 0)
        sm_say(ME, "--value end: not possible yet, no rule that makes a forecast is built");
    else
        expected(o, VALUE, "window or end");
    return false;
}

static bool choose(const struct options *o, struct sm_rule *ret_rule)
{
    struct sm_rule r = { .kind = SM_RULE_SPREAD };
    double tolerance = 0, doubt = 0;
    int64_t wait_ns = 0, readings = 3;

    if (o->file == NULL) {
        sm_say(ME, "which file? See " ME " --help");
        return false;
    }
    if (o->value[TOLERANCE] == NULL) {
        sm_say(ME, "--tolerance is needed, such as --tolerance \"0.6 mV\"");
        return false;
    }
    if (!choose_rule(o, &r.kind) || !choose_amount(o, TOLERANCE, &tolerance) ||
        !choose_doubt(o, &doubt) || !choose_value(o) ||
        !choose_time(o, DWELL, "22 s", &r.dwell_ns) ||
        !choose_time(o, LONGEST_WAIT, "1800 s", &wait_ns) ||
        !choose_time(o, OVER, "20 s", &r.over_ns) || !choose_time(o, APART, "10 s", &r.apart_ns))
        return false;
    if (o->value[LIMIT] != NULL && !choose_amount(o, LIMIT, &r.limit))
        return false;
    if (o->value[READINGS] != NULL &&
        (sm_integer_parse(o->value[READINGS], strlen(o->value[READINGS]), &readings) != SM_OK ||
         readings < 2 || readings > 1000))
        return expected(o, READINGS, "a count from 2 to 1000");
    if (r.over_ns <= 0)
        return expected(o, OVER, "more than 0 s");
    if (wait_ns < r.dwell_ns || wait_ns < r.over_ns) {
        sm_say(ME, "--longest-wait is shorter than --dwell or --over: nothing could be captured");
        return false;
    }
    r.readings = (unsigned)readings;
    for (unsigned c = 0; c < SM_CLASS_COUNT; c++) {
        r.tolerance[c] = tolerance;
        r.doubt[c] = doubt;
        r.longest_wait_ns[c] = wait_ns;
    }
    *ret_rule = r;
    return true;
}

/* ---- the work ---- */

static bool print_row(const struct sm_trace_row *r)
{
    const double value[4] = { r->moved_s, r->captured_s, r->value, r->expanded_uncertainty };
    char text[SM_NUMBER_SIZE];

    for (unsigned i = 0; i < 4; i++) {
        sm_number_write(text, value[i]);
        printf("%s,", text);
    }
    return printf("%u\n", r->readings) > 0;
}

static bool blame_reading(const char *file, unsigned line, enum sm_status status)
{
    if (status == SM_EORDER)
        sm_say(NULL, "%s:%u: the time goes back: expected rows in order of time", file, line);
    else
        sm_say(NULL, "%s:%u: the time is too far from 0: expected seconds", file, line);
    return false;
}

static bool trace(struct sm_csv *csv, const char *file, struct sm_trace *t)
{
    char why[SM_REASON_SIZE];
    struct sm_csv_row row;
    struct sm_trace_row out;
    enum sm_status status;
    bool captured;

    while ((status = sm_csv_next(csv, &row, why)) == SM_OK) {
        status = sm_trace_feed(t, row.x, row.y, row.y_step, &captured, &out);
        if (status != SM_OK)
            return blame_reading(file, csv->line, status);
        if (captured && !print_row(&out))
            break;
    }
    if (status == SM_ESYNTAX) {
        sm_say(NULL, "%s:%u: %s", file, csv->line, why);
        return false;
    }
    if (fflush(stdout) != 0 || ferror(stdout)) {
        sm_say(ME, "standard output cannot be written");
        return false;
    }
    return true;
}

static bool run(const char *file, const struct sm_whole_file *whole, const struct sm_rule *rule)
{
    char why[SM_REASON_SIZE];
    struct sm_trace *t = NULL;
    struct sm_csv csv;
    enum sm_status status;
    bool done;

    if (whole->n > FILE_MAX) {
        sm_say(NULL, "%s: larger than 1 GiB", file);
        return false;
    }
    if (sm_csv_begin(&csv, whole->text, whole->n, why) != SM_OK) {
        sm_say(NULL, "%s:%u: %s", file, csv.line, why);
        return false;
    }
    status = sm_trace_create(rule, &t);
    if (status != SM_OK) {
        sm_say(ME, "the rule cannot be used: %s", sm_status_text(status));
        return false;
    }
    puts("moved_s,captured_s,value,expanded_uncertainty,readings");
    done = trace(&csv, file, t);
    sm_trace_destroy(t);
    return done;
}

int sm_replay_trace(int argc, char **argv)
{
    struct options o = { .file = NULL };
    struct sm_whole_file whole;
    struct sm_rule rule;
    bool done;
    int err;

    if (!understand(argc, argv, &o))
        return NOT_DONE;
    if (o.help) {
        fputs(HELP, stdout);
        return DONE;
    }
    if (!choose(&o, &rule))
        return NOT_DONE;
    err = sm_whole_file_open(o.file, &whole);
    if (err != 0) {
        sm_say(NULL, "%s: %s", o.file, strerror(-err));
        return NOT_DONE;
    }
    done = run(o.file, &whole, &rule);
    sm_whole_file_close(&whole);
    return done ? DONE : NOT_DONE;
}
