/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_log.c: bench logs run again, one after the other, and what differs. */
#include "replay_log.h"

#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "record/verify.h"
#include "view/rerun.h"
#include "whole_file.h"

#define MOST_TOLD 20
#define FILES_MAX 4096

struct options {
    const char *file[FILES_MAX];
    size_t n;
    const char *rules;
    struct sm_whole_file rules_text;
};

static void tell(void *arg, const char *line)
{
    (void)arg;
    printf("  %s\n", line);
}

static int usage(const char *what)
{
    fprintf(stderr, "stillmark-replay: %s; see stillmark-replay --help\n", what);
    return 2;
}

static int read_options(int argc, char **argv, struct options *o)
{
    for (int i = 0; i < argc; i++) {
        if (strcmp(argv[i], "--rules") == 0) {
            if (i + 1 == argc)
                return usage("--rules needs a method file");
            o->rules = argv[++i];
        } else if (argv[i][0] == '-') {
            return usage("no such option");
        } else if (o->n == FILES_MAX) {
            return usage("too many files at once");
        } else {
            o->file[o->n++] = argv[i];
        }
    }
    return o->n > 0 ? 0 : usage("which log is to be run again?");
}

static void say_how(const struct sm_rerun_told *t)
{
    if (t->other_core)
        printf("  made by core number %lld, run again by %d: differences are to be expected\n",
               (long long)t->core, SM_CORE_NUMBER);
    if (t->how == SM_COMPARE_TOLERANCE)
        printf("  this machine's arithmetic is another one: derived figures compared within 1e-9 "
               "relative, all else exactly\n");
    if (t->passed_over > 0)
        printf("  %zu entries or keys that this program does not know were passed over\n",
               t->passed_over);
}

/* What the file before left behind. */
struct before {
    struct sm_carried *last; /* NULL: none */
    int64_t ordinal;
    char meter[SM_METER_SIZE];
};

static void say_outcome(const struct sm_rerun_told *t, const struct sm_verify *v)
{
    say_how(t);
    if (v->after_bytes > 0)
        printf(
            "  %lld lines (%zu bytes) after the last stamp were never told to anybody and are not "
            "run again\n",
            (long long)v->after_lines, v->after_bytes);
    printf("  %zu inputs, %zu events: ", t->inputs, t->events);
    if (t->differences == 0)
        printf("the same events, %s%s\n",
               t->how == SM_COMPARE_BYTES ? "byte for byte" : "within tolerance",
               t->chained ? ", beginning with what the file before ended with" : "");
    else
        printf("%zu difference%s\n", t->differences, t->differences == 1 ? "" : "s");
}

/* Files of this meter that should lie between the two are not there: true, and said. */
static bool is_gap(const struct before *b, const struct sm_rerun_told *t)
{
    if (b->last == NULL || strcmp(b->meter, t->meter) != 0 || t->ordinal <= b->ordinal + 1)
        return false;
    if (t->ordinal == b->ordinal + 2)
        printf("  file %lld is missing before it\n", (long long)b->ordinal + 1);
    else
        printf("  files %lld to %lld are missing before it\n", (long long)b->ordinal + 1,
               (long long)t->ordinal - 1);
    return true;
}

static void prepare(const struct options *o, const struct sm_whole_file *f,
                    const struct sm_verify *v, const struct before *b, struct sm_rerun_ask *ask)
{
    memset(ask, 0, sizeof *ask);
    ask->text = f->text;
    ask->n = v->stamped_bytes;
    if (strcmp(b->meter, v->meter) == 0) {
        ask->before = b->last;
        ask->before_ordinal = b->ordinal;
    }
    ask->tell = tell;
    ask->most_told = MOST_TOLD;
    if (o->rules != NULL) {
        const char *slash = strrchr(o->rules, '/');

        ask->method_name = slash == NULL ? o->rules : slash + 1;
        ask->method_text = o->rules_text.text;
        ask->method_n = o->rules_text.n;
    }
}

/* One file. Returns 0 or 1 for the verdict, 2 when it could not be run; *b is replaced. */
static int one(const struct options *o, const char *path, struct before *b)
{
    struct sm_whole_file f;
    struct sm_verify v;
    struct sm_rerun_told told;
    struct sm_rerun_ask ask;
    const int err = sm_whole_file_open(path, &f);
    int exit_status = 0;

    if (err != 0) {
        fprintf(stderr, "stillmark-replay: %s: %s\n", path, strerror(-err));
        return 2;
    }
    sm_verify(f.text, f.n, NULL, &v);
    prepare(o, &f, &v, b, &ask);
    printf("%s\n", path);
    if (!v.good) {
        printf("  does not verify: %s; run again up to entry %lld\n", v.why,
               (long long)v.last_stamp_n);
        exit_status = 1;
    }
    if (sm_rerun(&ask, &told) != SM_OK) {
        fprintf(stderr, "stillmark-replay: %s: %s\n", path, told.why);
        exit_status = 2;
    } else {
        say_outcome(&told, &v);
        if (is_gap(b, &told) || told.differences > 0)
            exit_status = 1;
    }
    free(b->last);
    b->last = told.last;
    b->ordinal = told.ordinal;
    sm_text_copy(b->meter, sizeof b->meter, told.meter);
    sm_whole_file_close(&f);
    return exit_status;
}

int sm_replay_log(int argc, char **argv)
{
    struct options *o = calloc(1, sizeof *o);
    struct before before = { .last = NULL };
    int worst = 0, err;

    if (o == NULL)
        return 2;
    worst = read_options(argc, argv, o);
    if (worst == 0 && o->rules != NULL) {
        err = sm_whole_file_open(o->rules, &o->rules_text);
        if (err != 0) {
            fprintf(stderr, "stillmark-replay: %s: %s\n", o->rules, strerror(-err));
            worst = 2;
        }
    }
    for (size_t i = 0; worst != 2 && i < o->n; i++) {
        const int s = one(o, o->file[i], &before);

        worst = s > worst ? s : worst;
    }
    free(before.last);
    if (o->rules != NULL)
        sm_whole_file_close(&o->rules_text);
    free(o);
    return worst;
}
