/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_sim_main.c: `stillmark-sim`: a scenario played on a pseudo-terminal in real time, or
 * written to files as fast as it goes. Everything it shows is invented. */
#include <errno.h>
#include <getopt.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/number.h"
#include "sim/play.h"
#include "sim/random_session.h"
#include "sim/write.h"

#define BLAMES 20

static const char usage[] =
    "usage: stillmark-sim SCENARIO [options]\n"
    "       stillmark-sim --random-session BEAKERS --seed S [options]\n"
    "\n"
    "Plays an invented meter on a pseudo-terminal, in real time and never faster. Prints the\n"
    "terminal's path, unless --link is given; else it prints nothing.\n"
    "  --link PATH      make PATH a symbolic link to the terminal\n"
    "  --wait           begin when the terminal is first opened\n"
    "  --stay           keep the line open after the end, until SIGTERM\n"
    "  --replug COUNT   pull the plug COUNT times: a new terminal each time, the link moved\n"
    "  --every S        so often (default 10); --away S for so long (default 0.5)\n"
    "Writes files instead, as fast as it goes ('-' is standard output):\n"
    "  --csv FILE       time_s,value\n"
    "  --lines FILE     t_ns TAB escaped bytes; the link as t_ns TAB TAB down, up\n"
    "With either:\n"
    "  --truth FILE     what was true: "
    "item,name,kind,begin_s,end_s,true_value,unit,temperature_c,\n"
    "                   true_end_mv,t_settle_s,calm_s,stayed_three\n"
    "  --events FILE    what happens when: time_s,step,name; while playing, as it happens\n"
    "  --seed S         in place of the scenario's own\n"
    "Of a random session (defaults: 0.6 mV, 22 s, 0.5 to 10 /s):\n"
    "  --tolerance MV  --dwell S  --rate PER_S\n"
    "Exit status: 0 done, 2 could not be done.\n";

struct wishes {
    const char *scenario, *csv, *lines, *truth, *events;
    bool random, has_seed;
    double beakers, seed, tolerance, dwell_s, rate_per_s; /* 0: not told */
    struct sm_sim_play play;
};

static int fail(const char *what, const char *why)
{
    fprintf(stderr, "stillmark-sim: %s: %s\n", what, why);
    return 2;
}

static bool take_number(const char *option, double from, double to, double *ret)
{
    double v;

    if (sm_number_parse(optarg, strlen(optarg), &v) != SM_OK || v < from || v > to) {
        fprintf(stderr, "stillmark-sim: --%s: expected a number from %g to %g, got \"%s\"\n",
                option, from, to, optarg);
        return false;
    }
    *ret = v;
    return true;
}

enum {
    LINK = 1,
    WAIT,
    STAY,
    REPLUG,
    EVERY,
    AWAY,
    CSV,
    LINES,
    TRUTH,
    EVENTS,
    RANDOM,
    SEED,
    TOLERANCE,
    DWELL,
    RATE,
    HELP,
    VERSION
};

static const struct option options[] = {
    { "link", required_argument, NULL, LINK },
    { "wait", no_argument, NULL, WAIT },
    { "stay", no_argument, NULL, STAY },
    { "replug", required_argument, NULL, REPLUG },
    { "every", required_argument, NULL, EVERY },
    { "away", required_argument, NULL, AWAY },
    { "csv", required_argument, NULL, CSV },
    { "lines", required_argument, NULL, LINES },
    { "truth", required_argument, NULL, TRUTH },
    { "events", required_argument, NULL, EVENTS },
    { "random-session", required_argument, NULL, RANDOM },
    { "seed", required_argument, NULL, SEED },
    { "tolerance", required_argument, NULL, TOLERANCE },
    { "dwell", required_argument, NULL, DWELL },
    { "rate", required_argument, NULL, RATE },
    { "help", no_argument, NULL, HELP },
    { "version", no_argument, NULL, VERSION },
    { NULL, 0, NULL, 0 },
};

static bool take_option(int option, struct wishes *w)
{
    double v = 0;

    switch (option) {
    case LINK:
        w->play.link = optarg;
        return true;
    case WAIT:
        w->play.wait = true;
        return true;
    case STAY:
        w->play.stay = true;
        return true;
    case REPLUG:
        if (!take_number("replug", 1, 100000, &v))
            return false;
        w->play.replugs = (unsigned)v;
        return true;
    case EVERY:
        return take_number("every", 0.05, 86400, &w->play.every_s);
    case AWAY:
        return take_number("away", 0.01, 86400, &w->play.away_s);
    case CSV:
        w->csv = optarg;
        return true;
    case LINES:
        w->lines = optarg;
        return true;
    case TRUTH:
        w->truth = optarg;
        return true;
    case EVENTS:
        w->events = optarg;
        return true;
    case RANDOM:
        w->random = true;
        return take_number("random-session", 1, 8000, &w->beakers);
    case SEED:
        w->has_seed = true;
        return take_number("seed", 0, 4e9, &w->seed);
    case TOLERANCE:
        return take_number("tolerance", 1e-6, 1e6, &w->tolerance);
    case DWELL:
        return take_number("dwell", 1e-3, 3600, &w->dwell_s);
    case RATE:
        return take_number("rate", 1e-3, 1000, &w->rate_per_s);
    default:
        return false;
    }
}

static bool read_scenario(const char *path, struct sm_scenario *sc)
{
    static char text[SM_SCENARIO_BYTES_MAX + 2]; /* one more than may be: seen as too long */
    struct sm_blame list[BLAMES];
    struct sm_blames blames;
    FILE *f = fopen(path, "rb");

    if (!f) {
        fail(path, strerror(errno));
        return false;
    }
    const size_t n = fread(text, 1, sizeof text - 1, f);
    const bool unread = ferror(f) != 0;
    fclose(f);
    if (unread) {
        fail(path, "cannot be read");
        return false;
    }
    sm_blames_init(&blames, list, BLAMES);
    if (sm_scenario_read(sc, path, text, n, &blames) == SM_OK)
        return true;
    for (size_t i = 0; i < blames.n; i++) {
        char line[SM_PATH_SIZE + SM_BLAME_SIZE + 32];
        sm_blame_write(&blames.list[i], line, sizeof line);
        fprintf(stderr, "%s\n", line);
    }
    if (blames.left_out > 0)
        fprintf(stderr, "%s: and %zu more\n", path, blames.left_out);
    return false;
}

static bool make_random(const struct wishes *w, struct sm_scenario *sc)
{
    struct sm_random_session r;

    sm_random_session_init(&r, (unsigned)w->beakers, (uint64_t)w->seed);
    if (w->tolerance > 0)
        r.tolerance = w->tolerance;
    if (w->dwell_s > 0)
        r.dwell_s = w->dwell_s;
    if (w->rate_per_s > 0)
        r.rate_from = r.rate_to = w->rate_per_s;
    const enum sm_status status = sm_random_session_make(&r, sc);
    if (status != SM_OK)
        fail("random session", sm_status_text(status));
    return status == SM_OK;
}

typedef enum sm_status writer(const struct sm_scenario *sc, FILE *f);

/* Writes one file; true where none was asked for. */
static bool write_file(const char *path, writer *write, const struct sm_scenario *sc)
{
    if (!path)
        return true;
    FILE *f = strcmp(path, "-") == 0 ? stdout : fopen(path, "wb");
    if (!f) {
        fail(path, strerror(errno));
        return false;
    }
    enum sm_status status = write(sc, f);
    if (f != stdout && fclose(f) != 0 && status == SM_OK)
        status = SM_EIO;
    if (status != SM_OK)
        fail(path, sm_status_text(status));
    return status == SM_OK;
}

static int play(struct wishes *w, const struct sm_scenario *sc)
{
    FILE *events = NULL;

    if (w->events)
        events = strcmp(w->events, "-") == 0 ? stdout : fopen(w->events, "wb");
    if (w->events && !events)
        return fail(w->events, strerror(errno));
    const enum sm_status status = sm_sim_play(sc, &w->play, events);
    const int why = errno;
    if (events && events != stdout)
        fclose(events);
    return status == SM_OK ? 0
                           : fail(w->play.link ? w->play.link : "pseudo-terminal", strerror(why));
}

static int work(struct wishes *w)
{
    struct sm_scenario sc;
    int status = 2;

    sm_scenario_init(&sc);
    if (w->random ? make_random(w, &sc) : read_scenario(w->scenario, &sc)) {
        if (w->has_seed)
            sc.seed = (uint64_t)w->seed;
        if (!write_file(w->truth, sm_sim_write_truth, &sc))
            status = 2;
        else if (!w->csv && !w->lines)
            status = play(w, &sc);
        else if (write_file(w->csv, sm_sim_write_csv, &sc) &&
                 write_file(w->lines, sm_sim_write_lines, &sc) &&
                 write_file(w->events, sm_sim_write_events, &sc))
            status = 0;
    }
    sm_scenario_free(&sc);
    return status;
}

int main(int argc, char **argv)
{
    struct wishes w = { .play = { .every_s = 10, .away_s = 0.5 } };
    int option;

    while ((option = getopt_long(argc, argv, "", options, NULL)) != -1) {
        if (option == HELP || option == VERSION) {
            fputs(option == HELP ? usage : "stillmark-sim " SM_VERSION "\n", stdout);
            return 0;
        }
        if (!take_option(option, &w))
            return 2;
    }
    if (w.random ? optind != argc : optind + 1 != argc)
        return fail("one scenario or --random-session is needed", "see --help");
    w.scenario = w.random ? NULL : argv[optind];
    return work(&w);
}
