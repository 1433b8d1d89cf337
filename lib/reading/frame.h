/* SPDX-License-Identifier: GPL-3.0-or-later */
/* frame.h: bytes to lines. Fed a chunk (lent until the framer is drained), drained of lines.
 * Cutting the same bytes differently at equal times gives the same lines. Allocates nothing. */
#ifndef SM_READING_FRAME_H
#define SM_READING_FRAME_H
#include "reading/profile.h"

enum sm_line_kind {
    SM_LINE_WHOLE,
    SM_LINE_FIRST,    /* the tail of a line begun before the port was opened: never a reading */
    SM_LINE_OVERLONG, /* the first SM_LINE_MAX bytes of it; the rest up to the next end is dropped */
    SM_LINE_BAD,      /* holds a byte with a parity or framing error */
    SM_LINE_BREAK,    /* a break on the line; what had come of the line before it */
    SM_LINE_CUT       /* the link ended in mid-line (sm_framer_end) */
};
const char *sm_line_kind_name(enum sm_line_kind k);

struct sm_line {
    enum sm_line_kind kind;
    int64_t t_ns;       /* of the chunk that held its last byte */
    int64_t first_t_ns; /* of the chunk that held its first byte */
    const char *bytes;  /* without the terminator; lent until the next call; not NUL-terminated */
    size_t n;
    size_t length; /* as sent; more than n when overlong */
};

/* Where a chunk was hurt: offsets, rising; a break is a 0 byte listed in breaks. */
struct sm_chunk {
    int64_t t_ns;
    const unsigned char *bytes;
    size_t n;
    const uint16_t *bad; /* offsets of bytes with a parity or framing error, [n_bad] */
    size_t n_bad;        /* a bad byte whose value is 0 is a break */
};

struct sm_framer {
    struct sm_framing how;
    char buf[SM_LINE_MAX + 16];
    size_t n, length;
    int64_t first_t_ns, last_t_ns;
    bool first, bad, any; /* still in the first, partial line; a bad byte seen; a byte since the end */
    int pending_eol;      /* AUTO: the CR or LF whose partner may still come */
    struct sm_chunk chunk;
    size_t at, at_bad; /* how far the lent chunk is worked through */
};

/* fresh: bytes may begin in mid-line: everything up to the first terminator is SM_LINE_FIRST.
 * With eol GAP the bytes up to the first gap are. */
void sm_framer_init(struct sm_framer *f, const struct sm_framing *how, bool fresh);

/* Lends a chunk. SM_EBUSY until sm_framer_next has given false. SM_EINVAL: more than 4096 bytes. */
SM_MUST_CHECK enum sm_status sm_framer_feed(struct sm_framer *f, const struct sm_chunk *c);

/* The next line of the chunk; false: drained. Empty lines are passed over in silence. */
bool sm_framer_next(struct sm_framer *f, struct sm_line *ret_line);

/* eol GAP: when the line now begun ends if nothing more comes; SM_NEVER otherwise. */
int64_t sm_framer_deadline(const struct sm_framer *f);

/* A tick at or after the deadline: the line that the pause ended, if any. */
bool sm_framer_tick(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line);

/* The link went: what was begun comes out as SM_LINE_CUT (false: nothing was); then as freshly
 * initialised. */
bool sm_framer_end(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line);
#endif
