/* SPDX-License-Identifier: GPL-3.0-or-later */
/* check_setup.c: the setup from disk, and in plain words. */
#include "check_setup.h"

#include <stdlib.h>

#include "base/number.h"
#include "reading/parse.h"
#include "source_disk.h"

#define BLAMES_SHOWN 200
#define STEPS_LEAST 3 /* display steps in a tolerance: a rule of the bench, our judgement */

void sm_print_blames(const struct sm_blames *b, FILE *err)
{
    char line[4 * (SM_PATH_SIZE + SM_BLAME_SIZE)]; /* every byte escaped */

    for (size_t i = 0; i < b->n; i++) {
        sm_blame_write(&b->list[i], line, sizeof line);
        fprintf(err, "%s\n", line);
    }
    if (b->left_out > 0)
        fprintf(err, "… and %zu more\n", b->left_out);
}

int sm_read_setup(const char *file, struct sm_setup **ret_setup)
{
    struct sm_blame *list = calloc(BLAMES_SHOWN, sizeof *list);
    struct sm_disk *disk = calloc(1, sizeof *disk);
    struct sm_blames blames;
    struct sm_source source;
    enum sm_status st = SM_ENOMEM;

    if (list != NULL && disk != NULL) {
        sm_blames_init(&blames, list, BLAMES_SHOWN);
        sm_source_disk(disk, file, &source);
        st = sm_setup_load(&source, file, ret_setup, &blames);
        sm_print_blames(&blames, stderr);
    }
    if (st == SM_ENOMEM)
        fprintf(stderr, "no memory to read the setup\n");
    free(list);
    free(disk);
    return st == SM_OK ? 0 : 2;
}

/* ---- in plain words ---- */

static void add_seconds(struct sm_text *t, int64_t ns)
{
    char number[SM_NUMBER_SIZE];

    sm_number_write(number, (double)ns / 1e9);
    sm_text_addf(t, "%s s", number);
}

static void add_port(struct sm_text *t, const struct sm_port_setup *p)
{
    static const char parity[] = { 'N', 'E', 'O', 'M', 'S' };
    static const char *const flow[] = { "no flow control", "RTS/CTS", "XON/XOFF" };

    sm_text_addf(t, "%s at %u %u%c%u, %s", p->port, p->baud, p->bits, parity[p->parity], p->stop,
                 flow[p->flow]);
}

static void add_channels(struct sm_text *t, const struct sm_profile *p)
{
    for (size_t i = 0; i < p->n_channels; i++) {
        const char *unit = sm_unit_name(p->channel[i].unit);
        sm_text_addf(t, "%s%s%s%s%s", i > 0 ? ", " : "", p->channel[i].name,
                     unit[0] != '\0' ? " in " : "", unit, p->channel[i].raw ? " (raw)" : "");
    }
}

static void add_profile(struct sm_text *t, const struct sm_profile *p)
{
    sm_text_addf(t, "; profile %s reads ", p->name);
    add_channels(t, p);
    if (p->ask.n == 0) {
        sm_text_add(t, " as the meter sends it");
    } else {
        sm_text_add(t, ", asking every ");
        add_seconds(t, p->ask.every_ns);
    }
}

static void add_method(struct sm_text *t, const struct sm_method *m)
{
    char tolerance[SM_NUMBER_SIZE];
    const struct sm_quantity q = m->tolerance_written[SM_CLASS_SAMPLE];

    sm_number_write(tolerance, q.value);
    sm_text_addf(t, "; method %s: %s by %s, settled by rule %s within %s %s for samples, dwell ",
                 m->name, sm_unit_name(m->measures), sm_model_name(m->model),
                 sm_rule_name(m->rule.kind), tolerance, sm_unit_name(q.unit));
    add_seconds(t, m->rule.dwell_ns);
}

void sm_describe_meter(const struct sm_setup *s, size_t meter, struct sm_text *t)
{
    const struct sm_meter_setup *m = &s->meter[meter];
    char line[4096];
    struct sm_text raw;

    sm_text_init(&raw, line, sizeof line);
    sm_text_addf(&raw, "%s: ", m->core.meter);
    add_port(&raw, &m->port);
    add_profile(&raw, m->core.profile);
    add_method(&raw, &s->method[m->core.own_method]);
    sm_text_addf(&raw, "; sensor %s; %zu standards, %zu methods", m->core.sensor, s->standards.n,
                 s->n_methods);
    sm_text_add_safe(t, line, raw.len);
}

/* The display step of a channel in the profile's example; 0: unknown. */
static double example_step(const struct sm_profile *p, int channel)
{
    struct sm_parser *parser = NULL;
    char why[SM_REASON_SIZE];
    struct sm_reading r;
    double step = 0;
    bool mark;

    if (channel < 0 || sm_parser_create(p, &parser, why) != SM_OK)
        return 0;
    if (sm_parser_read(parser, 0, p->example.line, p->example.n, &r, &mark, why) == SM_OK &&
        r.channel[channel].present)
        step = r.channel[channel].step;
    sm_parser_destroy(parser);
    return step;
}

void sm_warn_meter(const struct sm_setup *s, size_t meter, struct sm_text *t)
{
    static const char *const classes[] = { "standards", "checks", "samples" };
    const struct sm_core_setup *c = &s->meter[meter].core;
    const struct sm_method *m = &s->method[c->own_method];
    const double step = example_step(c->profile, sm_profile_channel(c->profile, m->signal));

    for (int i = 0; i < SM_CLASS_COUNT; i++) {
        const char *unit = sm_unit_name(m->signal_unit);

        if (!(m->rule.tolerance[i] < STEPS_LEAST * step))
            continue;
        sm_text_addf(
            t,
            "%s: warning: the tolerance for %s is %.3g %s, less than three display steps of "
            "%.3g %s: hardly anything will settle\n",
            c->meter, classes[i], m->rule.tolerance[i], unit, step, unit);
    }
}

int sm_check_setup(const char *file)
{
    struct sm_setup *s = NULL;
    const int status = sm_read_setup(file, &s);

    if (status != 0)
        return status;
    for (size_t i = 0; i < s->n_meters; i++) {
        char line[8192];
        struct sm_text t;

        sm_text_init(&t, line, sizeof line);
        sm_describe_meter(s, i, &t);
        printf("%s\n", line);
        sm_text_init(&t, line, sizeof line);
        sm_warn_meter(s, i, &t);
        fputs(line, stdout);
    }
    sm_setup_destroy(s);
    if (fflush(stdout) != 0 || ferror(stdout)) {
        fprintf(stderr, "standard output cannot be written\n");
        return 2;
    }
    return 0;
}
