/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_status.c: one sentence per meter. */
#include "stillmark_status.h"

#include <stdio.h>

#include "base/text.h"
#include "say.h"
#include "stillmark_talk.h"
#include "stillmark_words.h"

#define COMMAND "stillmark status"

static const char HELP[] =
    "stillmark status [--meter M] [--json] [--socket PATH]\n\n"
    "What each meter does now and what comes next, a sentence for each.\n"
    "  --meter M     this meter only\n"
    "  --json        one object per meter, one per line\n"
    "  --socket PATH of the daemon; else $STILLMARK_SOCKET, else the runtime folder\n"
    "Exit status: 0 told; 2 no daemon answers.\n";

static void add(struct sm_text *t, const char *before, const json_t *v, const char *after)
{
    if (json_string_length(v) == 0)
        return;
    sm_text_add(t, before);
    sm_text_add_safe(t, json_string_value(v), json_string_length(v));
    sm_text_add(t, after);
}

void sm_status_print(const json_t *status, bool method_note)
{
    const json_t *missed = json_object_get(status, "not_logged");
    char buf[8192];
    struct sm_text t;

    sm_text_init(&t, buf, sizeof buf);
    add(&t, "", json_object_get(status, "meter"), ": ");
    add(&t, "", json_object_get(status, "sentence"), "");
    sm_text_add(&t, "\n");
    add(&t, "  Port: ", json_object_get(json_object_get(status, "link"), "why"), "\n");
    add(&t, "  Not logged: ", json_object_get(missed, "why"), "\n");
    add(&t, "  Caution: ", json_object_get(status, "caution"), "\n");
    if (method_note)
        add(&t, "  Method: ", json_object_get(status, "method_note"), "\n");
    fputs(buf, stdout);
}

void sm_status_names(const json_t *list, char *ret_text, size_t cap)
{
    struct sm_text t;

    sm_text_init(&t, ret_text, cap);
    for (size_t i = 0; i < json_array_size(list); i++)
        add(&t, i > 0 ? ", " : "", json_object_get(json_array_get(list, i), "meter"), "");
}

int sm_stillmark_status(int argc, char **argv)
{
    const int64_t until_ns = sm_talk_clock_ns() + SM_TALK_WAIT_NS;
    char why[SM_TALK_WHY_SIZE];
    struct sm_talk *talk = NULL;
    struct sm_words w;
    json_t *list = NULL;
    enum sm_status s;

    if (!sm_words_read(COMMAND, SM_WORDS_METER, argc, argv, &w))
        return SM_EXIT_COULD_NOT;
    if (w.help) {
        fputs(HELP, stdout);
        return SM_EXIT_DONE;
    }
    if (w.n > 0) {
        sm_say(COMMAND, "\"%s\" is not understood; see " COMMAND " --help", w.word[0]);
        return SM_EXIT_COULD_NOT;
    }
    s = sm_talk_open(w.socket, until_ns, &talk, why);
    if (s == SM_OK)
        s = sm_talk_status(talk, w.meter, w.json, until_ns, &list, why);
    if (s != SM_OK)
        sm_say(COMMAND, "%s", why);
    for (size_t i = 0; !w.json && i < json_array_size(list); i++)
        sm_status_print(json_array_get(list, i), true);
    json_decref(list);
    sm_talk_close(talk);
    return s == SM_OK ? SM_EXIT_DONE : SM_EXIT_COULD_NOT;
}
