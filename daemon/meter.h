/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter.h: one meter in the daemon: its port, its core and its log, put together. Driven from
 * outside: it has no timers and waits for nothing; whoever owns the loop calls sm_meter_wake when
 * sm_meter_due says, sm_meter_readable when the port has bytes, sm_meter_written when the writer
 * has news. None of its failures touches another meter. */
#ifndef SM_DAEMON_METER_H
#define SM_DAEMON_METER_H
#include "clock.h"
#include "door.h"
#include "folder.h"
#include "record/chain.h"
#include "setup/setup.h"

struct sm_meter;

/* What the meter tells. None of these may call the meter. */
struct sm_meter_hooks {
    void *ctx;
    /* Watch this descriptor for reading; -1: stop watching, it is about to be closed. */
    void (*watch)(void *ctx, struct sm_meter *m, int fd);
    /* An entry that may be shown: logged ones at once, durable ones when they are on disk. n counts
     * the newline. */
    void (*line)(void *ctx, struct sm_meter *m, const char *line, size_t n);
    /* A live object: shown or passed over. kind: "reading", "settling", "raw". */
    void (*live)(void *ctx, struct sm_meter *m, const char *kind, const char *line, size_t n);
    /* The answer to an act, on disk (it is also given as a line). */
    void (*answer)(void *ctx, struct sm_meter *m, int64_t act, const char *line, size_t n);
    /* The log failed: acts not answered yet will not be. */
    void (*lost)(void *ctx, struct sm_meter *m, const char *why);
};

struct sm_meter_about { /* all lent */
    const struct sm_door *door;
    const struct sm_setup *setup;
    const struct sm_meter_setup *meter;
    const struct sm_signer *signer;
    const char *key_note;   /* "" none */
    const char *arithmetic; /* of this machine */
    struct sm_meter_hooks hooks;
};

/* Makes and holds the meter's log folder.
 *   SM_EBUSY   another daemon has the folder
 *   SM_EIO, SM_ENOMEM
 * ret_why is a sentence. */
SM_MUST_CHECK enum sm_status sm_meter_create(const struct sm_meter_about *about,
                                             struct sm_meter **ret_meter,
                                             char ret_why[SM_WHY_SIZE]);
/* Waits for the writer; call sm_meter_stop first and wait for sm_meter_stopped. NULL is fine. */
void sm_meter_destroy(struct sm_meter *m);

const char *sm_meter_name(const struct sm_meter *m);
bool sm_meter_has_logs(const struct sm_meter *m); /* before sm_meter_start only */
void sm_meter_signer(struct sm_meter *m, const struct sm_signer *signer, const char *key_note);

/* Begins: reads what there is, begins a file, opens the port. */
void sm_meter_start(struct sm_meter *m, const struct sm_now *now);
/* The first file is begun, or could not be (it is tried again for ever). */
bool sm_meter_started(const struct sm_meter *m);

/* The wall clock jumped or the machine slept: to be told before anything else of that wake-up. */
void sm_meter_clock(struct sm_meter *m, const struct sm_now *now);

/* Everything that is due. Calling too often does nothing. */
void sm_meter_wake(struct sm_meter *m, const struct sm_now *now);
int64_t sm_meter_due(const struct sm_meter *m); /* boot ns; SM_NEVER */
void sm_meter_readable(struct sm_meter *m, const struct sm_now *now);
int sm_meter_written_fd(const struct sm_meter *m);
void sm_meter_written(struct sm_meter *m, const struct sm_now *now);

/* An act. Its sheet's text, if it is one, is read here.
 *   SM_EIO  the log cannot be written now: nothing was done: ret_why */
SM_MUST_CHECK enum sm_status sm_meter_act(struct sm_meter *m, const struct sm_now *now,
                                          struct sm_act *act, int64_t *ret_n,
                                          char ret_why[SM_WHY_SIZE]);

/* One line of JSON, which says of how many. */
void sm_meter_status(struct sm_meter *m, const struct sm_now *now, size_t meters,
                     struct sm_text *t);

/* For followers that begin with older entries: what of the present file is on disk … */
struct sm_meter_disk {
    int64_t ordinal; /* 0: no file yet */
    char path[SM_FOLDER_SIZE + SM_FILE_NAME_SIZE];
    int64_t bytes;
    int64_t before_ordinal, before_bytes; /* the same of the file before; 0: none in this run */
};
void sm_meter_disk(const struct sm_meter *m, struct sm_meter_disk *ret_disk);
/* … and the entries shown already that are not on disk yet, in order. */
void sm_meter_shown(const struct sm_meter *m, void (*each)(void *arg, const char *line, size_t n),
                    void *arg);

/* The writer has done all it was given. */
bool sm_meter_idle(const struct sm_meter *m);

/* Closes the file (close, signed stamp) and the port. */
void sm_meter_stop(struct sm_meter *m, const struct sm_now *now);
/* All that can be written is. */
bool sm_meter_stopped(const struct sm_meter *m);
/* The file was closed well. */
bool sm_meter_closed_well(const struct sm_meter *m);
#endif
