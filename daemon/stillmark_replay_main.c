/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_replay_main.c: run bench logs again, judge recordings, be the meter. */
#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <string.h>

#include "replay_log.h"
#include "replay_play.h"
#include "replay_trace.h"

static const char help[] =
    "stillmark-replay LOG… [--rules METHOD.yaml]\n"
    "    Runs bench logs again through the same core and compares every event. With --rules the\n"
    "    method of that file's name is replaced, and what comes out differently is listed.\n"
    "stillmark-replay trace FILE.csv --tolerance \"0.6 mV\" --rule spread\n"
    "         [--dwell \"22 s\"] [--longest-wait \"1800 s\"] [--over \"20 s\"]\n"
    "    When would a recording (time_s,value) have been taken as settled? A row of CSV per "
    "capture.\n"
    "stillmark-replay play LOG [--speed N]\n"
    "    Is the meter: prints the path of a pseudo-terminal and sends the recorded bytes on it.\n"
    "\n"
    "Exit status: 0 the same; 1 something differs or does not verify; 2 could not be done.\n"
    "Figures for \"settled\" rest on simulated signals until real electrodes have been recorded.\n";

int main(int argc, char **argv)
{
    gsl_set_error_handler_off();
    if (argc < 2) {
        fputs("stillmark-replay: what is to be run again? See stillmark-replay --help\n", stderr);
        return 2;
    }
    if (strcmp(argv[1], "--help") == 0) {
        fputs(help, stdout);
        return 0;
    }
    if (strcmp(argv[1], "--version") == 0) {
        printf("stillmark-replay %s\n", SM_VERSION);
        return 0;
    }
    if (strcmp(argv[1], "trace") == 0)
        return sm_replay_trace(argc - 2, argv + 2);
    if (strcmp(argv[1], "play") == 0)
        return sm_replay_play(argc - 2, argv + 2);
    if (strcmp(argv[1], "advise") == 0) {
        fputs("stillmark-replay: advise: not possible yet\n", stderr);
        return 2;
    }
    return sm_replay_log(argc - 1, argv + 1);
}
