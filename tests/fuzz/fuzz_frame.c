/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fuzz_frame.c: the framer under any bytes, however cut, hurt and timed. The first byte chooses how
 * lines end, the second whether it is fresh and strips bit 7, the third seeds cuts, bad bytes and
 * pauses; the rest is the stream. Checked: what frame.h promises of every line, that two ways of
 * cutting give the same lines, and that no byte of a stream is in a line twice. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "reading/frame.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define CHECK(what)                                                                                \
    do {                                                                                           \
        if (!(what)) {                                                                             \
            fprintf(stderr, "%s:%d: broken: %s\n", __FILE__, __LINE__, #what);                     \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

#define GAP_NS INT64_C(20000000)

struct stream {
    const uint8_t *byte;
    size_t n;
    unsigned seed;
};

/* Spread by a multiplicative hash: the same for the same byte, however cut. */
static unsigned noise(const struct stream *s, size_t i)
{
    return (unsigned)((i + 1) * 2654435761u + s->seed * 40503u) >> 8;
}

static bool is_bad(const struct stream *s, size_t i)
{
    return s->seed % 4 == 1 && noise(s, i) % 16 == 0;
}

static int64_t time_of(const struct stream *s, size_t i)
{
    return (int64_t)(i / (1 + s->seed % 7)) * (int64_t)(s->seed % 50) * 1000000;
}

static uint64_t mix(uint64_t hash, const void *bytes, size_t n) /* FNV-1a, 64 bits */
{
    const unsigned char *b = bytes;

    for (size_t i = 0; i < n; i++)
        hash = (hash ^ b[i]) * UINT64_C(0x100000001b3);
    return hash;
}

static uint64_t mix_line(uint64_t hash, const struct sm_line *l)
{
    const int64_t plain[] = { (int64_t)l->kind, l->t_ns, l->first_t_ns, (int64_t)l->length };

    return mix(mix(hash, plain, sizeof plain), l->bytes, l->n);
}

static void check_line(const struct sm_framing *how, const struct sm_line *l, int64_t t_ns)
{
    CHECK(l->n <= SM_LINE_MAX && l->n <= l->length);
    CHECK(l->first_t_ns <= l->t_ns && l->t_ns <= t_ns);
    CHECK(l->n > 0 || l->kind == SM_LINE_BREAK);
    CHECK(l->kind != SM_LINE_WHOLE || l->n == l->length);
    CHECK(l->kind != SM_LINE_OVERLONG || l->length > SM_LINE_MAX);
    if (l->kind == SM_LINE_WHOLE && how->eol == SM_EOL_AUTO)
        CHECK(memchr(l->bytes, '\r', l->n) == NULL && memchr(l->bytes, '\n', l->n) == NULL);
    if (l->kind == SM_LINE_WHOLE && how->eol == SM_EOL_LF)
        CHECK(memchr(l->bytes, '\n', l->n) == NULL);
    if (how->strip_bit7)
        for (size_t i = 0; i < l->n; i++)
            CHECK((l->bytes[i] & 0x80) == 0);
}

/* The whole stream in chunks of up to `most` bytes; a hash of all lines. */
static uint64_t run(const struct stream *s, const struct sm_framing *how, bool fresh, size_t most)
{
    static uint16_t bad[SM_CHUNK_MAX];
    static struct sm_framer f;
    struct sm_line line;
    uint64_t hash = UINT64_C(0xcbf29ce484222325);
    size_t given = 0;

    sm_framer_init(&f, how, fresh);
    for (size_t i = 0; i < s->n;) {
        struct sm_chunk c = { .t_ns = time_of(s, i), .bytes = s->byte + i, .bad = bad };

        for (; c.n < most && i < s->n && time_of(s, i) == c.t_ns; i++) {
            if (is_bad(s, i))
                bad[c.n_bad++] = (uint16_t)c.n;
            c.n++;
        }
        if (sm_framer_deadline(&f) <= c.t_ns && sm_framer_tick(&f, c.t_ns, &line)) {
            check_line(how, &line, c.t_ns);
            hash = mix_line(hash, &line);
            given += line.n;
        }
        CHECK(sm_framer_feed(&f, &c) == SM_OK);
        CHECK(sm_framer_feed(&f, &c) == SM_EBUSY);
        while (sm_framer_next(&f, &line)) {
            check_line(how, &line, c.t_ns);
            hash = mix_line(hash, &line);
            given += line.n;
        }
        CHECK(!sm_framer_next(&f, &line));
    }
    const int64_t end_t_ns = s->n > 0 ? time_of(s, s->n - 1) : 0;
    if (sm_framer_end(&f, end_t_ns, &line)) {
        CHECK(line.kind == SM_LINE_CUT);
        hash = mix_line(hash, &line);
        given += line.n;
    }
    CHECK(given <= s->n);
    CHECK(!sm_framer_begun(&f) && !sm_framer_end(&f, end_t_ns, &line));
    return hash;
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct sm_framing how = { .gap_ns = GAP_NS };

    if (size < 3 || size > 65536)
        return 0;
    how.eol = (enum sm_eol)(data[0] % 7);
    how.strip_bit7 = (data[1] & 2) != 0;
    if (how.eol == SM_EOL_TEXT) { /* the stream's own first bytes */
        how.text_n = 1 + data[0] / 7 % 8;
        if (size < 3 + how.text_n)
            return 0;
        memcpy(how.text, data + 3, how.text_n);
    }
    const struct stream s = { data + 3, size - 3, data[2] };
    const bool fresh = (data[1] & 1) != 0;
    const uint64_t one = run(&s, &how, fresh, 1);

    CHECK(one == run(&s, &how, fresh, SM_CHUNK_MAX));
    CHECK(one == run(&s, &how, fresh, 2 + data[2] % 13));
    return 0;
}
