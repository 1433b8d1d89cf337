/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_watch.c: follows each meter over a connection of its own, for a connection follows one
 * meter only. After what may change what comes next the status is asked for, on the same
 * connection; of it the next item and the caution are said, where they are new. */
#include "stillmark_watch.h"

#include <jansson.h>
#include <poll.h>
#include <stdio.h>
#include <string.h>
#include <time.h>

#include "base/time.h"
#include "say.h"
#include "setup/setup.h"
#include "stillmark_status.h"
#include "stillmark_talk.h"
#include "stillmark_words.h"
#include "view/entry_sentence.h"

#define COMMAND "stillmark watch"
#define NEXT_SIZE (SM_NAME_SIZE * 4) /* a name of bytes that are shown as \\xNN */
#define CAUTION_SIZE 2048
#define MOVED_SIZE 512

static const char HELP[] =
    "stillmark watch [--meter M] [--from N] [--json] [--socket PATH]\n\n"
    "A line for everything worth saying, with its local time, until interrupted.\n"
    "  --meter M     this meter only; left out: all of them\n"
    "  --from N      begins with entry N of the present log file\n"
    "  --json        every entry and live object as it comes, one per line\n"
    "  --socket PATH of the daemon; else $STILLMARK_SOCKET, else the runtime folder\n"
    "Exit status: 2 the daemon does not answer, or no longer.\n";

struct watched {
    char meter[SM_METER_SIZE];
    struct sm_talk *talk;
    bool greeted;           /* the first status was said */
    bool asked;             /* a status is on its way */
    bool raw;               /* "not logged" was said and nothing was logged since */
    bool results;           /* the caution of results was said */
    json_int_t moved_to;    /* item whose turn was said and that has no value yet; 0: none */
    char moved[MOVED_SIZE]; /* the last that was said of the probe's moving, in this turn */
    char next[NEXT_SIZE], caution[CAUTION_SIZE]; /* of the last status */
};

struct watch {
    struct sm_words words;
    struct watched meter[SM_METERS_MAX];
    size_t n;
};

/* ---- lines ---- */

/* "08:41:09 " of an object's utc, here. */
static void add_time(const json_t *o, struct sm_text *t)
{
    const char *utc = json_string_value(json_object_get(o, "utc"));
    int64_t utc_us;
    time_t seconds;
    struct tm here;

    if (utc != NULL && sm_utc_parse(utc, strlen(utc), &utc_us) == SM_OK) {
        seconds = (time_t)(utc_us / 1000000 - (utc_us % 1000000 < 0 ? 1 : 0));
        if (localtime_r(&seconds, &here) != NULL) {
            sm_text_addf(t, "%02d:%02d:%02d ", here.tm_hour, here.tm_min, here.tm_sec);
            return;
        }
    }
    sm_text_add(t, "--:--:-- ");
}

static void print(const struct watch *w, const struct watched *m, const json_t *o,
                  const char *sentence)
{
    char buf[SM_TALK_WHY_SIZE + 8192];
    struct sm_text t;

    sm_text_init(&t, buf, sizeof buf);
    add_time(o, &t);
    if (w->n > 1)
        sm_text_addf(&t, "%s: ", m->meter);
    sm_text_add(&t, sentence);
    puts(buf);
    fflush(stdout);
}

/* What comes next and its caution, as sentences; "" none. */
static void read_step(const json_t *status, char next[NEXT_SIZE], char caution[CAUTION_SIZE])
{
    const json_t *text = json_object_get(status, "caution");
    struct sm_text t;

    sm_text_init(&t, next, NEXT_SIZE);
    sm_text_add(&t, "Next: ");
    if (!sm_item_sentence(json_object_get(status, "next"), &t))
        sm_text_copy(next, NEXT_SIZE,
                     json_is_true(json_object_get(status, "sheet_done")) ? "The sheet is done."
                                                                         : "");
    sm_text_init(&t, caution, CAUTION_SIZE);
    if (json_string_length(text) == 0)
        return;
    sm_text_add(&t, "Caution: ");
    sm_text_add_safe(&t, json_string_value(text), json_string_length(text));
}

static bool is_new(const char *text, const char *before)
{
    return text[0] != '\0' && strcmp(text, before) != 0;
}

/* The first one whole, then what comes next and its caution, where they are new. */
static void say_status(const struct watch *w, struct watched *m, const json_t *status)
{
    char next[NEXT_SIZE], caution[CAUTION_SIZE];

    m->asked = false;
    read_step(status, next, caution);
    if (!m->greeted) {
        m->greeted = true;
        sm_status_print(status, true);
        fflush(stdout);
    } else {
        if (m->moved_to != 0) /* what comes after it is told when it has its value */
            memcpy(next, m->next, sizeof next);
        if (is_new(next, m->next))
            print(w, m, status, next);
        if (is_new(caution, m->caution))
            print(w, m, status, caution);
    }
    memcpy(m->next, next, sizeof next);
    memcpy(m->caution, caution, sizeof caution);
}

/* Kinds after which something else may come next. */
static bool turns(const json_t *o)
{
    static const char *const kinds[] = { "answer",      "moved", "capture",
                                         "not-settled", "curve", "open" };

    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++)
        if (sm_talk_is(o, kinds[i]))
            return true;
    return false;
}

static bool ask(struct watched *m, const char *k, bool has_from, int64_t from,
                char why[SM_TALK_WHY_SIZE])
{
    json_t *o = json_pack("{s:s, s:s}", "k", k, "meter", m->meter);
    enum sm_status s = SM_ENOMEM;

    snprintf(why, SM_TALK_WHY_SIZE, "no memory");
    if (o != NULL && (!has_from || json_object_set_new(o, "from", json_integer(from)) == 0))
        s = sm_talk_send(m->talk, o, sm_talk_clock_ns() + SM_TALK_WAIT_NS, why);
    json_decref(o);
    return s == SM_OK;
}

/* A result is shown: once, what it is not for. */
static void say_purpose(const struct watch *w, struct watched *m, const json_t *o)
{
    if (m->results || !sm_talk_is(o, "result"))
        return;
    m->results = true;
    print(w, m, o, "Results are for information. They must not control a dosing pump.");
}

/* Ends the turn of the item that was said last. */
static bool ends_turn(const json_t *o)
{
    static const char *const acts[] = { "sheet", "skip", "pause", "resume" };
    const char *act = json_string_value(json_object_get(o, "act"));

    if (sm_talk_is(o, "capture") || sm_talk_is(o, "not-settled"))
        return true;
    for (size_t i = 0; act != NULL && i < sizeof acts / sizeof acts[0]; i++)
        if (sm_talk_is(o, "act") && strcmp(act, acts[i]) == 0)
            return true;
    return false;
}

/* On its way: a probe that leaves a beaker changes the value first (were it to stay so, the capture
 * and its question say it), and air and rinse move it more than once into the same item. */
static bool is_on_the_way(struct watched *m, const json_t *o)
{
    const char *by = json_string_value(json_object_get(o, "by"));
    const char *why = json_string_value(json_object_get(o, "why"));
    const json_int_t item = json_integer_value(json_object_get(o, "item"));

    if (ends_turn(o)) {
        m->moved_to = 0;
        m->moved[0] = '\0';
    }
    if (!sm_talk_is(o, "moved"))
        return false;
    if (by != NULL && strcmp(by, "value") == 0)
        return true;
    if (item == 0 && why != NULL && strcmp(why, "first reading") == 0)
        return true; /* at each sheet and pause, too: the link's line says enough */
    if (item != 0 && item == m->moved_to)
        return true;
    m->moved_to = item;
    return false;
}

static void say_entry(const struct watch *w, struct watched *m, const json_t *o)
{
    const bool raw = sm_talk_is(o, "raw");
    char buf[8192];
    struct sm_text t;

    if (sm_talk_is(o, "answer") && json_is_true(json_object_get(o, "done")))
        return; /* its act was said */
    if ((raw && m->raw) || is_on_the_way(m, o))
        return;
    sm_text_init(&t, buf, sizeof buf);
    if (!sm_entry_sentence(o, &t))
        return;
    if (sm_talk_is(o, "moved")) {
        if (strcmp(buf, m->moved) == 0)
            return; /* nothing new: it was moved again */
        sm_text_copy(m->moved, sizeof m->moved, buf);
    }
    m->raw = raw;
    say_purpose(w, m, o);
    print(w, m, o, buf);
}

/* False: the end, why in words. */
static bool on_object(const struct watch *w, struct watched *m, const json_t *o,
                      char why[SM_TALK_WHY_SIZE])
{
    if (sm_talk_is_error(o, why))
        return false;
    if (w->words.json) {
        sm_talk_print(m->talk);
        return true;
    }
    if (sm_talk_is(o, "status")) {
        say_status(w, m, o);
        return true;
    }
    say_entry(w, m, o);
    if (!turns(o) || m->asked)
        return true;
    /* where it cannot be asked, what is still to be read says why */
    m->asked = ask(m, "status", false, 0, why);
    return true;
}

/* Everything that is here of one meter. */
static bool on_readable(const struct watch *w, struct watched *m, char why[SM_TALK_WHY_SIZE])
{
    for (;;) {
        json_t *o = NULL;
        const enum sm_status s = sm_talk_next(m->talk, 0, &o, why);
        bool more;

        if (s != SM_OK)
            return s == SM_ESHORT;
        more = on_object(w, m, o, why);
        json_decref(o);
        if (!more)
            return false;
    }
}

/* ---- the beginning and the end ---- */

static bool begin_one(struct watch *w, struct watched *m, const json_t *status,
                      char why[SM_TALK_WHY_SIZE])
{
    const char *name = json_string_value(json_object_get(status, "meter"));

    if (name == NULL || !sm_meter_name_ok(name, strlen(name))) {
        snprintf(why, SM_TALK_WHY_SIZE, "what answers is no stillmarkd: a meter without a name");
        return false;
    }
    sm_text_copy(m->meter, sizeof m->meter, name);
    if (sm_talk_open(w->words.socket, sm_talk_clock_ns() + SM_TALK_WAIT_NS, &m->talk, why) != SM_OK)
        return false;
    w->n++;
    m->asked = true; /* behind following, so that nothing falls in between */
    return ask(m, "follow", w->words.has_from, w->words.from, why) &&
           ask(m, "status", false, 0, why);
}

static bool begin(struct watch *w, char why[SM_TALK_WHY_SIZE])
{
    const int64_t until_ns = sm_talk_clock_ns() + SM_TALK_WAIT_NS;
    struct sm_talk *talk = NULL;
    json_t *list = NULL;
    bool good;

    good = sm_talk_open(w->words.socket, until_ns, &talk, why) == SM_OK &&
           sm_talk_status(talk, w->words.meter, false, until_ns, &list, why) == SM_OK;
    sm_talk_close(talk);
    for (size_t i = 0; good && i < json_array_size(list); i++)
        good = begin_one(w, &w->meter[i], json_array_get(list, i), why);
    json_decref(list);
    return good;
}

static bool wait_and_say(struct watch *w, char why[SM_TALK_WHY_SIZE])
{
    struct pollfd p[SM_METERS_MAX];

    for (size_t i = 0; i < w->n; i++)
        p[i] = (struct pollfd){ sm_talk_fd(w->meter[i].talk), POLLIN, 0 };
    if (poll(p, w->n, -1) < 0)
        return true; /* a signal: look again */
    for (size_t i = 0; i < w->n; i++)
        if (p[i].revents != 0 && !on_readable(w, &w->meter[i], why))
            return false;
    return true;
}

int sm_stillmark_watch(int argc, char **argv)
{
    char why[SM_TALK_WHY_SIZE];
    struct watch w;

    memset(&w, 0, sizeof w);
    if (!sm_words_read(COMMAND, SM_WORDS_METER | SM_WORDS_FROM, argc, argv, &w.words))
        return SM_EXIT_COULD_NOT;
    if (w.words.help) {
        fputs(HELP, stdout);
        return SM_EXIT_DONE;
    }
    if (w.words.n > 0) {
        sm_say(COMMAND, "\"%s\" is not understood; see " COMMAND " --help", w.words.word[0]);
        return SM_EXIT_COULD_NOT;
    }
    tzset();
    if (begin(&w, why)) {
        while (wait_and_say(&w, why))
            continue;
    }
    sm_say(COMMAND, "%s", why);
    for (size_t i = 0; i < w.n; i++)
        sm_talk_close(w.meter[i].talk);
    return SM_EXIT_COULD_NOT;
}
