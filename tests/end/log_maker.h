/* SPDX-License-Identifier: GPL-3.0-or-later */
/* log_maker.h: a shell without ports and disks: it feeds a core and writes the bench log that the
 * daemon would write (open, files, inputs, events, stamps, rollover, close), in memory, so that
 * verify, recover, replay and the core itself are tested over whole sessions in no time.
 *
 *     log_maker_begin(&m, "conf/try.yaml", "try", utc_us);
 *     log_maker_sheet(&m, "sheets/try.yaml", text, n);
 *     log_maker_play(&m, sim, SM_NEVER);
 *     log_maker_end(&m);               the texts stay until log_maker_finish
 */
#ifndef SM_TESTS_LOG_MAKER_H
#define SM_TESTS_LOG_MAKER_H
#include "check.h"

#include "base/time.h"
#include "record/chain.h"
#include "record/entry.h"
#include "setup/setup.h"
#include "sim/sim.h"

struct log_maker_file {
    char *text;
    size_t n, cap;
};

struct log_maker {
    /* to be set after log_maker_begin, as wanted */
    void (*event)(void *arg, struct log_maker *m, const struct sm_event *e); /* live ones, too */
    void *arg;
    bool unlogged;  /* nothing is written: only the core runs */
    bool unstamped; /* no stamps, and nothing that stands for this machine or key (replay-data) */

    struct sm_setup *setup;
    const struct sm_core_setup *core_setup;
    struct sm_core *core;
    struct log_maker_file *file; /* [n_files], the last is being written */
    size_t n_files;
    int64_t begin_utc_us; /* of the session */
    int64_t now_ns;       /* time of the session, over all its files */
    int64_t opened_ns;    /* when the file was opened */
    int64_t n, ordinal;   /* last number used; of the file */
    bool link_is_up;

    struct sm_sheet *sheet;
    char *sheet_text;
    size_t sheet_text_n;
    char sheet_file[SM_NAME_SIZE];
    int64_t newest_durable_n;
    unsigned acts;
    bool done;                   /* the latest act was */
    char why[SM_LINK_TEXT_SIZE]; /* not done: why */

    struct sm_hasher *hasher;
    struct sm_signer *signer;
    char key[SM_KEY_HEX], arithmetic[17], last_stamp[SM_HASH_HEX];
    int64_t stamp_from, last_t_ns, last_utc_us, group_ns, signed_ns;
    size_t group_n;
    bool group_durable;
    struct sm_carried *carried; /* what the file began from */
    struct sm_carried *stated;  /* as stated last, */
    int64_t carried_ns;         /* then */
    char *line;
    struct {
        int64_t n;
        size_t text_n;
        char text[SM_QUESTION_SIZE];
    } ask[4];
    size_t n_asks;
};

/* A setup of the source tree, for one of its meters; the first file is opened and the link is up.
 * All zero before. */
void log_maker_begin(struct log_maker *m, const char *setup_file, const char *meter,
                     int64_t utc_us);
/* The same in two steps, for what is set in between. */
void log_maker_prepare(struct log_maker *m, const char *setup_file, const char *meter,
                       int64_t utc_us);
void log_maker_open(struct log_maker *m);

/* The newest file is closed. */
void log_maker_end(struct log_maker *m);
void log_maker_finish(struct log_maker *m);

/* Time passes up to t_ns: ticks and questions that are due before. The questions go to sim (NULL:
 * to nobody). */
void log_maker_until(struct log_maker *m, struct sm_sim *sim, int64_t t_ns);
void log_maker_bytes(struct log_maker *m, const void *bytes, size_t n);
void log_maker_link(struct log_maker *m, bool up, const char *why);
/* An act by someone who has seen all; it must be done. */
void log_maker_act(struct log_maker *m, enum sm_act_kind act, const char *text);
/* Any act: done or not, m says. */
void log_maker_feed_act(struct log_maker *m, struct sm_input *in);
void log_maker_sheet(struct log_maker *m, const char *file, const char *text, size_t n);

/* One more thing of the simulated meter, due at or before until_ns: true. False: nothing is left
 * until then, which is now. */
bool log_maker_step(struct log_maker *m, struct sm_sim *sim, int64_t until_ns);
/* All of it. */
void log_maker_play(struct log_maker *m, struct sm_sim *sim, int64_t until_ns);

/* The file is changed as after midnight; sm_core_may_roll must be true. */
void log_maker_roll(struct log_maker *m);
/* The program is stopped and started again after gap_ns (the link comes back up). */
void log_maker_restart(struct log_maker *m, int64_t gap_ns);
#endif
