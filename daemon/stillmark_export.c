/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_export.c: one table out of bench logs, to standard output. */
#include "stillmark_export.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/number.h"
#include "log_list.h"
#include "view/table.h"

#define DONE 0
#define ANSWER_NO 1
#define NOT_DONE 2

static const char HELP[] =
    "stillmark export LOG… [--run N] [--readings|--captures|--curve|--results]\n"
    "\n"
    "Writes one table as CSV (RFC 4180) to standard output: the results (default), the captures,\n"
    "the points of the curves, or the readings of bench logs (files, or folders of them). Units\n"
    "stand in the header row or in a column of their own. A result has the state that it has now:\n"
    "files of the same folder that are later than those given are read for it, and named on\n"
    "standard error. What follows a file's last stamp was never told to anybody and is left out.\n"
    "--run N  only what belongs to this run\n"
    "For information. Must not control a dosing pump.\n"
    "Exit status: 0 written; 1 a log does not verify; 2 could not be done.\n";

struct options {
    struct sm_export_ask ask;
    bool chosen, shown;
};

/* One line, "about: what"; about "" is left out. */
static void say(const char *about, const char *what)
{
    char safe[2048];
    struct sm_text t;

    sm_text_init(&t, safe, sizeof safe);
    sm_text_add_safe(&t, about, strlen(about));
    sm_text_add(&t, about[0] != '\0' ? ": " : "");
    sm_text_add_safe(&t, what, strlen(what));
    fprintf(stderr, "stillmark export: %s\n", safe);
}

static int not_done(const char *about, const char *what)
{
    say(about, what);
    return NOT_DONE;
}

static bool take_kind(struct options *o, const char *word)
{
    static const struct {
        const char *word;
        enum sm_export_kind kind;
    } kinds[] = { { "--results", SM_EXPORT_RESULTS },
                  { "--captures", SM_EXPORT_CAPTURES },
                  { "--curve", SM_EXPORT_CURVE },
                  { "--readings", SM_EXPORT_READINGS } };

    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++)
        if (strcmp(word, kinds[i].word) == 0) {
            o->ask.kind = kinds[i].kind;
            return true;
        }
    return false;
}

static int read_options(int argc, char **argv, struct options *o, struct sm_log_list *l)
{
    bool words = true;

    for (int i = 0; i < argc; i++) {
        const char *w = argv[i];

        if (words && strcmp(w, "--help") == 0) {
            fputs(HELP, stdout);
            o->shown = true;
            return DONE;
        } else if (words && strcmp(w, "--") == 0) {
            words = false;
        } else if (words && strcmp(w, "--run") == 0) {
            if (i + 1 == argc ||
                sm_integer_parse(argv[i + 1], strlen(argv[i + 1]), &o->ask.run) != SM_OK ||
                o->ask.run < 1)
                return not_done("", "--run needs a run's number");
            o->ask.has_run = true;
            i++;
        } else if (words && take_kind(o, w)) {
            if (o->chosen)
                return not_done("", "one table at a time, please");
            o->chosen = true;
        } else if (words && w[0] == '-') {
            return not_done(w, "no such option; see stillmark export --help");
        } else if (sm_log_list_add(l, w) != SM_OK) {
            return not_done("", l->why);
        }
    }
    return l->n > 0 ? DONE : not_done("", "which log? see stillmark export --help");
}

static void write_out(void *arg, const char *bytes, size_t n)
{
    (void)arg;
    (void)!fwrite(bytes, 1, n, stdout); /* looked at when all is flushed */
}

/* Part of the file that is exported: up to its last stamp. A log that was never stamped at all
 * (a recorded session) is taken as it is, and that is said. */
static size_t stamped(const struct sm_log_file *f, size_t n)
{
    char what[160];

    if (f->verify.stamps == 0) {
        if (n > 0)
            say(f->path, "holds no stamp; exported as it is");
        return n;
    }
    if (f->verify.after_bytes > 0) {
        snprintf(what, sizeof what,
                 "%lld lines (%zu bytes) after the last stamp were never told to anybody and are "
                 "left out",
                 (long long)f->verify.after_lines, f->verify.after_bytes);
        say(f->path, what);
    }
    return f->verify.stamped_bytes;
}

static int add_file(struct sm_export *t, const struct sm_log_file *f, bool later)
{
    struct sm_whole_file whole;
    char why[SM_LINK_TEXT_SIZE] = "";
    int err;
    enum sm_status st;

    if (!f->verify.good) {
        say(f->path, f->verify.why);
        say(f->path, "does not verify: see stillmark verify; nothing of it is exported");
        return ANSWER_NO;
    }
    err = sm_whole_file_open(f->path, &whole);
    if (err != 0)
        return not_done(f->path, strerror(-err));
    if (whole.n < f->verify.stamped_bytes) {
        sm_whole_file_close(&whole);
        return not_done(f->path, "became shorter while it was read");
    }
    if (later)
        say(f->path, "read for later holds and releases");
    st = sm_export_add(t, whole.text, stamped(f, whole.n), later, why);
    sm_whole_file_close(&whole);
    return st == SM_OK ? DONE : not_done(f->path, why);
}

/* Sorting moves files about, and later ones were added: a path stays where it is. */
static bool was_asked(const struct sm_log_file *f, char *const *asked, size_t n)
{
    for (size_t i = 0; i < n; i++)
        if (f->path == asked[i])
            return true;
    return false;
}

static int write_table(struct options *o, struct sm_log_list *l)
{
    const size_t n = l->n;
    char **asked = calloc(n, sizeof *asked); /* the paths given: sorting moves them about */
    struct sm_export *t = NULL;
    int ended = DONE;

    for (size_t i = 0; i < n && asked != NULL; i++)
        asked[i] = l->file[i].path;
    o->ask.write = write_out;
    if (asked == NULL || sm_export_create(&o->ask, &t) != SM_OK)
        ended = not_done("", "no memory");
    else if ((o->ask.kind == SM_EXPORT_RESULTS && sm_log_list_add_later(l) != SM_OK) ||
             sm_log_list_verify(l, NULL) != SM_OK)
        ended = not_done("", l->why);
    for (size_t i = 0; i < l->n && ended == DONE; i++)
        ended = add_file(t, &l->file[i], !was_asked(&l->file[i], asked, n));
    if (ended == DONE)
        sm_export_end(t);
    sm_export_destroy(t);
    free(asked);
    return ended;
}

int sm_stillmark_export(int argc, char **argv)
{
    struct options o = { .ask.kind = SM_EXPORT_RESULTS };
    struct sm_log_list l;
    int ended;

    sm_log_list_init(&l);
    ended = read_options(argc, argv, &o, &l);
    if (ended == DONE && !o.shown)
        ended = write_table(&o, &l);
    sm_log_list_finish(&l);
    if ((fflush(stdout) != 0 || ferror(stdout)) && ended == DONE)
        ended = not_done("", "standard output cannot be written");
    return ended;
}
