/* SPDX-License-Identifier: GPL-3.0-or-later */
/* write.c: see write.h. */
#include "sim/write.h"

#include <inttypes.h>

#include "base/csv.h"
#include "base/number.h"

static enum sm_status written(FILE *f)
{
    return fflush(f) == 0 && !ferror(f) ? SM_OK : SM_EIO;
}

static void put_time(FILE *f, int64_t t_ns)
{
    fprintf(f, "%" PRId64 ".%06" PRId64, t_ns / 1000000000, t_ns % 1000000000 / 1000);
}

static void put_name(FILE *f, const char *name)
{
    char cell[2 * SM_NAME_SIZE + 4];
    struct sm_text t;

    sm_text_init(&t, cell, sizeof cell);
    sm_csv_cell(&t, name);
    fputs(cell, f);
}

static void put_number(FILE *f, double v)
{
    char s[SM_NUMBER_SIZE];

    sm_number_write(s, v);
    fputs(s, f);
}

static void put_stay(FILE *f, const struct sm_sim_stay *s)
{
    const bool in = s->kind == SM_SIM_STEP_IN, wet = in || s->kind == SM_SIM_STEP_RINSE;

    if (in)
        fprintf(f, "%u,", s->item);
    else
        fputc(',', f);
    put_name(f, s->name);
    fprintf(f, ",%s,", in ? sm_sim_role_name(s->role) : sm_sim_step_name(s->kind));
    put_time(f, s->begin_t_ns);
    fputc(',', f);
    put_time(f, s->end_t_ns);
    fputc(',', f);
    if (wet)
        put_number(f, s->value);
    fprintf(f, ",%s,", wet ? sm_unit_name(s->unit) : "");
    if (wet)
        put_number(f, s->celsius);
    fputc(',', f);
    if (wet)
        put_number(f, s->end);
    fputc(',', f);
    if (wet)
        put_number(f, s->settle_s);
    fputc(',', f);
    if (in)
        put_number(f, s->calm_s);
    fprintf(f, ",%s\n", !in ? "" : s->stayed_three ? "yes" : "no");
}

enum sm_status sm_sim_write_truth(const struct sm_scenario *sc, FILE *f)
{
    struct sm_sim_truth t;
    const enum sm_status status = sm_sim_truth_create(sc, &t);

    if (status != SM_OK)
        return status;
    fputs(
        "item,name,kind,begin_s,end_s,true_value,unit,temperature_c,true_end_mv,t_settle_s,calm_s,"
        "stayed_three\n",
        f);
    for (size_t i = 0; i < t.n; i++)
        put_stay(f, &t.stay[i]);
    sm_sim_truth_free(&t);
    return written(f);
}

enum sm_status sm_sim_write_csv(const struct sm_scenario *sc, FILE *f)
{
    struct sm_sim *sim;
    char text[SM_SIM_SHAPE_LINE];
    int64_t t_ns;
    bool word;
    const enum sm_status status = sm_sim_create(sc, &sim);

    if (status != SM_OK)
        return status;
    sm_sim_ask_itself(sim);
    fputs("time_s,value\n", f);
    while (sm_sim_reading(sim, &t_ns, text, &word)) {
        if (word)
            continue;
        put_time(f, t_ns);
        fprintf(f, ",%s\n", text);
    }
    sm_sim_destroy(sim);
    return written(f);
}

static void put_bytes(FILE *f, const char *bytes, size_t n)
{
    for (size_t i = 0; i < n; i++) {
        const unsigned char b = (unsigned char)bytes[i];
        if (b == '"' || b == '\\')
            fprintf(f, "\\%c", b);
        else if (b >= 0x20 && b < 0x7F)
            fputc(b, f);
        else
            fprintf(f, "\\u%04x", b);
    }
}

enum sm_status sm_sim_write_lines(const struct sm_scenario *sc, FILE *f)
{
    struct sm_sim *sim;
    char buf[4096];
    int64_t t_ns;
    size_t n;
    enum sm_sim_what what;
    const enum sm_status status = sm_sim_create(sc, &sim);

    if (status != SM_OK)
        return status;
    sm_sim_ask_itself(sim);
    while ((what = sm_sim_next(sim, &t_ns, buf, sizeof buf, &n)) != SM_SIM_END) {
        if (what == SM_SIM_BYTES) {
            fprintf(f, "%" PRId64 "\t", t_ns);
            put_bytes(f, buf, n);
            fputc('\n', f);
        } else if (what == SM_SIM_DOWN || what == SM_SIM_UP) {
            fprintf(f, "%" PRId64 "\t\t%s\n", t_ns, what == SM_SIM_DOWN ? "down" : "up");
        }
    }
    sm_sim_destroy(sim);
    return written(f);
}

void sm_sim_write_event_head(FILE *f)
{
    fputs("time_s,step,name\n", f);
}

void sm_sim_write_event(FILE *f, int64_t t_ns, const struct sm_sim_step *step)
{
    put_time(f, t_ns);
    fprintf(f, ",%s,", step ? sm_sim_step_name(step->kind) : "end");
    put_name(f, step ? step->name : "");
    fputc('\n', f);
}

enum sm_status sm_sim_write_events(const struct sm_scenario *sc, FILE *f)
{
    int64_t t_ns = 0;

    sm_sim_write_event_head(f);
    for (size_t i = 0; i < sc->n_steps; i++) {
        sm_sim_write_event(f, t_ns, &sc->step[i]);
        t_ns += sm_sim_step_span_ns(&sc->step[i]);
    }
    sm_sim_write_event(f, t_ns, NULL);
    return written(f);
}
