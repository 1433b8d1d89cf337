/* SPDX-License-Identifier: GPL-3.0-or-later */
/* frame.h: bytes to lines. Fed a chunk (lent until the framer is drained), drained of lines.
 * Cutting the same bytes differently at equal times gives the same lines. Allocates nothing. */
#ifndef SM_READING_FRAME_H
#define SM_READING_FRAME_H
#include "reading/profile.h"

enum sm_line_kind {
    SM_LINE_WHOLE,
    SM_LINE_FIRST,    /* the tail of a line begun before the port was opened: never a reading */
    SM_LINE_OVERLONG, /* given when the ceiling is passed: the first SM_LINE_MAX bytes of it; the
                       * rest up to the next end is dropped */
    SM_LINE_BAD,      /* holds a byte with a parity or framing error, or is what followed a break */
    SM_LINE_BREAK, /* a break on the line; what had come of the line before it, perhaps nothing */
    SM_LINE_CUT    /* the link ended in mid-line (sm_framer_end) */
};
const char *sm_line_kind_name(enum sm_line_kind k);

struct sm_line {
    enum sm_line_kind kind;
    int64_t t_ns;       /* of the chunk that held its last byte */
    int64_t first_t_ns; /* of the chunk that held its first byte */
    const char *bytes;  /* without the terminator; lent until the next call; not NUL-terminated */
    size_t n;
    size_t
        length; /* as sent so far; more than n when over the ceiling (FIRST and BAD may be, too) */
};

#define SM_CHUNK_MAX 4096

/* Bytes of one read, and where they were hurt. */
struct sm_chunk {
    int64_t t_ns;
    const unsigned char *bytes;
    size_t n;
    const uint16_t *bad; /* offsets of bytes with a parity or framing error, [n_bad], rising */
    size_t n_bad;        /* a bad byte whose value is 0 is a break */
};

struct sm_framer { /* readable anywhere, written only by frame.c */
    struct sm_framing how;
    uint64_t end, end_mask; /* the terminator as the last bytes of `tail`; AUTO and GAP: not used */
    size_t end_n;           /* its length; GAP: 0 */
    char buf[SM_LINE_MAX + SM_TERMINATOR_SIZE];
    size_t length;   /* bytes since the last end, what may be the terminator's beginning included */
    size_t clean;    /* of these, those since the last bad one */
    uint64_t tail;   /* the last eight bytes, the newest lowest */
    bool first;      /* still in the first, partial line */
    bool bad;        /* a bad byte or a break since the last end */
    bool dropping;   /* given as overlong: the rest is dropped up to the next end */
    int pending_eol; /* AUTO: the CR or LF whose partner may still come */
    int64_t first_t_ns, last_t_ns;
    struct sm_chunk chunk;
    bool lent;
    size_t at, at_bad; /* how far the lent chunk is worked through */
};

/* fresh: bytes may begin in mid-line: everything up to the first terminator is SM_LINE_FIRST.
 * With eol GAP the bytes up to the first gap are. `how` has been checked by lib/setup: a TEXT of 1
 * to 8 bytes, a GAP over 0 (asserted). */
void sm_framer_init(struct sm_framer *f, const struct sm_framing *how, bool fresh);

/* Lends a chunk. A bad byte never ends a line, whatever its value: two lines then come out as one
 * that is SM_LINE_BAD.
 *   SM_EBUSY   until sm_framer_next has given false
 *   SM_EINVAL  more than SM_CHUNK_MAX bytes; offsets of bad bytes not rising or past the end */
SM_MUST_CHECK enum sm_status sm_framer_feed(struct sm_framer *f, const struct sm_chunk *c);

/* The next line of the chunk; false: drained. Empty lines are passed over in silence. */
bool sm_framer_next(struct sm_framer *f, struct sm_line *ret_line);

/* eol GAP: when the line now begun ends if nothing more comes; SM_NEVER otherwise. */
int64_t sm_framer_deadline(const struct sm_framer *f);

/* A tick at or after the deadline: the line that the pause ended, if any. Only when drained. */
bool sm_framer_tick(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line);

/* In mid-line: bytes have come since the last end. A framer that goes on from here must be fresh.
 */
bool sm_framer_begun(const struct sm_framer *f);

/* The link went: what was begun comes out as SM_LINE_CUT (false: nothing was, or it has come out as
 * overlong); then as freshly initialised. */
bool sm_framer_end(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line);

const char *sm_eol_name(enum sm_eol e); /* "auto", "cr", … */
#endif
