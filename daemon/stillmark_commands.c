/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_commands.c: the table of commands, and "did you mean" for a word that is none. */
#include "stillmark_commands.h"

#include <stdio.h>
#include <string.h>

#include "base/text.h"
#include "say.h"
#include "stillmark_acts.h"
#include "stillmark_export.h"
#include "stillmark_fit.h"
#include "stillmark_profile.h"
#include "stillmark_status.h"
#include "stillmark_verify.h"
#include "stillmark_watch.h"
#include "stillmark_words.h"

#define FAR 3 /* a word is meant when fewer slips than this lie between */

static const char HELP[] =
    "stillmark COMMAND …\n\n"
    "With the running daemon:\n"
    "  status                what each meter does now\n"
    "  watch                 a line for everything worth saying, as it happens\n"
    "  sheet FILE            hands a bench sheet over\n"
    "  next                  the probe is now in the next item\n"
    "  skip --why REASON     leaves this item out\n"
    "  note TEXT             puts a note into the bench log\n"
    "  analyst WHO           signs in whoever captures from now on\n"
    "  temperature \"10.8 °C\" of the sample, where no probe measures it\n"
    "  pause, resume         nothing is captured in between\n"
    "  redo take void name confirm insert amend drop accept reorder enter sensor end\n"
    "                        acts that are known and not possible yet\n"
    "With files:\n"
    "  fit FILE.csv --model MODEL     a calibration curve out of a table\n"
    "  profile FILE --try LINES       what a profile reads out of a meter's lines\n"
    "  export LOG…                    one table out of bench logs\n"
    "  verify LOG… [--key FILE]       is a bench log unchanged\n"
    "  report, explain, sign, validate, lots, page\n"
    "                                 known and not possible yet\n\n"
    "stillmark COMMAND --help says more. --version, --help.\n"
    "Exit status: 0 done and good; 1 done, and the answer is no; 2 could not be done.\n"
    "Results are for information. They must not control a dosing pump.\n";

static const struct {
    const char *name;
    int (*run)(int argc, char **argv); /* NULL: not possible yet */
} commands[] = {
    { "status", sm_stillmark_status },
    { "watch", sm_stillmark_watch },
    { "fit", sm_stillmark_fit },
    { "profile", sm_stillmark_profile },
    { "export", sm_stillmark_export },
    { "verify", sm_stillmark_verify },
    { "report", NULL },
    { "explain", NULL },
    { "sign", NULL }, /* the command: it signs the runs of logs */
    { "validate", NULL },
    { "lots", NULL },
    { "page", NULL },
};
#define COMMANDS (sizeof commands / sizeof commands[0])

static void nearer(const char *word, const char *name, size_t *best, const char **ret_name)
{
    const size_t apart = sm_text_distance(word, name);

    if (apart >= *best)
        return;
    *best = apart;
    *ret_name = name;
}

static int not_known(const char *word)
{
    const char *meant = NULL;
    size_t best = FAR < strlen(word) ? FAR : strlen(word);

    for (size_t i = 0; i < COMMANDS; i++)
        nearer(word, commands[i].name, &best, &meant);
    for (int a = 0; a < SM_ACT_COUNT; a++)
        nearer(word, sm_act_name((enum sm_act_kind)a), &best, &meant);
    if (meant != NULL)
        sm_say("stillmark", "there is no command \"%s\": did you mean %s? See stillmark --help",
               word, meant);
    else
        sm_say("stillmark", "there is no command \"%s\": see stillmark --help", word);
    return SM_EXIT_COULD_NOT;
}

int sm_stillmark(int argc, char **argv)
{
    const char *word = argc > 1 ? argv[1] : "";
    enum sm_act_kind act;

    if (word[0] == '\0') {
        sm_say("stillmark", "a command is needed: see stillmark --help");
        return SM_EXIT_COULD_NOT;
    }
    if (strcmp(word, "--help") == 0) {
        fputs(HELP, stdout);
        return SM_EXIT_DONE;
    }
    if (strcmp(word, "--version") == 0) {
        puts("stillmark " SM_VERSION);
        return SM_EXIT_DONE;
    }
    for (size_t i = 0; i < COMMANDS; i++) {
        if (strcmp(word, commands[i].name) != 0)
            continue;
        if (commands[i].run != NULL)
            return commands[i].run(argc - 2, argv + 2);
        sm_say("stillmark", "%s: not possible yet", word);
        return SM_EXIT_COULD_NOT;
    }
    if (sm_act_known(word, &act))
        return sm_stillmark_act(act, argc - 2, argv + 2);
    return not_known(word);
}
