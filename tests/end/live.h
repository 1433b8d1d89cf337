/* SPDX-License-Identifier: GPL-3.0-or-later */
/* live.h: the real stillmarkd, running as a process of its own over pseudo-terminals that the test
 * holds the other end of, and one connection to its control socket. The setup is invented, with the
 * shortest dwell and span that a method may have.
 *
 *     live_make(&l, 1);
 *     live_start(&l);              the daemon's process begins
 *     live_connect(&l, 5000);      its socket answers; follow m1
 *     live_send(&l, 0, "-0012.4 mV  20.0 C\r\n");
 *     while (live_line(&l, 100, &line, &n)) …
 *     live_stop(&l);               or live_kill
 *     live_remove(&l);
 */
#ifndef SM_TESTS_LIVE_H
#define SM_TESTS_LIVE_H
#include "check.h"

#include <stdio.h>
#include <sys/types.h>

#include "sim/pty.h"

#define LIVE_METERS 20

struct live {
    char path[64]; /* of the scratch folder */
    char socket[96];
    size_t n_meters;
    struct sm_sim_pty pty[LIVE_METERS];
    pid_t daemon;  /* 0: not running */
    int client;    /* -1: not connected */
    size_t follow; /* which meter it follows: 0 (default) is m1 */
    int64_t from;  /* follow from this entry on; -1 (default): the newest only */
    /* all that was announced so far and is only said once it is on disk, line after line */
    char *told;
    size_t told_n, told_cap;
    char *in; /* what came and was not taken yet: in[at, n) */
    size_t at, n, cap;
};

/* A folder with a setup for meters m1 … and a pseudo-terminal for each. Nothing runs yet. */
void live_make(struct live *l, size_t n_meters);
/* Kills what still runs. */
void live_remove(struct live *l);

/* "PATH/logs/m1" */
void live_folder(const struct live *l, size_t meter, char *ret_path, size_t cap);

/* argv[0] is the program, found in the build folder's bin/ unless it has a '/'. All it says on
 * standard error is added to PATH/NAME.txt. */
pid_t live_spawn(const struct live *l, const char *const argv[]);
void live_start(struct live *l);
/* Another connection is begun, tried for so long, and the newest entries followed. False: not yet.
 */
bool live_connect(struct live *l, int wait_ms);
void live_disconnect(struct live *l);
/* SIGKILL. What the daemon had said before can still be read by live_line. */
void live_kill(struct live *l);
/* SIGTERM; its exit status. */
int live_stop(struct live *l);
/* Runs a program to its end: exit status; -1 killed. All it wrote, cut at cap. */
int live_run(const struct live *l, const char *const argv[], char *ret_said, size_t cap);

/* The meter sends; what nobody listens to is lost. */
void live_send(const struct live *l, size_t meter, const char *text);
void live_request(struct live *l, const char *line); /* without newline */

/* The next whole line from the daemon, its newline included, waited for so long; lent until the
 * next call. False: none. */
bool live_line(struct live *l, int wait_ms, const char **ret_line, size_t *ret_n);
/* Lines are passed over until one has this text in it; fails the test after so long. */
void live_await(struct live *l, const char *text, int wait_ms, char *ret_line, size_t cap);

int64_t live_now_ns(void); /* CLOCK_MONOTONIC */
void live_sleep_ms(int ms);

/* The value in mV as the setup's profile reads it, written for live_send. */
void live_reading(char out[32], double mv);
#endif
