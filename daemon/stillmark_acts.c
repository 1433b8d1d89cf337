/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_acts.c: asks the daemon how things stand, tells it the act, waits for the answer. */
#include "stillmark_acts.h"

#include <jansson.h>
#include <stdio.h>
#include <string.h>
#include <sys/random.h>

#include "base/number.h"
#include "base/unit.h"
#include "door.h"
#include "say.h"
#include "stillmark_status.h"
#include "stillmark_talk.h"
#include "stillmark_words.h"
#include "view/entry_sentence.h"
#include "whole_file.h"

/* What may or must stand behind an act's name. */
enum takes {
    TAKES_NOTHING,
    TAKES_FILE,
    TAKES_TEXT,
    TAKES_MAYBE_TEXT,
    TAKES_ENTRY,
    TAKES_TEMPERATURE
};

static const struct {
    enum takes takes;
    const char *usage, *does;
} acts[SM_ACT_COUNT] = {
    [SM_ACT_SHEET] = { TAKES_FILE, "FILE", "hands a bench sheet over; a new run begins" },
    [SM_ACT_NEXT] = { TAKES_NOTHING, "", "the probe is now in the next item" },
    [SM_ACT_REDO] = { TAKES_NOTHING, "", "measure the last item again" },
    [SM_ACT_SKIP] = { TAKES_NOTHING, "--why REASON", "leave this item out" },
    [SM_ACT_TAKE] = { TAKES_NOTHING, "--why REASON", "capture now, before it has settled" },
    [SM_ACT_VOID] = { TAKES_ENTRY, "N --why REASON", "declare entry N void" },
    [SM_ACT_NAME] = { TAKES_TEXT, "ID", "name the present item" },
    [SM_ACT_NOTE] = { TAKES_TEXT, "TEXT", "put a note into the bench log" },
    [SM_ACT_CONFIRM] = { TAKES_MAYBE_TEXT, "[TEXT]", "confirm what was asked" },
    [SM_ACT_INSERT] = { TAKES_MAYBE_TEXT, "[TEXT]", "put an item in before the next" },
    [SM_ACT_PAUSE] = { TAKES_NOTHING, "", "the probe rests: nothing is captured until resume" },
    [SM_ACT_RESUME] = { TAKES_NOTHING, "", "the probe is back at work" },
    [SM_ACT_TEMPERATURE] = { TAKES_TEMPERATURE, "\"10.8 °C\"", "the temperature of the sample" },
    [SM_ACT_ANALYST] = { TAKES_TEXT, "WHO", "signs in whoever captures from now on" },
    [SM_ACT_AMEND] = { TAKES_ENTRY, "N", "amend result N" },
    [SM_ACT_DROP] = { TAKES_ENTRY, "N --why REASON", "leave a standard out of its curve" },
    [SM_ACT_ACCEPT] = { TAKES_MAYBE_TEXT, "[TEXT]", "accept what was proposed" },
    [SM_ACT_REORDER] = { TAKES_MAYBE_TEXT, "[TEXT]", "change the order of the sheet" },
    [SM_ACT_ENTER] = { TAKES_MAYBE_TEXT, "[TEXT]", "enter a value by hand" },
    [SM_ACT_SENSOR] = { TAKES_TEXT, "NAME", "another sensor is on the meter" },
    [SM_ACT_SIGN] = { TAKES_MAYBE_TEXT, "", "sign a run off" },
    [SM_ACT_END] = { TAKES_NOTHING, "--why REASON", "close the run" },
};

struct telling {
    enum sm_act_kind act;
    char command[32]; /* "stillmark next": whom messages are about */
    struct sm_words words;
    char id[SM_ID_SIZE];
    char text[SM_NOTE_SIZE];
    bool has_number;
    int64_t number;
    bool has_temperature;
    double temperature_c;
    struct sm_whole_file sheet;
    struct sm_talk *talk;
    int64_t until_ns;
};

static void print_help(enum sm_act_kind a)
{
    const char *name = sm_act_name(a), *usage = acts[a].usage;

    printf("stillmark %s%s%s [--meter M] [--who NAME] [--why REASON] [--json]\n"
           "          [--seen N] [--id ID] [--socket PATH]\n\n"
           "%c%s%s.\n",
           name, usage[0] != '\0' ? " " : "", usage, acts[a].does[0] - 'a' + 'A', acts[a].does + 1,
           sm_act_built(a) ? "" : " (not possible yet)");
    printf("  --meter M     which meter, where the daemon has several\n"
           "  --who NAME    who says it: attribution, not authentication\n"
           "  --why REASON  kept with the act\n"
           "  --seen N      the newest entry you have seen; left out: the newest there is now\n"
           "  --id ID       of this act; the same id again is ignored\n"
           "  --json        the answer as its entry in the bench log\n"
           "  --socket PATH of the daemon; else $STILLMARK_SOCKET, else the runtime folder\n"
           "Exit status: 0 done; 1 refused, and why; 2 could not be done.\n");
}

/* ---- what was typed ---- */

static bool read_entry_number(struct telling *t)
{
    const char *word = t->words.n == 1 ? t->words.word[0] : "";

    if (sm_integer_parse(word, strlen(word), &t->number) == SM_OK && t->number >= 0) {
        t->has_number = true;
        return true;
    }
    sm_say(t->command, "expected the number of an entry of the bench log");
    return false;
}

static bool read_temperature(struct telling *t)
{
    char text[64];
    struct sm_quantity q;

    if (t->words.n > 0 && sm_words_joined(&t->words, text, sizeof text) &&
        sm_quantity_parse(text, strlen(text), &q) == SM_OK && q.unit == SM_UNIT_CELSIUS) {
        t->has_temperature = true;
        t->temperature_c = q.value;
        return true;
    }
    sm_say(t->command, "expected a temperature with its unit, such as \"10.8 °C\"");
    return false;
}

static bool read_text(struct telling *t, bool must)
{
    if (must && t->words.n == 0) {
        sm_say(t->command, "expected %s; see %s --help", acts[t->act].usage, t->command);
        return false;
    }
    if (!sm_words_joined(&t->words, t->text, sizeof t->text)) {
        sm_say(t->command, "the text is longer than %d bytes", SM_NOTE_SIZE - 1);
        return false;
    }
    return true;
}

static bool read_sheet(struct telling *t)
{
    int r;

    if (t->words.held) {
        sm_say(t->command, "--held: not possible yet");
        return false;
    }
    if (t->words.n != 1) {
        sm_say(t->command, "expected one file; see %s --help", t->command);
        return false;
    }
    r = sm_whole_file_open(t->words.word[0], &t->sheet);
    if (r < 0) {
        sm_say(t->command, "%s: cannot be read: %s", t->words.word[0], sm_door_text(r));
        return false;
    }
    if (t->sheet.n > SM_SHEET_TEXT_MAX) {
        sm_say(t->command, "%s: has %zu bytes, a bench sheet has at most %u", t->words.word[0],
               t->sheet.n, SM_SHEET_TEXT_MAX);
        return false;
    }
    if (sm_utf8_span(t->sheet.text, t->sheet.n) != t->sheet.n) {
        sm_say(t->command, "%s: is not UTF-8 text", t->words.word[0]);
        return false;
    }
    return true;
}

static bool read_argument(struct telling *t)
{
    switch (acts[t->act].takes) {
    case TAKES_FILE:
        return read_sheet(t);
    case TAKES_TEXT:
        return read_text(t, true);
    case TAKES_MAYBE_TEXT:
        return read_text(t, false);
    case TAKES_ENTRY:
        return read_entry_number(t);
    case TAKES_TEMPERATURE:
        return read_temperature(t);
    case TAKES_NOTHING:
        break;
    }
    if (t->words.n == 0)
        return true;
    sm_say(t->command, "\"%s\" is not understood; see %s --help", t->words.word[0], t->command);
    return false;
}

static bool is_text(struct telling *t, const char *option, const char *text)
{
    if (text == NULL || sm_utf8_span(text, strlen(text)) == strlen(text))
        return true;
    sm_say(t->command, "%s is not UTF-8 text", option);
    return false;
}

static bool texts_are_good(struct telling *t)
{
    return is_text(t, "the text", t->text) && is_text(t, "--who", t->words.who) &&
           is_text(t, "--why", t->words.why) && is_text(t, "--id", t->words.id) &&
           is_text(t, "--meter", t->words.meter) &&
           (acts[t->act].takes != TAKES_FILE || is_text(t, "the file's name", t->words.word[0]));
}

static bool make_id(struct telling *t)
{
    unsigned char raw[8];

    if (t->words.id != NULL) {
        sm_text_copy(t->id, sizeof t->id, t->words.id);
        if (strcmp(t->id, t->words.id) == 0 && t->id[0] != '\0')
            return true;
        sm_say(t->command, "--id: expected 1 to %d characters", SM_ID_SIZE - 1);
        return false;
    }
    if (getrandom(raw, sizeof raw, 0) != (ssize_t)sizeof raw) {
        sm_say(t->command, "the system gives no random number for the act's id");
        return false;
    }
    for (size_t i = 0; i < sizeof raw; i++)
        snprintf(t->id + 2 * i, 3, "%02x", raw[i]);
    return true;
}

/* ---- what is told ---- */

static bool put(json_t *o, const char *key, json_t *value)
{
    return value != NULL && json_object_set_new(o, key, value) == 0;
}

static bool put_words(json_t *o, const char *key, const char *text)
{
    return text == NULL || text[0] == '\0' || put(o, key, json_string(text));
}

static bool fill(const struct telling *t, const char *meter, bool has_seen, json_int_t seen,
                 json_t *o)
{
    const struct sm_words *w = &t->words;
    bool good = put_words(o, "k", "act") && put_words(o, "meter", meter) &&
                put_words(o, "act", sm_act_name(t->act)) && put_words(o, "id", t->id) &&
                put_words(o, "who", w->who) && put_words(o, "why", w->why);

    if (has_seen)
        good = good && put(o, "seen", json_integer(seen));
    if (t->has_number)
        good = good && put(o, "of", json_integer(t->number));
    if (t->has_temperature)
        good = good && put(o, "temperature", json_real(t->temperature_c));
    if (acts[t->act].takes == TAKES_FILE)
        return good && put_words(o, "file", w->word[0]) &&
               put(o, "text", json_stringn(t->sheet.text, t->sheet.n));
    return good && put_words(o, "text", t->text);
}

static enum sm_status tell(struct telling *t, const json_t *status, char why[SM_TALK_WHY_SIZE])
{
    const json_t *newest = json_object_get(status, "seen");
    const bool has_seen = t->words.has_seen || json_is_integer(newest);
    const json_int_t seen = t->words.has_seen ? t->words.seen : json_integer_value(newest);
    json_t *o = json_object();
    enum sm_status s = SM_ENOMEM;

    if (o != NULL &&
        fill(t, json_string_value(json_object_get(status, "meter")), has_seen, seen, o))
        s = sm_talk_send(t->talk, o, t->until_ns, why);
    else
        snprintf(why, SM_TALK_WHY_SIZE, "no memory");
    json_decref(o);
    return s;
}

/* The answer to this act, or an error about it or about nothing in particular. */
static bool is_ours(const struct telling *t, const json_t *o)
{
    const char *id = json_string_value(json_object_get(o, "id"));

    if (sm_talk_is(o, "answer"))
        return id != NULL && strcmp(id, t->id) == 0;
    return sm_talk_is(o, "error") && (id == NULL || strcmp(id, t->id) == 0);
}

static enum sm_status wait_for_answer(struct telling *t, json_t **ret_answer,
                                      char why[SM_TALK_WHY_SIZE])
{
    for (;;) {
        json_t *o = NULL;
        const enum sm_status s = sm_talk_next(t->talk, t->until_ns, &o, why);

        if (s != SM_OK)
            return s;
        if (is_ours(t, o)) {
            *ret_answer = o;
            return SM_OK;
        }
        json_decref(o);
    }
}

/* ---- the answer ---- */

/* How things stand now, and the cautions of the step that comes. */
static void print_status(struct telling *t, const char *meter)
{
    char why[SM_TALK_WHY_SIZE];
    json_t *list = NULL;

    if (sm_talk_status(t->talk, meter, false, t->until_ns, &list, why) != SM_OK)
        return; /* the act is done all the same */
    sm_status_print(json_array_get(list, 0), false);
    json_decref(list);
}

static int print_answer(struct telling *t, const json_t *answer, const char *meter)
{
    const bool done = json_is_true(json_object_get(answer, "done"));
    char line[SM_TALK_WHY_SIZE];
    struct sm_text s;

    if (t->words.json) {
        sm_talk_print(t->talk);
        return done ? SM_EXIT_DONE : SM_EXIT_NO;
    }
    sm_text_init(&s, line, sizeof line);
    (void)sm_entry_sentence(answer, &s);
    printf("%s%s%s.\n", line, done ? ": " : "", done ? sm_act_name(t->act) : "");
    if (done)
        print_status(t, meter);
    fflush(stdout);
    return done ? SM_EXIT_DONE : SM_EXIT_NO;
}

static int could_not(const struct telling *t, const char *why)
{
    sm_say(t->command, "%s", why);
    return SM_EXIT_COULD_NOT;
}

static int converse(struct telling *t, const json_t *status)
{
    const char *meter = json_string_value(json_object_get(status, "meter"));
    char why[SM_TALK_WHY_SIZE];
    json_t *answer = NULL;
    enum sm_status s = tell(t, status, why);
    int exit;

    if (s != SM_OK)
        return could_not(t, why);
    s = wait_for_answer(t, &answer, why);
    if (s != SM_OK) {
        sm_say(t->command, "%s; whether it was done is not known: look at stillmark status", why);
        return SM_EXIT_COULD_NOT;
    }
    if (sm_talk_is_error(answer, why))
        exit = could_not(t, why);
    else
        exit = print_answer(t, answer, meter);
    json_decref(answer);
    return exit;
}

/* Which meter: the one that is named, or the only one. */
static int choose_and_tell(struct telling *t)
{
    char why[SM_TALK_WHY_SIZE];
    json_t *list = NULL;
    int exit;

    if (sm_talk_open(t->words.socket, t->until_ns, &t->talk, why) != SM_OK)
        return could_not(t, why);
    if (sm_talk_status(t->talk, t->words.meter, false, t->until_ns, &list, why) != SM_OK) {
        exit = could_not(t, why);
    } else if (json_array_size(list) != 1) {
        sm_status_names(list, why, sizeof why);
        sm_say(t->command, "there are several meters; name one with --meter: %s", why);
        exit = SM_EXIT_COULD_NOT;
    } else {
        exit = converse(t, json_array_get(list, 0));
    }
    json_decref(list);
    sm_talk_close(t->talk);
    return exit;
}

int sm_stillmark_act(enum sm_act_kind act, int argc, char **argv)
{
    struct telling t = { .act = act };
    const unsigned takes =
        SM_WORDS_METER | SM_WORDS_ACT | (act == SM_ACT_SHEET ? SM_WORDS_HELD : 0);
    int exit = SM_EXIT_COULD_NOT;

    snprintf(t.command, sizeof t.command, "stillmark %s", sm_act_name(act));
    if (!sm_words_read(t.command, takes, argc, argv, &t.words))
        return SM_EXIT_COULD_NOT;
    if (t.words.help) {
        print_help(act);
        return SM_EXIT_DONE;
    }
    if (read_argument(&t) && texts_are_good(&t) && make_id(&t)) {
        t.until_ns = sm_talk_clock_ns() + SM_TALK_WAIT_NS;
        exit = choose_and_tell(&t);
    }
    sm_whole_file_close(&t.sheet);
    return exit;
}
