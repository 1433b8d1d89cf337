/* SPDX-License-Identifier: GPL-3.0-or-later */
/* input.h: what the core is fed. Each is an entry of the bench log, numbered and appended by the
 * shell before the core sees it. */
#ifndef SM_CORE_INPUT_H
#define SM_CORE_INPUT_H
#include "bench/sheet.h"
#include "reading/frame.h"

#define SM_ID_SIZE 65
#define SM_NOTE_SIZE 1025 /* a note's text */
#define SM_BYTES_MAX 4096 /* of one `bytes` entry */
#define SM_LINK_TEXT_SIZE 512

enum sm_input_kind {
    SM_INPUT_BYTES, /* "bytes": one read */
    SM_INPUT_ACT,   /* "act" */
    SM_INPUT_TICK,  /* "tick": the deadline asked for has come */
    SM_INPUT_LINK,  /* "link": the port opened, lost, refused */
    SM_INPUT_CLOCK, /* "clock": the wall clock jumped, or the machine was suspended */
    SM_INPUT_SENT,  /* "sent": a question was written to the meter */
    SM_INPUT_ROLL,  /* "roll": the file is about to be changed */
    SM_INPUT_COUNT
};
const char *sm_input_kind_name(enum sm_input_kind k);

enum sm_act_kind {
    SM_ACT_SHEET,
    SM_ACT_NEXT,
    SM_ACT_REDO,
    SM_ACT_SKIP,
    SM_ACT_TAKE,
    SM_ACT_VOID,
    SM_ACT_NAME,
    SM_ACT_NOTE,
    SM_ACT_CONFIRM,
    SM_ACT_INSERT,
    SM_ACT_PAUSE,
    SM_ACT_RESUME,
    SM_ACT_TEMPERATURE,
    SM_ACT_ANALYST,
    SM_ACT_AMEND,
    SM_ACT_DROP,
    SM_ACT_ACCEPT,
    SM_ACT_REORDER,
    SM_ACT_ENTER,
    SM_ACT_SENSOR,
    SM_ACT_SIGN,
    SM_ACT_END,
    SM_ACT_COUNT
};
const char *sm_act_name(enum sm_act_kind a);
bool sm_act_known(const char *name, enum sm_act_kind *ret_act);
bool sm_act_built(enum sm_act_kind a); /* false: known, answered "not possible yet" */

struct sm_act {
    enum sm_act_kind act;
    char id[SM_ID_SIZE]; /* made by the sender; printable ASCII, 1 to 64 */
    bool has_seen;
    int64_t seen;           /* n of the newest durable entry its sender had seen */
    char who[SM_NAME_SIZE]; /* claimed; "" not stated */
    char door[16];          /* "socket", "page", … */
    bool has_uid;
    int64_t uid;             /* peer */
    char why[SM_NOTE_SIZE];  /* skip, end …: the reason; "" none */
    char text[SM_NOTE_SIZE]; /* note: the note; name, analyst: the name */
    bool has_temperature;
    double temperature_c;
    bool has_subject;
    int64_t subject; /* n of the entry it is about (void, take …) */
    /* SHEET: the typed sheet, lent during the feed; NULL: its text was refused, sheet_why says why
     */
    const struct sm_sheet *sheet;
    char sheet_file[SM_NAME_SIZE];
    char sheet_why[SM_LINK_TEXT_SIZE];
    const char *sheet_text; /* as handed over, for the log; lent; NULL when not a sheet */
    size_t sheet_text_n;
};

enum sm_link_state { SM_LINK_UP, SM_LINK_LOST, SM_LINK_REFUSED };
const char *sm_link_state_name(enum sm_link_state s); /* "up", "lost", "refused" */

struct sm_link {
    enum sm_link_state state;
    bool continues; /* UP: the port stayed open over a change of file: no line is cut */
    char why[SM_LINK_TEXT_SIZE];      /* in words */
    char port[256];                   /* as set up */
    char device[256];                 /* what it resolved to */
    char identity[SM_LINK_TEXT_SIZE]; /* of the adapter: USB ids and serial number; "" unknown */
    char settings[SM_LINK_TEXT_SIZE]; /* as read back: "9600 8N1, no flow control" and mismatches */
};

enum sm_clock_what { SM_CLOCK_JUMP, SM_CLOCK_SUSPEND };
const char *sm_clock_what_name(enum sm_clock_what w); /* "jump", "suspend" */

struct sm_input {
    enum sm_input_kind kind;
    int64_t n;    /* number of the entry */
    int64_t t_ns; /* since the file was opened, never earlier than the one before */
    int64_t utc_us;
    /* BYTES: t_ns in chunk equals the input's */
    struct sm_chunk chunk;
    struct sm_act act;             /* ACT */
    struct sm_link link;           /* LINK */
    enum sm_clock_what clock_what; /* CLOCK */
    int64_t clock_by_us;           /* CLOCK: forward positive; SUSPEND: how long */
    int64_t sent_of;               /* SENT: n of the `ask` */
};
#endif
