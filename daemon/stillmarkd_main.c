/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmarkd_main.c: the daemon beside the meters: reads its setup, then listens until it is told
 * to stop. Exit status: 0 stopped well, 1 a log could not be closed (or --check found fault), 2
 * could not be done. */
#include <getopt.h>
#include <gsl/gsl_errno.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>

#include "check_setup.h"
#include "hub.h"
#include "loop.h"

static const char help[] =
    "Usage: stillmarkd --setup FILE [--socket PATH]\n"
    "       stillmarkd --setup FILE --check\n"
    "\n"
    "Listens to the meters that the setup names, captures what settles and keeps the bench logs.\n"
    "Runs in the foreground until SIGTERM or SIGINT.\n"
    "\n"
    "  --setup FILE    the setup, conf/stillmark.yaml say\n"
    "  --check         read the whole setup, say what is wrong, exit 0 or 2\n"
    "  --socket PATH   the control socket (else the setup's socket:, else\n"
    "                  $XDG_RUNTIME_DIR/stillmark/socket, else /run/stillmark/socket)\n"
    "  --help, --version\n";

struct options {
    const char *setup, *socket;
    bool check, done;
};

/* 0, or an exit status. */
static int read_options(int argc, char **argv, struct options *o)
{
    static const struct option known[] = {
        { "setup", required_argument, NULL, 's' }, { "socket", required_argument, NULL, 'k' },
        { "check", no_argument, NULL, 'c' },       { "help", no_argument, NULL, 'h' },
        { "version", no_argument, NULL, 'v' },     { NULL, 0, NULL, 0 }
    };
    int c;

    while ((c = getopt_long(argc, argv, "", known, NULL)) != -1) {
        switch (c) {
        case 's':
            o->setup = optarg;
            break;
        case 'k':
            o->socket = optarg;
            break;
        case 'c':
            o->check = true;
            break;
        case 'h':
            fputs(help, stdout);
            o->done = true;
            return 0;
        case 'v':
            puts("stillmarkd " SM_VERSION);
            o->done = true;
            return 0;
        default:
            return 2; /* getopt has said why */
        }
    }
    if (optind < argc) {
        fprintf(stderr, "stillmarkd: unexpected argument: %s\n", argv[optind]);
        return 2;
    }
    if (o->setup == NULL) {
        fputs("stillmarkd: --setup FILE is needed; see --help\n", stderr);
        return 2;
    }
    return 0;
}

static int run(const struct sm_setup *setup, const struct options *o)
{
    char path[512], why[SM_WHY_SIZE] = "";
    struct sm_loop *loop = NULL;
    enum sm_status s;

    sm_socket_path(o->socket, setup->socket, path, sizeof path);
    s = sm_loop_create(sm_door_system(), setup, path, &loop, why);
    if (s != SM_OK) {
        fprintf(stderr, "stillmarkd: %s\n", why);
        return 2;
    }
    s = sm_loop_run(loop, why);
    if (s != SM_OK)
        fprintf(stderr, "stillmarkd: %s\n", why);
    sm_loop_destroy(loop);
    return s == SM_OK ? 0 : 1;
}

int main(int argc, char **argv)
{
    struct options o = { 0 };
    struct sm_setup *setup = NULL;
    int status;

    gsl_set_error_handler_off();
    signal(SIGPIPE, SIG_IGN);
    status = read_options(argc, argv, &o);
    if (status != 0 || o.done)
        return status;
    if (o.check)
        return sm_check_setup(o.setup);
    status = sm_read_setup(o.setup, &setup);
    if (status != 0)
        return status;
    status = run(setup, &o);
    sm_setup_destroy(setup);
    return status;
}
