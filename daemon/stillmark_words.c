/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_words.c: options of the commands that talk to the daemon. */
#include "stillmark_words.h"

#include <string.h>

#include "base/number.h"
#include "base/text.h"
#include "say.h"

struct reader {
    const char *command;
    unsigned takes;
    int argc;
    char **argv;
    int at;
    struct sm_words *words;
    bool bad;
};

/* argv[at] is "--name VALUE" or "--name=VALUE"; the value goes to *slot. */
static bool value_of(struct reader *r, const char *name, const char **slot)
{
    const char *word = r->argv[r->at];
    const size_t n = strlen(name);

    if (strncmp(word, name, n) != 0 || (word[n] != '\0' && word[n] != '='))
        return false;
    if (*slot != NULL) {
        sm_say(r->command, "%s is given twice", name);
        r->bad = true;
    } else if (word[n] == '=') {
        *slot = word + n + 1;
    } else if (r->at + 1 < r->argc) {
        *slot = r->argv[++r->at];
    } else {
        sm_say(r->command, "%s needs a value", name);
        r->bad = true;
    }
    return true;
}

static bool number_of(struct reader *r, const char *name, bool *has, int64_t *slot)
{
    const char *text = NULL;

    if (!value_of(r, name, &text))
        return false;
    if (text != NULL &&
        (sm_integer_parse(text, strlen(text), slot) != SM_OK || *slot < 0 || *has)) {
        sm_say(r->command, "%s: expected the number of an entry, once, got \"%s\"", name, text);
        r->bad = true;
    }
    *has = true;
    return true;
}

static bool flag(struct reader *r, const char *name, bool *slot)
{
    if (strcmp(r->argv[r->at], name) != 0)
        return false;
    *slot = true;
    return true;
}

static bool act_option(struct reader *r)
{
    struct sm_words *w = r->words;

    return value_of(r, "--who", &w->who) || value_of(r, "--why", &w->why) ||
           value_of(r, "--id", &w->id) || number_of(r, "--seen", &w->has_seen, &w->seen);
}

static bool option(struct reader *r)
{
    struct sm_words *w = r->words;

    return value_of(r, "--socket", &w->socket) || flag(r, "--json", &w->json) ||
           flag(r, "--help", &w->help) ||
           ((r->takes & SM_WORDS_METER) != 0 && value_of(r, "--meter", &w->meter)) ||
           ((r->takes & SM_WORDS_ACT) != 0 && act_option(r)) ||
           ((r->takes & SM_WORDS_HELD) != 0 && flag(r, "--held", &w->held)) ||
           ((r->takes & SM_WORDS_FROM) != 0 && number_of(r, "--from", &w->has_from, &w->from));
}

static bool is_option(const char *word)
{
    return word[0] == '-' && word[1] != '\0' && (word[1] < '0' || word[1] > '9') && word[1] != '.';
}

static void take_word(struct reader *r)
{
    struct sm_words *w = r->words;

    if (w->n < SM_TYPED_MAX) {
        w->word[w->n++] = r->argv[r->at];
    } else {
        sm_say(r->command, "more than %d words; put a text in quotation marks", SM_TYPED_MAX);
        r->bad = true;
    }
}

bool sm_words_read(const char *command, unsigned takes, int argc, char **argv,
                   struct sm_words *ret_words)
{
    struct reader r = { command, takes, argc, argv, 0, ret_words, false };
    bool only_words = false;

    memset(ret_words, 0, sizeof *ret_words);
    for (; r.at < argc && !r.bad; r.at++) {
        if (!only_words && strcmp(argv[r.at], "--") == 0) {
            only_words = true;
        } else if (only_words || !is_option(argv[r.at])) {
            take_word(&r);
        } else if (!option(&r)) {
            sm_say(command, "\"%s\" is not understood; see %s --help", argv[r.at], command);
            r.bad = true;
        }
    }
    return !r.bad;
}

bool sm_words_joined(const struct sm_words *w, char *ret_text, size_t cap)
{
    struct sm_text t;

    sm_text_init(&t, ret_text, cap);
    for (size_t i = 0; i < w->n; i++) {
        sm_text_add(&t, i > 0 ? " " : "");
        sm_text_add(&t, w->word[i]);
    }
    return !t.cut;
}
