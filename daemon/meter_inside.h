/* SPDX-License-Identifier: GPL-3.0-or-later */
/* meter_inside.h: what the meter's files share. meter.c: life and feeding; meter_log.c: entries,
 * groups and failure; meter_file.c: files begun, changed and closed; meter_port.c: the port. */
#ifndef SM_DAEMON_METER_INSIDE_H
#define SM_DAEMON_METER_INSIDE_H
#include "base/time.h"
#include "meter.h"
#include "port.h"
#include "record/entry.h"
#include "say.h"
#include "writer.h"

#define GROUP_NS SM_NS_PER_S /* logged entries are synced within this */
#define GROUP_BYTES (64u * 1024u)
#define SIGN_NS (14 * 60 * SM_NS_PER_S) /* a group is signed at least every 15 minutes */
#define UNWRITTEN_NS (10 * SM_NS_PER_S) /* longer unwritten is a failure */
#define UNWRITTEN_BYTES (8u * 1024u * 1024u)
#define HOLD_BACK_BYTES (2u * 1024u * 1024u) /* more unwritten: the port is not read for now */
#define LOG_RETRY_NS (2 * SM_NS_PER_S)
#define PORT_RETRY_FIRST_NS (SM_NS_PER_S / 2)
#define PORT_RETRY_NS (2 * SM_NS_PER_S)
#define READS_AT_ONCE 8
#define ASKS_MAX 4

enum log_state {
    LOG_IDLE,       /* not started */
    LOG_RECOVERING, /* the writer reads what to begin from */
    LOG_BEGINNING,  /* the first group of the file is under way */
    LOG_OPEN,
    LOG_FAILED, /* to be tried again */
    LOG_CLOSING,
    LOG_CLOSED
};

struct ask {
    int64_t n;
    char text[SM_QUESTION_SIZE];
    size_t text_n;
};

struct sm_meter {
    struct sm_meter_about about;
    const char *name;
    char *line; /* SM_ENTRY_MAX, where entries are written */

    /* the log */
    enum log_state log;
    struct sm_folder folder;
    struct sm_writer *writer;
    uint64_t epoch;
    struct sm_hasher *hasher;
    int64_t n;                      /* the last used */
    int64_t last_t_ns, last_utc_us; /* of the last entry: a stamp repeats them */
    int64_t ordinal;
    int64_t opened_boot_ns, opened_day;
    int64_t stamp_from; /* first entry not under a stamp */
    char last_stamp[SM_HASH_HEX];
    int64_t signed_boot_ns; /* when last; SM_NEVER: not in this file */
    struct sm_group *group; /* being filled; NULL none */
    struct sm_group *under_way, **under_way_last;
    size_t unwritten;
    struct sm_meter_disk disk;
    char trouble[SM_WHY_SIZE]; /* found while feeding; "" none */
    bool closed_well, tried;
    char begun_with[4 * SM_WHY_SIZE]; /* what the new file's `open` says was missed; "" nothing */

    /* what was missed since the log failed */
    struct {
        bool is;
        int64_t from_utc_us;
        int64_t n, ordinal; /* the last that was used; of the last file on disk */
        uint64_t bytes;
        char first[SM_WHY_SIZE], why[SM_WHY_SIZE]; /* what began it; what it is now */
    } missed;
    int64_t log_retry_ns;

    /* the core */
    struct sm_core *core;
    struct sm_carried *carried; /* room for one */
    struct sm_sheet *sheet, *sheet_new;
    char sheet_file[SM_NAME_SIZE];
    char *sheet_text; /* in force; NULL none */
    size_t sheet_text_n;
    const struct sm_act *act; /* being fed */
    bool act_done;
    struct ask ask[ASKS_MAX];
    size_t n_asks;
    struct sm_core_status shown; /* as of before the durable events that are not on disk yet */
    int64_t shown_n;

    /* the port */
    struct sm_port *port;
    bool watched;
    struct sm_link link; /* as last logged; state is meaningless until has_link */
    bool has_link;
    char identity[SM_LINK_TEXT_SIZE]; /* of the adapter seen before; "" none */
    int64_t port_retry_ns, port_wait_ns;
    struct sm_port_bytes bytes;
};

/* meter.c */
void sm_meter_feed(struct sm_meter *m, const struct sm_now *now, struct sm_input *in);

/* meter_log.c */
void sm_meter_append(struct sm_meter *m, const struct sm_now *now, const struct sm_text *t,
                     bool held, int64_t answer);
struct sm_text sm_meter_line(struct sm_meter *m); /* empty, over m->line */
__attribute__((format(printf, 2, 3))) void sm_meter_trouble(struct sm_meter *m, const char *fmt,
                                                            ...);
void sm_meter_stamp(struct sm_meter *m, const struct sm_now *now, bool sign);
void sm_meter_settle(struct sm_meter *m, const struct sm_now *now); /* group closed if it is time */
bool sm_meter_durable_waits(const struct sm_meter *m);
void sm_meter_fail(struct sm_meter *m, const struct sm_now *now, const char *why);

/* meter_file.c */
void sm_meter_recover(struct sm_meter *m, const struct sm_now *now);
void sm_meter_begin(struct sm_meter *m, const struct sm_now *now, struct sm_beginning *b);
void sm_meter_roll_if_due(struct sm_meter *m, const struct sm_now *now);
void sm_meter_close_file(struct sm_meter *m, const struct sm_now *now, const char *why);
void sm_meter_keep_sheet(struct sm_meter *m, const char *file, const char *text, size_t n);

/* meter_port.c */
void sm_meter_port_wake(struct sm_meter *m, const struct sm_now *now);
void sm_meter_port_lost(struct sm_meter *m, const struct sm_now *now, const char *why);
void sm_meter_port_close(struct sm_meter *m);
void sm_meter_feed_link(struct sm_meter *m, const struct sm_now *now, bool continues);
void sm_meter_watch(struct sm_meter *m); /* as it should be now */
void sm_meter_ask(struct sm_meter *m, const struct sm_now *now);
#endif
