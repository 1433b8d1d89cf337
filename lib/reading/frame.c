/* SPDX-License-Identifier: GPL-3.0-or-later */
/* frame.c: bytes to lines. One byte at a time; what ends a line is decided on the last bytes alone,
 * so that neither the chunks' borders nor the ceiling change where lines end. */
#include "reading/frame.h"

#include <assert.h>
#include <string.h>

#include "base/time.h"

#define CR 0x0d
#define LF 0x0a

const char *sm_line_kind_name(enum sm_line_kind k)
{
    switch (k) {
    case SM_LINE_WHOLE:
        return "whole";
    case SM_LINE_FIRST:
        return "first";
    case SM_LINE_OVERLONG:
        return "overlong";
    case SM_LINE_BAD:
        return "bad";
    case SM_LINE_BREAK:
        return "break";
    case SM_LINE_CUT:
        return "cut";
    }
    return "?";
}

const char *sm_eol_name(enum sm_eol e)
{
    static const char *const name[] = { "auto", "cr", "lf", "crlf", "etx", "gap", "text" };

    return (size_t)e < sizeof name / sizeof *name ? name[e] : "?";
}

/* A new line begins. */
static void restart(struct sm_framer *f)
{
    f->length = 0;
    f->clean = 0; /* and so the tail does not reach back */
    f->first = false;
    f->bad = false;
    f->dropping = false;
}

static void set_end(struct sm_framer *f, const void *bytes, size_t n)
{
    const unsigned char *b = bytes;

    f->end_n = n;
    for (size_t i = 0; i < n; i++) {
        f->end = f->end << 8 | b[i];
        f->end_mask = f->end_mask << 8 | 0xff;
    }
}

void sm_framer_init(struct sm_framer *f, const struct sm_framing *how, bool fresh)
{
    memset(f, 0, sizeof *f);
    f->how = *how;
    f->first = fresh;
    switch (how->eol) {
    case SM_EOL_AUTO:
        f->end_n = 1;
        break;
    case SM_EOL_CR:
        set_end(f, "\r", 1);
        break;
    case SM_EOL_LF:
        set_end(f, "\n", 1);
        break;
    case SM_EOL_CRLF:
        set_end(f, "\r\n", 2);
        break;
    case SM_EOL_ETX:
        set_end(f, "\x03", 1);
        break;
    case SM_EOL_GAP:
        assert(how->gap_ns > 0);
        break;
    case SM_EOL_TEXT:
        assert(how->text_n >= 1 && how->text_n < SM_TERMINATOR_SIZE);
        set_end(f, how->text, how->text_n);
        break;
    }
}

enum sm_status sm_framer_feed(struct sm_framer *f, const struct sm_chunk *c)
{
    if (f->lent)
        return SM_EBUSY;
    if (c->n > SM_CHUNK_MAX)
        return SM_EINVAL;
    for (size_t i = 0; i < c->n_bad; i++)
        if (c->bad[i] >= c->n || (i > 0 && c->bad[i] <= c->bad[i - 1]))
            return SM_EINVAL;
    f->chunk = *c;
    f->lent = true;
    f->at = 0;
    f->at_bad = 0;
    return SM_OK;
}

static void give(const struct sm_framer *f, enum sm_line_kind kind, size_t length,
                 struct sm_line *ret_line)
{
    *ret_line = (struct sm_line){ .kind = kind,
                                  .t_ns = f->last_t_ns,
                                  .first_t_ns = f->first_t_ns,
                                  .bytes = f->buf,
                                  .n = length < SM_LINE_MAX ? length : SM_LINE_MAX,
                                  .length = length };
}

/* The line ended, after it `end_n` bytes of terminator. False: empty, or given before as overlong.
 */
static bool end_line(struct sm_framer *f, size_t end_n, struct sm_line *ret_line)
{
    const size_t length = f->length - end_n;
    const bool any = length > 0 && !f->dropping;

    if (any)
        give(f, f->first ? SM_LINE_FIRST : f->bad ? SM_LINE_BAD : SM_LINE_WHOLE, length, ret_line);
    restart(f);
    return any;
}

/* A line hurt by a break: its rest would look like a line, so what follows up to the next end is
 * bad. */
static bool end_by_break(struct sm_framer *f, struct sm_line *ret_line)
{
    const bool dropping = f->dropping;

    if (f->length == 0)
        f->first_t_ns = f->chunk.t_ns;
    f->last_t_ns = f->chunk.t_ns;
    f->pending_eol = 0;
    give(f, SM_LINE_BREAK, dropping ? 0 : f->length, ret_line);
    restart(f);
    f->bad = true;
    f->dropping = dropping;
    return true;
}

static void append(struct sm_framer *f, unsigned char byte, bool bad)
{
    if (f->length == 0)
        f->first_t_ns = f->chunk.t_ns;
    f->last_t_ns = f->chunk.t_ns;
    if (f->length < sizeof f->buf)
        f->buf[f->length] = (char)byte;
    f->length++;
    f->clean = bad ? 0 : f->clean + 1;
    f->tail = f->tail << 8 | byte;
    if (bad)
        f->bad = true;
}

/* The byte just appended ends the line. */
static bool at_end(struct sm_framer *f, unsigned char byte, bool bad)
{
    if (bad || f->how.eol == SM_EOL_GAP)
        return false;
    if (f->how.eol != SM_EOL_AUTO)
        return f->clean >= f->end_n && (f->tail & f->end_mask) == f->end;
    if (byte == CR)
        f->pending_eol = LF;
    else if (byte == LF)
        f->pending_eol = CR;
    return byte == CR || byte == LF;
}

/* AUTO: the second byte of CRLF or LFCR, which belongs to the line before. */
static bool is_partner(struct sm_framer *f, unsigned char byte, bool bad)
{
    const int want = f->pending_eol;

    f->pending_eol = 0;
    return want != 0 && !bad && byte == want;
}

/* One byte; true: it brought out a line. */
static bool take(struct sm_framer *f, unsigned char raw, bool bad, struct sm_line *ret_line)
{
    const unsigned char byte = f->how.strip_bit7 ? raw & 0x7f : raw;
    const size_t ceiling = SM_LINE_MAX + (f->end_n > 0 ? f->end_n - 1 : 0);

    if (bad && raw == 0)
        return end_by_break(f, ret_line);
    if (is_partner(f, byte, bad))
        return false;
    append(f, byte, bad);
    if (at_end(f, byte, bad))
        return end_line(f, f->end_n, ret_line);
    if (f->dropping || f->length <= ceiling)
        return false;
    give(f,
         f->first ? SM_LINE_FIRST
         : f->bad ? SM_LINE_BAD
                  : SM_LINE_OVERLONG,
         f->length, ret_line);
    f->dropping = true;
    return true;
}

bool sm_framer_begun(const struct sm_framer *f)
{
    return f->length > 0 || f->bad || f->dropping;
}

static bool gap_is_over(const struct sm_framer *f, int64_t t_ns)
{
    return f->how.eol == SM_EOL_GAP && sm_framer_begun(f) && t_ns > f->last_t_ns &&
           (uint64_t)t_ns - (uint64_t)f->last_t_ns >= (uint64_t)f->how.gap_ns;
}

bool sm_framer_next(struct sm_framer *f, struct sm_line *ret_line)
{
    const struct sm_chunk *c = &f->chunk;

    if (!f->lent)
        return false;
    if (gap_is_over(f, c->t_ns) && end_line(f, 0, ret_line))
        return true;
    while (f->at < c->n) {
        const size_t i = f->at++;
        const bool bad = f->at_bad < c->n_bad && c->bad[f->at_bad] == i;

        if (bad)
            f->at_bad++;
        if (take(f, c->bytes[i], bad, ret_line))
            return true;
    }
    f->lent = false;
    return false;
}

int64_t sm_framer_deadline(const struct sm_framer *f)
{
    if (f->how.eol != SM_EOL_GAP || !sm_framer_begun(f) || f->last_t_ns > SM_NEVER - f->how.gap_ns)
        return SM_NEVER;
    return f->last_t_ns + f->how.gap_ns;
}

bool sm_framer_tick(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line)
{
    return !f->lent && gap_is_over(f, t_ns) && end_line(f, 0, ret_line);
}

bool sm_framer_end(struct sm_framer *f, int64_t t_ns, struct sm_line *ret_line)
{
    const bool any = f->length > 0 && !f->dropping;

    if (any) {
        give(f, SM_LINE_CUT, f->length, ret_line);
        ret_line->t_ns = t_ns;
    }
    restart(f);
    f->first = true;
    f->pending_eol = 0;
    f->lent = false;
    return any;
}
