/* SPDX-License-Identifier: GPL-3.0-or-later */
/* entry.h: entries of the bench log: written in one fixed order of keys, and read back. */
#ifndef SM_RECORD_ENTRY_H
#define SM_RECORD_ENTRY_H
#include <jansson.h>

#include "core/core.h"

#define SM_FORMAT 1
#define SM_ENTRY_MAX (1024u * 1024u) /* bytes of one line, the newline included */

/* Writing: each writes one whole line with its newline. On t->cut the line is not whole: the
 * storage was too small (SM_ENTRY_MAX holds any). Text is UTF-8; a byte that is not becomes '?', so
 * whoever lets text in (acts, names of adapters, a meter's identity) makes it UTF-8 before the core
 * sees it. utc_us lies in the years 0000 to 9999. A live event (n = 0) is written without n. */
void sm_entry_input(struct sm_text *t, const struct sm_input *in);
void sm_entry_event(struct sm_text *t, const struct sm_event *e);

struct sm_entry_open {
    int64_t n, utc_us;
    const char *program, *arithmetic, *key; /* key: public, hex; "" none */
    const char *key_note;                   /* "new key: the old one is missing" …; "" none */
    const char *meter;
    int64_t ordinal;
    struct {
        bool has;
        int64_t ordinal;
        char stamp[65];      /* its last stamp's hash; "" none */
        int64_t after_lines; /* whole lines after the last stamp, left out */
        int64_t after_bytes; /* bytes after it, a torn line included */
    } previous;
    const char *how;    /* how this file begins: "first", "rollover", "start", "recovery" */
    int64_t aged_ns;    /* carried was aged by this much against the previous file's last */
    const char *missed; /* recovery: what was not logged, when and why; "" none */
    const struct sm_carried *carried;
};
void sm_entry_open(struct sm_text *t, const struct sm_entry_open *o);
void sm_entry_file(struct sm_text *t, int64_t n, int64_t utc_us, const char *name, const char *text,
                   size_t text_n, bool sheet);
void sm_entry_close(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, const char *why);
/* t_ns and utc_us are those of the entry before it: `verify` demands it. */
void sm_entry_stamp(struct sm_text *t, int64_t n, int64_t t_ns, int64_t utc_us, int64_t from,
                    const char hash_hex[65], const char *sig_hex /* NULL: none */);

/* Carried alone, as a JSON object without newline (inside `open` and the `carried` entry). */
void sm_carried_write(struct sm_text *t, const struct sm_carried *c);
/* o: the object alone, or a whole `carried` entry. What is left out is empty (an unknown real:
 * NaN). Unknown sections and keys are passed over and counted.
 *   SM_ESYNTAX  ret_why; ret_carried is then of no use */
SM_MUST_CHECK enum sm_status sm_carried_read(const json_t *o, struct sm_carried *ret_carried,
                                             unsigned *ret_passed_over,
                                             char ret_why[SM_REASON_SIZE]);

/* Raw bytes as a JSON string with its quotes: printable ASCII as itself, \" and \\ so, the rest
 * \u00xx in lower-case hex. */
void sm_bytes_write(struct sm_text *t, const unsigned char *bytes, size_t n);

enum sm_entry_kind {
    SM_ENTRY_OPEN,
    SM_ENTRY_FILE,
    SM_ENTRY_INPUT,
    SM_ENTRY_EVENT,
    SM_ENTRY_STAMP,
    SM_ENTRY_CLOSE,
    SM_ENTRY_UNKNOWN
};

/* Storage for one input read back from a log: what struct sm_input only lends. Heap, reused. */
struct sm_entry_store {
    unsigned char bytes[SM_BYTES_MAX];
    uint16_t bad[SM_BYTES_MAX];
    char *sheet_text; /* grows; freed by sm_entry_store_finish */
    size_t sheet_cap;
};
void sm_entry_store_init(struct sm_entry_store *s);
void sm_entry_store_finish(struct sm_entry_store *s);

struct sm_entry {
    enum sm_entry_kind kind;
    char k[24];
    int64_t n, t_ns, utc_us;
    enum sm_event_kind event; /* EVENT */
    struct sm_input input;    /* INPUT; act.sheet is NULL: whoever replays parses act.sheet_text. An
                               * act whose name is not known makes its entry UNKNOWN */
    unsigned passed_over;     /* INPUT: keys that this program does not know */
    json_t *json;             /* the whole object, owned: json_decref */
};

/* One line (without newline). An input's lent parts lie in *store. Reads untrusted text: strict
 * JSON (duplicate keys refused, depth and sizes limited).
 *   SM_ESYNTAX  not an entry: ret_why; nothing to free */
SM_MUST_CHECK enum sm_status sm_entry_read(const char *line, size_t n, struct sm_entry_store *store,
                                           struct sm_entry *ret_entry,
                                           char ret_why[SM_REASON_SIZE]);

/* The same, many times faster, for `bytes` without bad ones and for `tick`, in exactly the form in
 * which they are written. True: as sm_entry_read would have it, but json is NULL, and of the input
 * only what its kind uses is filled. False: anything else, also what is wrong: sm_entry_read is to
 * be asked; *ret_entry is of no use. */
bool sm_entry_read_quick(const char *line, size_t n, struct sm_entry_store *store,
                         struct sm_entry *ret_entry);
#endif
