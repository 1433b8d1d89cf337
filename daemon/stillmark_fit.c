/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_fit.c: `stillmark fit FILE.csv --model MODEL …`. */
#include "stillmark_fit.h"

#include <errno.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/csv.h"
#include "base/text.h"
#include "base/unit.h"
#include "curve/curve.h"
#include "say.h"
#include "view/fit.h"

#define FILE_MAX ((size_t)64 << 20) /* bytes of the CSV file */
#define READINGS_MAX 1000
#define ISOPOTENTIAL_PH 7.0 /* of no effect here: all points have one temperature */
#define DONE 0
#define NOT_DONE 2

static const char HELP[] =
    "stillmark fit FILE.csv --model MODEL [--read Y[,Y…]] [--temperature T] [--json]\n"
    "\n"
    "Fits a calibration curve to the first two columns of a CSV file, x and y.\n"
    "  --model MODEL     line, proportional, quadratic or nernst (y in mV against pH)\n"
    "  --weights W       equal (so far the only one)\n"
    "  --read Y[,Y…]     reads these y off the curve; replicates of one are joined by /\n"
    "  --temperature T   of standards and readings, for nernst: \"20 °C\" or 20\n"
    "  --json            one JSON object instead of the page of text\n"
    "Exit status: 0 fitted, whatever the statistics say; 2 could not be fitted.\n";

struct options {
    const char *file, *model, *weights, *read, *temperature, *method;
    bool json, help;
};

struct fit {
    enum sm_model model;
    double t_c;
    struct sm_csv csv;
    struct sm_point *points;
    size_t n_points;
    struct sm_fit_reading *readings;
    size_t n_readings;
    struct sm_curve curve;
    struct sm_linearity linearity;
};

/* ---- the command line ---- */

/* The value of option `name` where argv[*i] is that option, as "--name VALUE" or "--name=VALUE". */
static bool takes(const char *name, int argc, char **argv, int *i, const char **ret_value,
                  bool *ret_bad)
{
    const size_t n = strlen(name);

    if (strncmp(argv[*i], name, n) != 0 || (argv[*i][n] != '\0' && argv[*i][n] != '='))
        return false;
    if (*ret_value != NULL) {
        sm_say("stillmark fit", "%s is given twice", name);
        *ret_bad = true;
    } else if (argv[*i][n] == '=') {
        *ret_value = argv[*i] + n + 1;
    } else if (*i + 1 < argc) {
        *ret_value = argv[++*i];
    } else {
        sm_say("stillmark fit", "%s needs a value", name);
        *ret_bad = true;
    }
    return true;
}

static bool understand(int argc, char **argv, struct options *ret_options)
{
    struct options o = { .file = NULL };
    bool bad = false;

    for (int i = 0; i < argc && !bad; i++) {
        if (strcmp(argv[i], "--json") == 0)
            o.json = true;
        else if (strcmp(argv[i], "--help") == 0)
            o.help = true;
        else if (takes("--model", argc, argv, &i, &o.model, &bad) ||
                 takes("--weights", argc, argv, &i, &o.weights, &bad) ||
                 takes("--read", argc, argv, &i, &o.read, &bad) ||
                 takes("--temperature", argc, argv, &i, &o.temperature, &bad) ||
                 takes("--method", argc, argv, &i, &o.method, &bad))
            continue;
        else if (argv[i][0] == '-' || o.file != NULL) {
            sm_say("stillmark fit", "\"%s\" is not understood; see stillmark fit --help", argv[i]);
            bad = true;
        } else
            o.file = argv[i];
    }
    *ret_options = o;
    return !bad;
}

static bool choose_model(const char *name, enum sm_model *ret_model)
{
    static const char built[] = "line, proportional, quadratic or nernst";

    if (name == NULL)
        sm_say("stillmark fit", "--model is needed: %s", built);
    else if (!sm_model_known(name, ret_model))
        sm_say("stillmark fit", "--model: expected %s, got \"%s\"", built, name);
    else if (*ret_model == SM_MODEL_AS_READ)
        sm_say("stillmark fit", "--model as-read: the meter gives the result itself, there is "
                                "nothing to fit");
    else if (!sm_model_built(*ret_model))
        sm_say("stillmark fit", "--model %s: not possible yet", name);
    else
        return true;
    return false;
}

static bool choose_temperature(const struct options *o, enum sm_model m, double *ret_t_c)
{
    struct sm_quantity q;

    if (o->temperature == NULL) {
        if (m == SM_MODEL_NERNST)
            sm_say("stillmark fit", "--model nernst needs --temperature, such as \"20 °C\"");
        return m != SM_MODEL_NERNST;
    }
    if (sm_quantity_parse(o->temperature, strlen(o->temperature), &q) != SM_OK ||
        (q.unit != SM_UNIT_NONE && q.unit != SM_UNIT_CELSIUS) || !(q.value >= -20) ||
        !(q.value <= 150)) {
        sm_say("stillmark fit",
               "--temperature: expected a temperature from -20 °C to 150 °C, got \"%s\"",
               o->temperature);
        return false;
    }
    *ret_t_c = q.value;
    return true;
}

static bool not_built(const struct options *o)
{
    static const char *const weights[] = { "1/x", "1/x2", "uy" };

    if (o->method != NULL) {
        sm_say("stillmark fit", "--method: not possible yet");
        return true;
    }
    if (o->weights == NULL || strcmp(o->weights, "equal") == 0)
        return false;
    for (size_t i = 0; i < sizeof weights / sizeof weights[0]; i++)
        if (strcmp(o->weights, weights[i]) == 0) {
            sm_say("stillmark fit", "--weights %s: not possible yet", o->weights);
            return true;
        }
    sm_say("stillmark fit", "--weights: expected equal, 1/x, 1/x2 or uy, got \"%s\"", o->weights);
    return true;
}

/* One reading of --read: a number, or in mV for nernst. */
static bool read_number(const char *s, size_t n, enum sm_model m, double *ret_y)
{
    struct sm_quantity q;
    char shown[64];
    struct sm_text t;

    if (sm_quantity_parse(s, n, &q) == SM_OK &&
        (q.unit == SM_UNIT_NONE ||
         (m == SM_MODEL_NERNST && sm_quantity_in(q, SM_UNIT_MV, &q.value) == SM_OK))) {
        *ret_y = q.value;
        return true;
    }
    sm_text_init(&t, shown, sizeof shown);
    sm_text_addn(&t, s, n);
    sm_say("stillmark fit", "--read: expected a number%s, got \"%s%s\"",
           m == SM_MODEL_NERNST ? " of mV" : "", shown, t.cut ? "…" : "");
    return false;
}

/* "Y[/Y…][,Y[/Y…]…]" into f->readings. */
static bool read_readings(const char *list, struct fit *f)
{
    const char *s = list;
    double sum = 0;
    unsigned m = 0;

    f->readings = calloc(READINGS_MAX, sizeof *f->readings);
    if (f->readings == NULL) {
        sm_say("stillmark fit", "no memory");
        return false;
    }
    for (;;) {
        const size_t n = strcspn(s, ",/");
        double y;
        if (!read_number(s, n, f->model, &y))
            return false;
        sum += y;
        m++;
        if (s[n] != '/') {
            if (f->n_readings == READINGS_MAX || !isfinite(sum)) {
                sm_say("stillmark fit", f->n_readings == READINGS_MAX
                                            ? "--read: more than 1000 readings"
                                            : "--read: too large to be averaged");
                return false;
            }
            f->readings[f->n_readings++] = (struct sm_fit_reading){ .y = sum / m, .m = m };
            sum = 0;
            m = 0;
        }
        if (s[n] == '\0')
            return true;
        s += n + 1;
    }
}

/* ---- the file ---- */

/* The whole file, in storage the caller frees; NULL after saying why. */
static char *read_file(const char *path, size_t *ret_n)
{
    FILE *f = fopen(path, "rb");
    size_t n = 0, cap = 1 << 16;
    char *text = malloc(cap);
    const char *why = NULL;

    while (f != NULL && text != NULL && why == NULL) {
        const size_t got = fread(text + n, 1, cap - n, f);
        n += got;
        if (ferror(f) != 0)
            why = strerror(errno);
        else if (n > FILE_MAX)
            why = "larger than 64 MiB";
        else if (n < cap)
            break;
        else {
            char *more = realloc(text, cap *= 2);
            if (more == NULL)
                why = "no memory";
            else
                text = more;
        }
    }
    if (f == NULL)
        why = strerror(errno);
    else
        fclose(f);
    if (why == NULL && text == NULL)
        why = "no memory";
    if (why != NULL) {
        sm_say(path, "cannot be read: %s", why);
        free(text);
        return NULL;
    }
    *ret_n = n;
    return text;
}

static bool read_points(const char *path, const char *text, size_t n, struct fit *f)
{
    struct sm_csv_row row;
    char why[SM_REASON_SIZE] = "";
    enum sm_status status = sm_csv_begin(&f->csv, text, n, why);

    f->points = calloc(SM_FIT_POINTS_MAX, sizeof *f->points);
    if (f->points == NULL) {
        sm_say("stillmark fit", "no memory");
        return false;
    }
    while (status == SM_OK && (status = sm_csv_next(&f->csv, &row, why)) == SM_OK) {
        if (f->n_points == SM_FIT_POINTS_MAX) {
            sm_say(NULL, "%s:%u: more than %d points", path, f->csv.line, SM_FIT_POINTS_MAX);
            return false;
        }
        f->points[f->n_points++] = (struct sm_point){ row.x, row.y, f->t_c };
    }
    if (status == SM_ESHORT)
        return true;
    if (f->csv.line > 0)
        sm_say(NULL, "%s:%u: %s", path, f->csv.line, why);
    else
        sm_say(path, "%s", why);
    return false;
}

static bool fit_points(const char *path, struct fit *f)
{
    // the points are freed by sm_stillmark_fit: NOLINTNEXTLINE(clang-analyzer-unix.Malloc)
    const enum sm_status status =
        sm_curve_fit(f->model, f->points, f->n_points, ISOPOTENTIAL_PH, &f->curve);
    const size_t need = sm_model_coefficients(f->model) + 1;

    if (status == SM_ESHORT)
        sm_say(path, "%s needs at least %zu points at %zu different x; there are %zu at %zu",
               sm_model_name(f->model), need, need, f->n_points,
               sm_curve_levels(f->points, f->n_points));
    else if (status == SM_EVALUE)
        sm_say(path, "the numbers are too large or too far apart to be fitted");
    else if (status != SM_OK)
        sm_say(path, "cannot be fitted: %s", sm_status_text(status));
    if (status != SM_OK)
        return false;
    sm_curve_linearity(f->model, f->points, f->n_points, ISOPOTENTIAL_PH, &f->linearity);
    for (size_t i = 0; i < f->n_readings; i++) {
        struct sm_fit_reading *r = &f->readings[i];
        r->has = sm_curve_read(&f->curve, r->y, r->m, f->t_c, &r->read) == SM_OK;
    }
    return true;
}

static bool show(const struct fit *f, bool json)
{
    const struct sm_fit_view v = { f->csv.x_name, f->csv.y_name, &f->curve,   &f->linearity,
                                   f->points,     f->n_points,   f->readings, f->n_readings };
    const size_t cap = sm_fit_view_size(&v);
    char *buf = malloc(cap);
    struct sm_text t;
    bool good;

    if (buf == NULL) {
        sm_say("stillmark fit", "no memory");
        return false;
    }
    sm_text_init(&t, buf, cap);
    if (json)
        sm_fit_view_json(&v, &t);
    else
        sm_fit_view_text(&v, &t);
    good = !t.cut && fwrite(buf, 1, t.len, stdout) == t.len && fflush(stdout) == 0;
    if (!good)
        sm_say("stillmark fit", "cannot be written: %s", t.cut ? "too long" : strerror(errno));
    free(buf);
    return good;
}

int sm_stillmark_fit(int argc, char **argv)
{
    struct options o;
    struct fit f = { .n_points = 0 };
    char *text = NULL;
    size_t n;
    bool good;

    if (!understand(argc, argv, &o))
        return NOT_DONE;
    if (o.help)
        return fputs(HELP, stdout) >= 0 && fflush(stdout) == 0 ? DONE : NOT_DONE;
    if (o.file == NULL) {
        sm_say("stillmark fit", "a CSV file is needed; see stillmark fit --help");
        return NOT_DONE;
    }
    good = !not_built(&o) && choose_model(o.model, &f.model) &&
           choose_temperature(&o, f.model, &f.t_c) &&
           (o.read == NULL || read_readings(o.read, &f)) &&
           (text = read_file(o.file, &n)) != NULL && read_points(o.file, text, n, &f) &&
           fit_points(o.file, &f) && show(&f, o.json);
    free(text);
    free(f.points);
    free(f.readings);
    return good ? DONE : NOT_DONE;
}
