/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rerun.c: a file of a bench log run again and compared, input by input. */
#include "view/rerun.h"

#include <stdlib.h>
#include <string.h>

#include "record/arithmetic.h"
#include "record/head.h"
#include "setup/logged.h"

#define BLAMES 16

struct run {
    const struct sm_rerun_ask *ask;
    struct sm_rerun_told *told;
    size_t at;    /* next byte of the text */
    int64_t line; /* number of the line given last */
    struct sm_entry_store store;
    struct sm_entry *entry;
    struct sm_logged logged;
    struct sm_setup *setup;
    struct sm_sheet *sheet;           /* as parsed last */
    bool has_other_method;            /* the method to be replaced is in the log */
    bool has_sheet;                   /* a sheet was in force at the file's head */
    const struct sm_core_setup *mine; /* the meter's */
    struct sm_core *core;
    struct sm_carried *carried; /* of the `open`, then the newest */
    char *made;                 /* [SM_ENTRY_MAX] an entry made now */
    struct sm_blame blame[BLAMES];
    size_t told_n;
    int64_t later; /* by so much numbers are later than logged */
};

/* The next whole line, without its newline; false: none. Does not go past it. */
static bool peek(const struct run *r, const char **ret_line, size_t *ret_n)
{
    const char *from = r->ask->text + r->at, *end;

    if (r->at >= r->ask->n)
        return false;
    end = memchr(from, '\n', r->ask->n - r->at);
    if (end == NULL)
        return false;
    *ret_line = from;
    *ret_n = (size_t)(end - from);
    return true;
}

static void pass(struct run *r, size_t n)
{
    r->at += n + 1;
    r->line++;
}

static void differ(struct run *r, const char *what, int64_t n)
{
    char line[SM_LINK_TEXT_SIZE + 160];
    struct sm_text t;

    r->told->differences++;
    if (r->told_n >= r->ask->most_told || r->ask->tell == NULL)
        return;
    r->told_n++;
    sm_text_init(&t, line, sizeof line);
    sm_text_addf(&t, "entry %lld: ", (long long)n);
    sm_text_add_safe(&t, what, strlen(what));
    r->ask->tell(r->ask->arg, line);
}

static enum sm_status fail(struct run *r, const char *why)
{
    struct sm_text t;

    sm_text_init(&t, r->told->why, sizeof r->told->why);
    if (r->line > 0)
        sm_text_addf(&t, "line %lld: ", (long long)r->line);
    sm_text_add_safe(&t, why, strlen(why));
    return SM_ESYNTAX;
}

static const char *string_of(const json_t *o, const char *key)
{
    const char *s = json_string_value(json_object_get(o, key));

    return s == NULL ? "" : s;
}

static void write_carried(const struct sm_carried *c, char *out, size_t *ret_n)
{
    struct sm_text t;

    sm_text_init(&t, out, SM_ENTRY_MAX);
    sm_carried_write(&t, c);
    *ret_n = t.len;
}

/* Does the file begin from `want`? room: [SM_ENTRY_MAX] */
static bool begins_from(struct run *r, const struct sm_carried *want, char *room,
                        char ret_why[SM_REASON_SIZE])
{
    size_t n, n_made;

    write_carried(want, room, &n);
    write_carried(r->carried, r->made, &n_made);
    return sm_replay_agree(r->told->how, room, n, r->made, n_made, ret_why);
}

/* Does this file begin with what the one before ended with? Where its `open` says that something is
 * missing, the run or all may have been put aside: the setup had changed. */
static enum sm_status check_before(struct run *r, const json_t *open)
{
    const bool said = string_of(open, "missed")[0] != '\0';
    struct sm_carried *want;
    char why[SM_REASON_SIZE], unused[SM_REASON_SIZE];
    char *room;

    if (r->ask->before == NULL || r->ask->before_ordinal == INT64_MAX ||
        r->told->ordinal != r->ask->before_ordinal + 1)
        return SM_OK;
    want = malloc(sizeof *want);
    room = malloc(SM_ENTRY_MAX);
    if (want == NULL || room == NULL) {
        free(want);
        free(room);
        return SM_ENOMEM;
    }
    *want = *r->ask->before;
    if (strcmp(string_of(open, "how"), "rollover") != 0) {
        const json_int_t aged = json_integer_value(json_object_get(open, "aged"));

        sm_carried_interrupt(want);
        sm_carried_age(want, aged > 0 ? (int64_t)aged : 0);
    }
    r->told->chained = true;
    if (!begins_from(r, want, room, why)) {
        memset(&want->run, 0, sizeof want->run);
        if (!said || !begins_from(r, want, room, unused)) {
            sm_carried_init(want);
            if (!said || !begins_from(r, want, room, unused))
                differ(r, why, r->entry->n);
        }
    }
    free(want);
    free(room);
    return SM_OK;
}

static enum sm_status on_open(struct run *r)
{
    const json_t *o = r->entry->json;
    char here[17], why[SM_REASON_SIZE];
    unsigned passed_over = 0;

    sm_arithmetic(here);
    r->told->how =
        strcmp(here, string_of(o, "arithmetic")) == 0 ? SM_COMPARE_BYTES : SM_COMPARE_TOLERANCE;
    r->told->core = (int64_t)json_integer_value(json_object_get(o, "core"));
    r->told->other_core = r->told->core != SM_CORE_NUMBER;
    r->told->ordinal = (int64_t)json_integer_value(json_object_get(o, "ordinal"));
    sm_text_copy(r->told->meter, sizeof r->told->meter, string_of(o, "meter"));
    if (sm_carried_read(json_object_get(o, "carried"), r->carried, &passed_over, why) != SM_OK)
        return fail(r, why);
    r->told->passed_over += passed_over;
    return check_before(r, o);
}

/* Is this logged file the one that the caller wants to replace? */
static bool replaced(const struct run *r, const char *name)
{
    const char *slash = strrchr(name, '/');

    return r->ask->method_name != NULL && strstr(name, "methods/") != NULL &&
           strcmp(slash == NULL ? name : slash + 1, r->ask->method_name) == 0;
}

static enum sm_status on_file(struct run *r)
{
    const json_t *o = r->entry->json, *text = json_object_get(o, "text");
    const char *name = string_of(o, "name");
    enum sm_status s;

    if (!json_is_string(text))
        return fail(r, "a `file` entry without text");
    if (json_is_true(json_object_get(o, "sheet"))) {
        r->has_sheet = true; /* parsed when the setup is known; it is the last of the files */
        return sm_logged_add(&r->logged, "\tsheet", json_string_value(text),
                             json_string_length(text)) == SM_OK &&
                       sm_logged_add(&r->logged, "\tname", name, strlen(name)) == SM_OK
                   ? SM_OK
                   : fail(r, "too many setup files");
    }
    r->has_other_method = r->has_other_method || replaced(r, name);
    s = replaced(r, name)
            ? sm_logged_add(&r->logged, name, r->ask->method_text, r->ask->method_n)
            : sm_logged_add(&r->logged, name, json_string_value(text), json_string_length(text));
    return s == SM_OK ? SM_OK : fail(r, "too many setup files, or one too large");
}

static enum sm_status fail_blamed(struct run *r, const struct sm_blames *b)
{
    char line[SM_BLAME_SIZE + SM_PATH_SIZE + 32];

    if (b->n == 0)
        return fail(r, "the setup in the log cannot be read");
    sm_blame_write(&b->list[0], line, sizeof line);
    return fail(r, line);
}

static enum sm_status parse_sheet(struct run *r, const char *name, const char *text, size_t n,
                                  char ret_why[SM_LINK_TEXT_SIZE])
{
    struct sm_blames b;
    enum sm_status s;

    sm_blames_init(&b, r->blame, BLAMES);
    s = sm_sheet_load(r->setup, name, text, n, r->sheet, &b);
    if (s != SM_OK && b.n > 0)
        sm_blame_write(&b.list[0], ret_why, SM_LINK_TEXT_SIZE);
    return s;
}

/* The head of the file is read: setup, sheet, core. */
static enum sm_status start(struct run *r)
{
    struct sm_source source;
    struct sm_blames b;
    const struct sm_core_setup *mine = NULL;
    char why[SM_LINK_TEXT_SIZE] = "", reason[SM_REASON_SIZE];

    if (r->logged.n == 0)
        return fail(r, "the log carries no setup");
    if (r->ask->method_name != NULL && !r->has_other_method)
        return fail(r, "the log carries no method file of that name: what would it replace?");
    sm_blames_init(&b, r->blame, BLAMES);
    sm_logged_source(&r->logged, &source);
    if (sm_setup_load(&source, r->logged.file[0].name, &r->setup, &b) != SM_OK)
        return fail_blamed(r, &b);
    for (size_t i = 0; i < r->setup->n_meters; i++) {
        if (strcmp(r->setup->meter[i].core.meter, r->told->meter) == 0)
            mine = &r->setup->meter[i].core;
    }
    r->mine = mine;
    if (mine == NULL)
        return fail(r, "the setup in the log does not know the meter");
    if (r->has_sheet) {
        const char *text = NULL, *name = "";
        size_t n = 0;

        for (size_t i = 0; i < r->logged.n; i++) {
            if (strcmp(r->logged.file[i].name, "\tsheet") == 0) {
                text = r->logged.file[i].text;
                n = r->logged.file[i].n;
            } else if (strcmp(r->logged.file[i].name, "\tname") == 0) {
                name = r->logged.file[i].text;
            }
        }
        if (parse_sheet(r, name, text, n, why) != SM_OK)
            return fail(r, why);
    }
    if (sm_core_start(mine, r->carried, r->has_sheet ? r->sheet : NULL, &r->core, reason) != SM_OK)
        return fail(r, reason);
    return SM_OK;
}

/* One event that came out now against the next logged line. */
static void compare(struct run *r, const struct sm_event *e)
{
    struct sm_text t;
    const char *line = "";
    size_t n = 0;
    char why[SM_REASON_SIZE];
    const bool have = peek(r, &line, &n);
    struct sm_entry_store unused;

    r->told->events++;
    sm_text_init(&t, r->made, SM_ENTRY_MAX);
    sm_entry_event(&t, e);
    if (have && n + 1 == t.len && memcmp(line, t.buf, n) == 0) {
        pass(r, n);
        return;
    }
    if (have && r->told->how == SM_COMPARE_TOLERANCE &&
        sm_replay_agree(r->told->how, line, n, t.buf, t.len - 1, why)) {
        pass(r, n);
        return;
    }
    sm_entry_store_init(&unused);
    if (have && sm_entry_read(line, n, &unused, r->entry, why) == SM_OK) {
        const bool event = r->entry->kind == SM_ENTRY_EVENT;
        const int64_t logged_n = r->entry->n;

        json_decref(r->entry->json);
        r->entry->json = NULL;
        if (event) {
            if (sm_replay_agree(r->told->how, line, n, t.buf, t.len - 1, why))
                sm_text_copy(why, sizeof why, "the same values, written differently");
            differ(r, why, logged_n);
            pass(r, n);
            sm_entry_store_finish(&unused);
            return;
        }
    }
    sm_entry_store_finish(&unused);
    sm_text_init(&t, why, sizeof why);
    sm_text_addf(&t, "an event comes out now that the log does not have: %s",
                 sm_event_kind_name(e->kind));
    differ(r, why, e->n);
}

/* A sheet as it was handed over. What it was refused for then is what the log says. */
static void read_sheet(struct run *r, struct sm_act *act)
{
    if (act->sheet_why[0] == '\0' && parse_sheet(r, act->sheet_file, act->sheet_text,
                                                 act->sheet_text_n, act->sheet_why) == SM_OK)
        act->sheet = r->sheet;
}

/* Where more events came out than then, their numbers are taken: from here on all are later. What
 * an act had seen is moved along. */
static void renumber(struct run *r, struct sm_input *in)
{
    int64_t past;

    if (in->n > SM_N_MOST) /* the core refuses it */
        return;
    past = sm_core_last_n(r->core) + 1 - (in->n + r->later);
    if (past > 0)
        r->later += past;
    in->n += r->later;
    if (in->kind == SM_INPUT_ACT && in->act.seen <= SM_N_MOST)
        in->act.seen += r->later;
}

static enum sm_status on_input(struct run *r)
{
    struct sm_input *in = &r->entry->input;
    const struct sm_event *e;

    r->told->inputs++;
    if (in->kind == SM_INPUT_ACT && in->act.act == SM_ACT_SHEET && in->act.sheet_text != NULL)
        read_sheet(r, &in->act);
    r->told->rolled = in->kind == SM_INPUT_ROLL;
    json_decref(r->entry->json);
    r->entry->json = NULL;
    renumber(r, in);
    if (sm_core_feed(r->core, in) != SM_OK)
        return fail(r, "the input cannot be fed: it is out of number or of time");
    while (sm_core_next(r->core, &e)) {
        if (r->ask->event != NULL)
            r->ask->event(r->ask->event_arg, e, r->mine);
        if (sm_event_class(e->kind) == SM_LIVE)
            continue;
        compare(r, e);
        if (e->kind == SM_EVENT_CARRIED)
            *r->carried = *e->u.carried;
    }
    return SM_OK;
}

/* Nothing to run again; whether it is right is for verify. */
static bool is_stamp(const char *line, size_t n)
{
    struct sm_head h;

    return sm_head_read(line, n, &h) && sm_head_is(&h, "stamp");
}

static enum sm_status one_line(struct run *r, const char *line, size_t n)
{
    char why[SM_REASON_SIZE];
    enum sm_entry_kind kind;
    enum sm_status s = SM_OK;

    if (is_stamp(line, n))
        return r->line > 1 ? SM_OK : fail(r, "the file does not begin with `open`");
    if (!sm_entry_read_quick(line, n, &r->store, r->entry) &&
        sm_entry_read(line, n, &r->store, r->entry, why) != SM_OK)
        return fail(r, why);
    kind = r->entry->kind;
    if (r->line == 1 && kind != SM_ENTRY_OPEN)
        s = fail(r, "the file does not begin with `open`");
    else if (kind == SM_ENTRY_OPEN)
        s = r->line == 1 ? on_open(r) : fail(r, "a second `open`");
    else if (kind == SM_ENTRY_FILE)
        s = r->core == NULL ? on_file(r) : fail(r, "a `file` entry in the middle of the log");
    else if (kind == SM_ENTRY_INPUT || kind == SM_ENTRY_EVENT) {
        if (r->core == NULL)
            s = start(r);
        if (s == SM_OK && kind == SM_ENTRY_INPUT)
            s = on_input(r);
        else if (s == SM_OK)
            differ(r, "a logged event that does not come out now", r->entry->n);
    } else if (kind == SM_ENTRY_UNKNOWN)
        r->told->passed_over++;
    if (r->entry->json != NULL)
        json_decref(r->entry->json);
    return s;
}

static enum sm_status work(struct run *r)
{
    const char *line;
    size_t n;

    while (peek(r, &line, &n)) {
        enum sm_status s;

        pass(r, n);
        s = one_line(r, line, n);
        if (s != SM_OK)
            return s;
    }
    return r->line > 0 ? SM_OK : fail(r, "there is nothing stamped in this file");
}

static void finish(struct run *r)
{
    sm_core_destroy(r->core);
    sm_setup_destroy(r->setup);
    sm_logged_finish(&r->logged);
    sm_entry_store_finish(&r->store);
    free(r->sheet);
    free(r->entry);
    free(r->made);
}

enum sm_status sm_rerun(const struct sm_rerun_ask *ask, struct sm_rerun_told *ret_told)
{
    struct run *r = calloc(1, sizeof *r);
    enum sm_status s = SM_ENOMEM;

    memset(ret_told, 0, sizeof *ret_told);
    if (r == NULL)
        return s;
    r->ask = ask;
    r->told = ret_told;
    sm_entry_store_init(&r->store);
    r->entry = calloc(1, sizeof *r->entry);
    r->sheet = calloc(1, sizeof *r->sheet);
    r->carried = calloc(1, sizeof *r->carried);
    r->made = malloc(SM_ENTRY_MAX);
    if (r->entry != NULL && r->sheet != NULL && r->carried != NULL && r->made != NULL)
        s = work(r);
    finish(r);
    ret_told->last = r->carried;
    free(r);
    return s;
}
