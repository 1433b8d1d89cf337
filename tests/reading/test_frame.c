/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_frame.c: where lines end, what is no line, and that cutting bytes differently changes
 * nothing. In inputs '!' marks the byte before it as bad, '~' is a break and '^' a NUL. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "base/time.h"
#include "reading/frame.h"

#define MS SM_NS_PER_MS
#define CHUNKS_MAX 6

struct marked { /* a chunk and its storage */
    struct sm_chunk chunk;
    unsigned char bytes[SM_CHUNK_MAX];
    uint16_t bad[SM_CHUNK_MAX];
};

static void mark(struct marked *m, int64_t t_ns, const char *s, size_t n)
{
    m->chunk = (struct sm_chunk){ .t_ns = t_ns, .bytes = m->bytes, .bad = m->bad };
    for (size_t i = 0; i < n; i++) {
        if (s[i] == '~' || s[i] == '^')
            m->bytes[m->chunk.n++] = 0;
        else if (s[i] != '!')
            m->bytes[m->chunk.n++] = (unsigned char)s[i];
        if (s[i] == '~' || s[i] == '!')
            m->bad[m->chunk.n_bad++] = (uint16_t)(m->chunk.n - 1);
    }
}

/* "whole(abc)@3 " for each line; long ones by their length only. */
static void tell(struct sm_text *t, const struct sm_line *l)
{
    sm_text_addf(t, "%s(", sm_line_kind_name(l->kind));
    if (l->n <= 32)
        sm_text_add_safe(t, l->bytes, l->n);
    else
        sm_text_addf(t, "%zu of %zu", l->n, l->length);
    sm_text_addf(t, ")@%d ", (int)(l->t_ns / MS));
}

static void feed(struct sm_framer *f, int64_t t_ns, const char *s, size_t n, struct sm_text *t)
{
    static struct marked m;
    struct sm_line line;

    mark(&m, t_ns, s, n);
    assert_int_equal(sm_framer_feed(f, &m.chunk), SM_OK);
    while (sm_framer_next(f, &line))
        tell(t, &line);
}

static void bytes_become_lines(void **state)
{
    static const struct {
        const char *name;
        struct sm_framing how;
        bool fresh;
        const char *chunk[CHUNKS_MAX]; /* the first at 1 ms, the second at 2 ms … */
        const char *want;
    } cases[] = {
        { "auto: CR, LF, CRLF and LFCR each end one line",
          { .eol = SM_EOL_AUTO },
          false,
          { "a\rb\nc\r\nd\n\re\r" },
          "whole(a)@1 whole(b)@1 whole(c)@1 whole(d)@1 whole(e)@1 " },
        { "auto: CRLF cut between chunks",
          { .eol = SM_EOL_AUTO },
          false,
          { "a\r", "\nb\r", "\n" },
          "whole(a)@1 whole(b)@2 " },
        { "auto: LFCR cut between chunks",
          { .eol = SM_EOL_AUTO },
          false,
          { "a\n", "\rb\n" },
          "whole(a)@1 whole(b)@2 " },
        { "auto: a doubled end is an empty line",
          { .eol = SM_EOL_AUTO },
          false,
          { "a\r\rb\r\n\r\n\r\nc\n\n" },
          "whole(a)@1 whole(b)@1 whole(c)@1 " },
        { "cr: LF is content",
          { .eol = SM_EOL_CR },
          false,
          { "a\r\nb\r" },
          "whole(a)@1 whole(\\x0ab)@1 " },
        { "lf: CR is content", { .eol = SM_EOL_LF }, false, { "a\r\n" }, "whole(a\\x0d)@1 " },
        { "crlf: only both, also cut apart",
          { .eol = SM_EOL_CRLF },
          false,
          { "a\rb\nc\r", "\n", "\r\nd\r\r\n" },
          "whole(a\\x0db\\x0ac)@2 whole(d\\x0d)@3 " },
        { "etx",
          { .eol = SM_EOL_ETX },
          false,
          { "\x02"
            "1.5\x03\x02"
            "2",
            ".5\x03" },
          "whole(\\x021.5)@1 whole(\\x022.5)@2 " },
        { "own text, its beginning twice",
          { .eol = SM_EOL_TEXT, .text = "aab", .text_n = 3 },
          false,
          { "1aaab2aab", "aa", "b3a", "ab" },
          "whole(1a)@1 whole(2)@1 whole(3)@4 " },
        { "own text does not reach back over an end",
          { .eol = SM_EOL_TEXT, .text = ";;", .text_n = 2 },
          false,
          { "1;;;2;;" },
          "whole(1)@1 whole(;2)@1 " },
        { "a time is that of the last byte, a first that of the first",
          { .eol = SM_EOL_AUTO },
          false,
          { "a", "b", "c", "\r" },
          "whole(abc)@4 " },
        { "the first, partial line is dropped and said",
          { .eol = SM_EOL_AUTO },
          true,
          { "4 mV\r\n12.5 mV\r\n" },
          "first(4 mV)@1 whole(12.5 mV)@1 " },
        { "opened between two lines: nothing was partial",
          { .eol = SM_EOL_AUTO },
          true,
          { "\n1\r\n" },
          "whole(1)@1 " },
        { "a NUL is content", { .eol = SM_EOL_AUTO }, false, { "a^b\r" }, "whole(a\\x00b)@1 " },
        { "a bad byte makes its line bad",
          { .eol = SM_EOL_AUTO },
          false,
          { "1?!2\r3\r" },
          "bad(1?2)@1 whole(3)@1 " },
        { "a bad byte ends no line",
          { .eol = SM_EOL_AUTO },
          false,
          { "-12\r!4.5 mV\r3\r" },
          "bad(-12\\x0d4.5 mV)@1 whole(3)@1 " },
        { "a bad byte is no part of an end",
          { .eol = SM_EOL_CRLF },
          false,
          { "1\r!\n2\r\n3\r\n" },
          "bad(1\\x0d\\x0a2)@1 whole(3)@1 " },
        { "a bad partner is content",
          { .eol = SM_EOL_AUTO },
          false,
          { "1\r", "\n!2\r3\r" },
          "whole(1)@1 bad(\\x0a2)@2 whole(3)@2 " },
        { "a break: the line before it, and its rest is bad",
          { .eol = SM_EOL_AUTO },
          false,
          { "-1~2.4 mV\r3\r" },
          "break(-1)@1 bad(2.4 mV)@1 whole(3)@1 " },
        { "a break between lines is said",
          { .eol = SM_EOL_AUTO },
          false,
          { "1\r~\r2\r" },
          "whole(1)@1 break()@1 whole(2)@1 " },
        { "a break in the first line",
          { .eol = SM_EOL_AUTO },
          true,
          { "1~2\r3\r" },
          "break(1)@1 bad(2)@1 whole(3)@1 " },
        { "seven bits with parity read as eight",
          { .eol = SM_EOL_AUTO, .strip_bit7 = true },
          false,
          { "\xb1\xb2\x8d" },
          "whole(12)@1 " },
        { "eight-bit rubbish stays as it is",
          { .eol = SM_EOL_AUTO },
          false,
          { "\xff\x80\r" },
          "whole(\\xff\\x80)@1 " },
    };
    (void)state;
    for (size_t c = 0; c < COUNT(cases); c++) {
        struct sm_framer f;
        char out[2000];
        struct sm_text t;

        sm_text_init(&t, out, sizeof out);
        sm_framer_init(&f, &cases[c].how, cases[c].fresh);
        for (size_t i = 0; i < CHUNKS_MAX && cases[c].chunk[i] != NULL; i++)
            feed(&f, (int64_t)(i + 1) * MS, cases[c].chunk[i], strlen(cases[c].chunk[i]), &t);
        if (strcmp(out, cases[c].want) != 0)
            fail_msg("%s:\n  got  %s\n  want %s", cases[c].name, out, cases[c].want);
    }
}

/* ---- a pause ends a line ---- */

static void a_pause_ends_a_line_by_tick_or_by_the_next_byte(void **state)
{
    const struct sm_framing how = { .eol = SM_EOL_GAP, .gap_ns = 50 * MS };
    struct sm_framer f;
    struct sm_line line;
    char out[400];
    struct sm_text t;
    (void)state;
    sm_text_init(&t, out, sizeof out);
    sm_framer_init(&f, &how, true);
    assert_true(sm_framer_deadline(&f) == SM_NEVER);
    feed(&f, 10 * MS, "tail", 4, &t);
    feed(&f, 60 * MS, "1\r\n", 3, &t); /* exactly the gap later */
    feed(&f, 109 * MS, "2", 1, &t);    /* just under it */
    assert_true(sm_framer_deadline(&f) == 159 * MS);
    assert_false(sm_framer_tick(&f, 159 * MS - 1, &line));
    assert_true(sm_framer_tick(&f, 200 * MS, &line));
    tell(&t, &line);
    assert_false(sm_framer_tick(&f, 300 * MS, &line));
    assert_true(sm_framer_deadline(&f) == SM_NEVER);
    feed(&f, 400 * MS, "3", 1, &t);
    feed(&f, 420 * MS, "~4", 2, &t); /* what follows a break is bad up to the gap */
    feed(&f, 500 * MS, "5", 1, &t);
    feed(&f, 499 * MS, "6", 1, &t); /* time stepped back: no gap */
    assert_true(sm_framer_tick(&f, 549 * MS, &line));
    tell(&t, &line);
    assert_string_equal(out, "first(tail)@10 whole(1\\x0d\\x0a2)@109 break(3)@420 bad(4)@420 "
                             "whole(56)@499 ");
    feed(&f, INT64_MAX - 1, "7", 1, &t);
    assert_true(sm_framer_deadline(&f) == SM_NEVER); /* no overflow */
}

/* ---- the ceiling ---- */

static void a_line_over_the_ceiling_is_given_at_once_and_the_next_is_whole(void **state)
{
    static const struct {
        struct sm_framing how;
        const char *end;
    } cases[] = { { { .eol = SM_EOL_AUTO }, "\r\n" },
                  { { .eol = SM_EOL_CRLF }, "\r\n" },
                  { { .eol = SM_EOL_TEXT, .text = "12345678", .text_n = 8 }, "12345678" } };
    (void)state;
    for (size_t c = 0; c < COUNT(cases); c++)
        for (size_t n = SM_LINE_MAX - 2; n < SM_LINE_MAX + 20; n++) {
            char long_line[SM_LINE_MAX + 64], out[200], want[80];
            struct sm_framer f;
            struct sm_text t;

            memset(long_line, 'x', n);
            memcpy(long_line + n, cases[c].end, strlen(cases[c].end));
            sm_text_init(&t, out, sizeof out);
            sm_framer_init(&f, &cases[c].how, false);
            feed(&f, MS, long_line, n + strlen(cases[c].end), &t);
            feed(&f, 2 * MS, "ok", 2, &t);
            feed(&f, 2 * MS, cases[c].end, strlen(cases[c].end), &t);
            if (n <= SM_LINE_MAX)
                snprintf(want, sizeof want, "whole(%zu of %zu)@1 whole(ok)@2 ", n, n);
            else /* given when the ceiling is passed and no end can begin before it */
                snprintf(want, sizeof want, "overlong(%d of %zu)@1 whole(ok)@2 ", SM_LINE_MAX,
                         SM_LINE_MAX + (c == 0 ? 1 : strlen(cases[c].end)));
            if (strcmp(out, want) != 0)
                fail_msg("%s, %zu bytes: got %s, want %s", sm_eol_name(cases[c].how.eol), n, out,
                         want);
        }
}

static void an_endless_line_is_one_event_and_no_growth(void **state)
{
    static char rubbish[SM_CHUNK_MAX];
    const struct sm_framing how = { .eol = SM_EOL_AUTO };
    struct sm_framer f;
    char out[400];
    struct sm_text t;
    (void)state;
    memset(rubbish, 0xd5, sizeof rubbish);
    sm_text_init(&t, out, sizeof out);
    sm_framer_init(&f, &how, false);
    for (int i = 1; i <= 1000; i++)
        feed(&f, i * MS, rubbish, sizeof rubbish, &t);
    assert_true(sm_framer_begun(&f));
    feed(&f, 2000 * MS, "~ tail\r1\r", 9, &t); /* also a break does not make its tail a line */
    assert_string_equal(out, "overlong(1024 of 1025)@1 break()@2000 whole(1)@2000 ");
    assert_false(sm_framer_begun(&f));
}

/* ---- refusals and ends ---- */

static void a_chunk_is_lent_until_drained(void **state)
{
    static const unsigned char bytes[5000] = { 'a', '\r', 'b', '\r' };
    static const uint16_t falling[] = { 2, 1 }, twice[] = { 1, 1 }, past[] = { 4 };
    const struct sm_framing how = { .eol = SM_EOL_AUTO };
    struct sm_framer f;
    struct sm_line line;
    struct sm_chunk c = { .t_ns = 1, .bytes = bytes, .n = 4 };
    (void)state;
    sm_framer_init(&f, &how, false);
    assert_int_equal(sm_framer_feed(&f, &c), SM_OK);
    assert_int_equal(sm_framer_feed(&f, &c), SM_EBUSY);
    assert_true(sm_framer_next(&f, &line));
    assert_int_equal(sm_framer_feed(&f, &c), SM_EBUSY);
    assert_true(sm_framer_next(&f, &line));
    assert_false(sm_framer_next(&f, &line));
    assert_false(sm_framer_next(&f, &line));
    c.n = SM_CHUNK_MAX + 1;
    assert_int_equal(sm_framer_feed(&f, &c), SM_EINVAL);
    c = (struct sm_chunk){ .bytes = bytes, .n = 4, .bad = falling, .n_bad = 2 };
    assert_int_equal(sm_framer_feed(&f, &c), SM_EINVAL);
    c.bad = twice;
    assert_int_equal(sm_framer_feed(&f, &c), SM_EINVAL);
    c.bad = past;
    c.n_bad = 1;
    assert_int_equal(sm_framer_feed(&f, &c), SM_EINVAL);
    c = (struct sm_chunk){ .bytes = bytes, .n = 0 };
    assert_int_equal(sm_framer_feed(&f, &c), SM_OK);
    assert_false(sm_framer_next(&f, &line));
}

static void a_link_that_ends_in_mid_line_gives_what_there_was(void **state)
{
    const struct sm_framing how = { .eol = SM_EOL_AUTO };
    struct sm_framer f;
    struct sm_line line;
    char out[400];
    struct sm_text t;
    (void)state;
    sm_text_init(&t, out, sizeof out);
    sm_framer_init(&f, &how, false);
    assert_false(sm_framer_end(&f, MS, &line));
    sm_framer_init(&f, &how, false);
    feed(&f, 2 * MS, "-12", 3, &t);
    assert_true(sm_framer_begun(&f));
    assert_true(sm_framer_end(&f, 9 * MS, &line));
    tell(&t, &line);
    feed(&f, 10 * MS, ".4 mV\r1\r", 8, &t); /* back: never glued to what there was */
    assert_string_equal(out, "cut(-12)@9 first(.4 mV)@10 whole(1)@10 ");
}

/* ---- cutting ---- */

static uint64_t next_random(uint64_t *s) /* xorshift64, from memory */
{
    *s ^= *s << 13;
    *s ^= *s >> 7;
    *s ^= *s << 17;
    return *s;
}

#define STREAM 3000

struct stream {
    unsigned char byte[STREAM];
    bool bad[STREAM];
    int64_t t_ns[STREAM];
};

static void make_stream(struct stream *s, uint64_t *rnd)
{
    static const unsigned char often[] = { '\r', '\n', 3, ';', '0', '1', '.', ' ', 0, 0x8d, 0xff };
    const uint64_t plain = next_random(rnd) % 8; /* some streams have long lines */
    int64_t t_ns = 1000;

    for (size_t i = 0; i < STREAM; i++) {
        if (next_random(rnd) % 20 == 0)
            t_ns += (int64_t)(next_random(rnd) % (80 * (uint64_t)MS));
        s->t_ns[i] = t_ns;
        s->byte[i] = next_random(rnd) % 8 < plain || next_random(rnd) % 64 >= 63 - 60 / (plain + 1)
                         ? (unsigned char)('a' + next_random(rnd) % 26)
                         : often[next_random(rnd) % sizeof often];
        s->bad[i] = next_random(rnd) % 100 == 0;
    }
}

/* Everything about every line, cut at random (rnd NULL: one byte at a time). */
static size_t lines_of(const struct stream *s, const struct sm_framing *how, bool fresh,
                       uint64_t *rnd, char *out, size_t cap)
{
    static struct marked m;
    struct sm_framer f;
    struct sm_line line;
    struct sm_text t;
    size_t lines = 0;

    sm_text_init(&t, out, cap);
    sm_framer_init(&f, how, fresh);
    for (size_t i = 0; i < STREAM;) {
        const size_t most = rnd == NULL ? 1 : 1 + next_random(rnd) % 300;

        m.chunk = (struct sm_chunk){ .t_ns = s->t_ns[i], .bytes = m.bytes, .bad = m.bad };
        while (m.chunk.n < most && i < STREAM && s->t_ns[i] == m.chunk.t_ns) {
            if (s->bad[i])
                m.bad[m.chunk.n_bad++] = (uint16_t)m.chunk.n;
            m.bytes[m.chunk.n++] = s->byte[i++];
        }
        assert_int_equal(sm_framer_feed(&f, &m.chunk), SM_OK);
        for (; sm_framer_next(&f, &line); lines++) {
            assert_true(line.n <= SM_LINE_MAX && line.n <= line.length);
            assert_true(line.first_t_ns <= line.t_ns && line.t_ns <= m.chunk.t_ns);
            sm_text_addf(&t, "%d %lld %lld %zu ", (int)line.kind, (long long)line.first_t_ns,
                         (long long)line.t_ns, line.length);
            sm_text_add_safe(&t, line.bytes, line.n);
            sm_text_add(&t, "\n");
        }
    }
    assert_false(t.cut);
    return lines;
}

static void cutting_the_same_bytes_differently_gives_the_same_lines(void **state)
{
    static const struct sm_framing how[] = {
        { .eol = SM_EOL_AUTO },
        { .eol = SM_EOL_AUTO, .strip_bit7 = true },
        { .eol = SM_EOL_CR },
        { .eol = SM_EOL_LF },
        { .eol = SM_EOL_CRLF },
        { .eol = SM_EOL_ETX },
        { .eol = SM_EOL_GAP, .gap_ns = 20 * MS },
        { .eol = SM_EOL_TEXT, .text = ";\r", .text_n = 2 },
        { .eol = SM_EOL_TEXT, .text = "a", .text_n = 1 },
    };
    const size_t cap = 200000;
    char *one = malloc(cap), *other = malloc(cap);
    static struct stream s;
    size_t lines = 0;
    (void)state;
    assert_true(one != NULL && other != NULL);
    for (uint64_t seed = 1; seed <= 40; seed++)
        for (size_t h = 0; h < COUNT(how); h++) {
            uint64_t rnd = seed * 0x9e3779b97f4a7c15 + h;

            make_stream(&s, &rnd);
            lines += lines_of(&s, &how[h], seed % 2 == 0, NULL, one, cap);
            for (int again = 0; again < 3; again++) {
                (void)lines_of(&s, &how[h], seed % 2 == 0, &rnd, other, cap);
                if (strcmp(one, other) != 0)
                    fail_msg("seed %llu, eol %s: cut differently, other lines:\n%s\n---\n%s",
                             (unsigned long long)seed, sm_eol_name(how[h].eol), one, other);
            }
        }
    print_message("seeds 1 to 40, %zu lines\n", lines);
    assert_true(lines > 10000);
    free(one);
    free(other);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(bytes_become_lines),
        cmocka_unit_test(a_pause_ends_a_line_by_tick_or_by_the_next_byte),
        cmocka_unit_test(a_line_over_the_ceiling_is_given_at_once_and_the_next_is_whole),
        cmocka_unit_test(an_endless_line_is_one_event_and_no_growth),
        cmocka_unit_test(a_chunk_is_lent_until_drained),
        cmocka_unit_test(a_link_that_ends_in_mid_line_gives_what_there_was),
        cmocka_unit_test(cutting_the_same_bytes_differently_gives_the_same_lines)
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
