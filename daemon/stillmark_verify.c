/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_verify.c: does a log still say what was signed, file by file and across files? */
#include "stillmark_verify.h"

#include <inttypes.h>
#include <jansson.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "log_list.h"

#define DONE 0
#define ANSWER_NO 1
#define NOT_DONE 2

static const char HELP[] =
    "stillmark verify LOG… [--key FILE] [--json]\n"
    "\n"
    "Says whether bench logs (files, or folders of them) are unchanged since they were stamped "
    "and\n"
    "signed: every hash, every signature, and that files of one meter follow one another without "
    "a\n"
    "gap. Names the first group of entries that does not verify and the first line in it that\n"
    "cannot be read. An end that was torn off after the last stamp is said and is no failure.\n"
    "--key FILE  the signer's public key (64 hex digits, as in STATE/key.pub): then the signature\n"
    "            must be by this key; without it the signer is shown and not compared\n"
    "--json      one JSON object instead of sentences\n"
    "Exit status: 0 all verifies; 1 something does not; 2 could not be done.\n";

struct options {
    bool json;
    const char *key_file;
    char key[SM_KEY_HEX];
};

static int not_done(const char *what)
{
    char safe[1024];
    struct sm_text t;

    sm_text_init(&t, safe, sizeof safe);
    sm_text_add_safe(&t, what, strlen(what));
    fprintf(stderr, "stillmark verify: %s\n", safe);
    return NOT_DONE;
}

/* A path is somebody else's text. */
static const char *safe_path(const char *path, char out[1024])
{
    struct sm_text t;

    sm_text_init(&t, out, 1024);
    sm_text_add_safe(&t, path, strlen(path));
    return out;
}

static bool read_key(struct options *o)
{
    struct sm_whole_file f;
    size_t n;
    bool ok;

    if (sm_whole_file_open(o->key_file, &f) != 0)
        return false;
    n = f.n;
    while (n > 0 && (f.text[n - 1] == '\n' || f.text[n - 1] == '\r' || f.text[n - 1] == ' '))
        n--;
    ok = n == SM_KEY_HEX - 1;
    for (size_t i = 0; i < n && ok; i++)
        ok = (f.text[i] >= '0' && f.text[i] <= '9') || (f.text[i] >= 'a' && f.text[i] <= 'f');
    if (ok)
        memcpy(o->key, f.text, n); /* the rest is zero already */
    sm_whole_file_close(&f);
    return ok;
}

/* 0, or the exit status to end with; ret_shown: --help was asked for. */
static int read_options(int argc, char **argv, struct options *o, struct sm_log_list *l,
                        bool *ret_shown)
{
    bool words = true;

    for (int i = 0; i < argc; i++) {
        if (words && strcmp(argv[i], "--help") == 0) {
            fputs(HELP, stdout);
            *ret_shown = true;
            return DONE;
        } else if (words && strcmp(argv[i], "--") == 0) {
            words = false;
        } else if (words && strcmp(argv[i], "--json") == 0) {
            o->json = true;
        } else if (words && strcmp(argv[i], "--key") == 0) {
            if (i + 1 == argc)
                return not_done("--key needs a file");
            o->key_file = argv[++i];
        } else if (words && argv[i][0] == '-') {
            return not_done("no such option; see stillmark verify --help");
        } else if (sm_log_list_add(l, argv[i]) != SM_OK) {
            return not_done(l->why);
        }
    }
    if (l->n == 0)
        return not_done("which log is to be verified? see stillmark verify --help");
    if (o->key_file != NULL && !read_key(o))
        return not_done("--key: expected a file with a public key, 64 lower-case hex digits");
    return DONE;
}

/* With a key to compare, a log without a signature cannot be compared. */
static bool is_good(const struct options *o, const struct sm_verify *v)
{
    return v->good && !(o->key_file != NULL && v->stamps > 0 && v->signed_stamps == 0);
}

/* ---- in words ---- */

static void say_good(const struct options *o, const struct sm_verify *v)
{
    char print[17] = "";

    if (v->stamps == 0) {
        printf("  holds no stamp: nothing in it was ever told to anybody\n");
        return;
    }
    printf("  entries %" PRId64 " to %" PRId64 ", %" PRId64 " stamps: ", v->first_n,
           v->last_stamp_n, v->stamps);
    if (v->signed_stamps == 0 || sm_key_fingerprint(v->key, print) != SM_OK) {
        printf("unchanged since stamped; nothing in it is signed\n");
        return;
    }
    printf("unchanged since signed by key %s (%s)", print,
           o->key_file != NULL ? "the key given" : "not compared: see --key");
    if (v->last_signed_n != v->last_stamp_n)
        printf(", signed up to entry %" PRId64, v->last_signed_n);
    printf("\n");
}

static void say_bad(const struct sm_verify *v)
{
    if (v->good) {
        printf("  does not verify: no stamp in it is signed, so the key cannot be compared\n");
        return;
    }
    printf("  does not verify: entries %" PRId64 " to %" PRId64 ": %s", v->bad_from, v->bad_to,
           v->why);
    if (v->bad_line > 0)
        printf("; line %" PRId64 " is the first that cannot be read or is out of number",
               v->bad_line);
    printf("\n");
    if (v->stamps > 0)
        printf("  unchanged before it: entries %" PRId64 " to %" PRId64 "\n", v->first_n,
               v->last_stamp_n);
}

static void say_file(const struct options *o, const struct sm_log_file *f)
{
    const struct sm_verify *v = &f->verify;
    char path[1024];

    printf("%s\n", safe_path(f->path, path));
    if (!is_good(o, v)) {
        say_bad(v);
        return;
    }
    say_good(o, v);
    if (v->after_bytes > 0)
        printf("  after its last stamp: %" PRId64
               " line%s, %zu bytes: a torn end, never told to anybody\n",
               v->after_lines, v->after_lines == 1 ? "" : "s", v->after_bytes);
    else if (!v->closed && v->stamps > 0)
        printf("  not closed: still being written, or ended by a crash\n");
}

/* ---- as JSON ---- */

static void set(json_t *o, const char *key, json_t *v)
{
    if (json_object_set_new(o, key, v) != 0)
        abort(); /* no memory for a few words */
}

static json_t *file_object(const struct options *o, const struct sm_log_file *f)
{
    const struct sm_verify *v = &f->verify;
    json_t *j = json_object();
    char print[17], path[1024];

    set(j, "file", json_string(safe_path(f->path, path)));
    set(j, "meter", json_string(v->meter));
    set(j, "ordinal", json_integer(v->ordinal));
    set(j, "good", json_boolean(is_good(o, v)));
    set(j, "stamps", json_integer(v->stamps));
    set(j, "signed_stamps", json_integer(v->signed_stamps));
    set(j, "first", json_integer(v->first_n));
    set(j, "last_stamp", json_integer(v->last_stamp_n));
    set(j, "last_signed", json_integer(v->last_signed_n));
    set(j, "hash", json_string(v->last_stamp));
    if (sm_key_fingerprint(v->key, print) == SM_OK)
        set(j, "key", json_string(print));
    set(j, "compared", json_boolean(o->key_file != NULL));
    set(j, "closed", json_boolean(v->closed));
    set(j, "after_lines", json_integer(v->after_lines));
    set(j, "after_bytes", json_integer((json_int_t)v->after_bytes));
    if (!v->good) {
        set(j, "bad_from", json_integer(v->bad_from));
        set(j, "bad_to", json_integer(v->bad_to));
        if (v->bad_line > 0)
            set(j, "bad_line", json_integer(v->bad_line));
        set(j, "why", json_string(v->why));
    } else if (!is_good(o, v)) {
        set(j, "why", json_string("no stamp in it is signed, so the key cannot be compared"));
    }
    return j;
}

/* ---- across files ---- */

struct outcome {
    bool good;
    json_t *files, *chain; /* with --json */
};

static void say_chain(const struct options *o, struct outcome *out,
                      const struct sm_log_file *before, const struct sm_log_file *after)
{
    char why[SM_REASON_SIZE], print_a[17], print_b[17];

    if (strcmp(before->verify.meter, after->verify.meter) != 0)
        return; /* another meter's log begins */
    if (sm_verify_chain(&before->verify, &after->verify, why) != SM_OK) {
        out->good = false;
        if (o->json)
            json_array_append_new(out->chain, json_string(why));
        else
            printf("  the chain is broken: %s\n", why);
    }
    if (!o->json && strcmp(before->verify.key, after->verify.key) != 0 &&
        sm_key_fingerprint(before->verify.key, print_a) == SM_OK &&
        sm_key_fingerprint(after->verify.key, print_b) == SM_OK)
        printf("  from here on signed by another key: %s, before %s\n", print_b, print_a);
}

static bool same_meter(const struct sm_log_list *l, size_t a, size_t b)
{
    return a < l->n && b < l->n && strcmp(l->file[a].verify.meter, l->file[b].verify.meter) == 0;
}

/* What is not seen by looking at two files: nobody can tell from here whether files were taken away
 * at either end, but for a stamp that was written down. */
static void say_ends(const struct options *o, const struct sm_log_list *l, size_t i)
{
    const struct sm_verify *v = &l->file[i].verify;

    if (l->n > 1 && v->ordinal > 1 && (i == 0 || !same_meter(l, i - 1, i)))
        printf("  files before number %" PRId64 " are not here\n", v->ordinal);
    if (is_good(o, v) && v->stamps > 0 && !same_meter(l, i, i + 1))
        printf("  its last stamp, for the paper log: entry %" PRId64 ", %s\n", v->last_stamp_n,
               v->last_stamp);
}

static int say_all(const struct options *o, const struct sm_log_list *l)
{
    struct outcome out = { true, json_array(), json_array() };
    json_t *whole = json_object();

    for (size_t i = 0; i < l->n; i++) {
        out.good = out.good && is_good(o, &l->file[i].verify);
        if (o->json)
            json_array_append_new(out.files, file_object(o, &l->file[i]));
        else
            say_file(o, &l->file[i]);
        if (i > 0)
            say_chain(o, &out, &l->file[i - 1], &l->file[i]);
        if (!o->json)
            say_ends(o, l, i);
    }
    set(whole, "good", json_boolean(out.good));
    set(whole, "files", out.files);
    set(whole, "chain", out.chain);
    if (o->json) {
        json_dumpf(whole, stdout, JSON_COMPACT);
        printf("\n");
    } else if (l->n > 1) {
        printf("%zu files: %s\n", l->n, out.good ? "all verify" : "something does not verify");
    }
    json_decref(whole);
    return out.good ? DONE : ANSWER_NO;
}

int sm_stillmark_verify(int argc, char **argv)
{
    struct options o = { 0 };
    struct sm_log_list l;
    bool shown = false;
    int ended;

    sm_log_list_init(&l);
    ended = read_options(argc, argv, &o, &l, &shown);
    if (ended == DONE && !shown) {
        if (sm_log_list_verify(&l, o.key_file != NULL ? o.key : NULL) != SM_OK)
            ended = not_done(l.why);
        else
            ended = say_all(&o, &l);
    }
    sm_log_list_finish(&l);
    if (fflush(stdout) != 0)
        ended = not_done("standard output cannot be written");
    return ended;
}
