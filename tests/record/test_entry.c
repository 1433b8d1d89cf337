/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_entry.c: inputs to the log and back, and lines that are refused. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>

#include "made_up.h"
#include "record/entry.h"

static char storage[SM_ENTRY_MAX];

/* One line into storage, without its newline. */
static size_t line_of(const struct sm_input *in)
{
    struct sm_text t;

    sm_text_init(&t, storage, sizeof storage);
    sm_entry_input(&t, in);
    assert_false(t.cut);
    assert_true(t.len > 1 && t.buf[t.len - 1] == '\n');
    assert_null(memchr(t.buf, '\n', t.len - 1));
    t.buf[t.len - 1] = '\0';
    return t.len - 1;
}

static void expect_line(const struct sm_input *in, const char *want)
{
    line_of(in);
    assert_string_equal(storage, want);
}

static void inputs_are_written_as_the_samples_show(void **state)
{
    struct sm_input in = {
        .kind = SM_INPUT_TICK, .n = 61874, .t_ns = 1746600000000, .utc_us = 1796114469600000
    };
    const uint16_t bad[] = { 1 };

    (void)state;
    expect_line(&in, "{\"n\":61874,\"t\":1746600000000,\"utc\":\"2026-12-01T08:41:09.600000Z\","
                     "\"k\":\"tick\"}");
    in.kind = SM_INPUT_BYTES;
    in.chunk.bytes = (const unsigned char *)"-0012.4 mV\\\"\x80\r\n";
    in.chunk.n = 15;
    expect_line(&in, "{\"n\":61874,\"t\":1746600000000,\"utc\":\"2026-12-01T08:41:09.600000Z\","
                     "\"k\":\"bytes\",\"b\":\"-0012.4 mV\\\\\\\"\\u0080\\u000d\\u000a\"}");
    in.chunk.bytes = (const unsigned char *)"7\0";
    in.chunk.n = 2;
    in.chunk.bad = bad;
    in.chunk.n_bad = 1;
    expect_line(&in, "{\"n\":61874,\"t\":1746600000000,\"utc\":\"2026-12-01T08:41:09.600000Z\","
                     "\"k\":\"bytes\",\"b\":\"7\\u0000\",\"bad\":[1]}");
    in.kind = SM_INPUT_SENT;
    in.sent_of = 61875;
    expect_line(&in, "{\"n\":61874,\"t\":1746600000000,\"utc\":\"2026-12-01T08:41:09.600000Z\","
                     "\"k\":\"sent\",\"of\":61875}");
    in = (struct sm_input){
        .kind = SM_INPUT_ACT, .n = 61882, .t_ns = 1751020118044, .utc_us = 1796114474020119
    };
    in.act = (struct sm_act){ .act = SM_ACT_NEXT,
                              .id = "7f2c-19",
                              .has_seen = true,
                              .seen = 61879,
                              .who = "bench-a",
                              .door = "socket",
                              .has_uid = true,
                              .uid = 1000 };
    expect_line(&in, "{\"n\":61882,\"t\":1751020118044,\"utc\":\"2026-12-01T08:41:14.020119Z\","
                     "\"k\":\"act\",\"act\":\"next\",\"id\":\"7f2c-19\",\"seen\":61879,"
                     "\"who\":\"bench-a\",\"door\":\"socket\",\"peer\":{\"uid\":1000}}");
    in.act = (struct sm_act){ .act = SM_ACT_SHEET,
                              .id = "a",
                              .sheet_file = "conf/sheets/m.yaml",
                              .sheet_text = "items:\n",
                              .sheet_text_n = 7 };
    expect_line(&in, "{\"n\":61882,\"t\":1751020118044,\"utc\":\"2026-12-01T08:41:14.020119Z\","
                     "\"k\":\"act\",\"act\":\"sheet\",\"id\":\"a\",\"file\":\"conf/sheets/m.yaml\","
                     "\"text\":\"items:\\u000a\"}");
}

static void text_that_is_not_utf8_is_written_without_growing(void **state)
{
    struct sm_input in = { .kind = SM_INPUT_ACT, .n = 1 };

    (void)state;
    in.act = (struct sm_act){ .act = SM_ACT_NOTE, .id = "a", .text = "a\xff\xc3z\xed\xa0\x80" };
    expect_line(&in, "{\"n\":1,\"t\":0,\"utc\":\"1970-01-01T00:00:00.000000Z\",\"k\":\"act\","
                     "\"act\":\"note\",\"id\":\"a\",\"text\":\"a??z???\"}");
}

/* What a random input is made of. */
struct storage {
    unsigned char bytes[SM_BYTES_MAX];
    uint16_t bad[SM_BYTES_MAX];
    char sheet[4096];
};

static void make_bytes(struct made_up *m, struct sm_input *in, struct storage *s)
{
    in->chunk = (struct sm_chunk){ .t_ns = in->t_ns, .bytes = s->bytes };
    in->chunk.n = made_up_below(m, 3) == 0 ? SM_BYTES_MAX : made_up_below(m, 80);
    for (size_t i = 0; i < in->chunk.n; i++) {
        s->bytes[i] = (unsigned char)made_up_next(m);
        if (made_up_below(m, 9) == 0)
            s->bad[in->chunk.n_bad++] = (uint16_t)i;
    }
    in->chunk.bad = in->chunk.n_bad > 0 ? s->bad : NULL;
}

static void make_act(struct made_up *m, struct sm_act *a, struct storage *s)
{
    a->act = (enum sm_act_kind)made_up_below(m, SM_ACT_COUNT);
    made_up_id(m, a->id, sizeof a->id);
    if ((a->has_seen = made_up_chance(m)))
        a->seen = (int64_t)made_up_next(m);
    made_up_text(m, a->who, sizeof a->who, false);
    made_up_text(m, a->door, sizeof a->door, false);
    if ((a->has_uid = made_up_chance(m)))
        a->uid = made_up_int(m);
    made_up_text(m, a->why, sizeof a->why, false);
    if ((a->has_temperature = made_up_chance(m)))
        a->temperature_c = made_up_real(m);
    if ((a->has_subject = made_up_chance(m)))
        a->subject = made_up_int(m);
    if (a->act != SM_ACT_SHEET) {
        made_up_text(m, a->text, sizeof a->text, false);
        return;
    }
    made_up_text(m, a->sheet_file, sizeof a->sheet_file, false);
    made_up_text(m, a->sheet_why, sizeof a->sheet_why, false);
    if (made_up_chance(m)) {
        made_up_text(m, s->sheet, sizeof s->sheet, false);
        a->sheet_text = s->sheet;
        a->sheet_text_n = strlen(s->sheet);
    }
}

static void make_input(struct made_up *m, struct sm_input *in, struct storage *s)
{
    memset(in, 0, sizeof *in);
    in->kind = (enum sm_input_kind)made_up_below(m, SM_INPUT_COUNT);
    in->n = 1 + made_up_int(m) / 2;
    in->t_ns = made_up_int(m);
    in->utc_us = made_up_int(m) % INT64_C(250000000000000000);
    if (in->kind == SM_INPUT_BYTES)
        make_bytes(m, in, s);
    if (in->kind == SM_INPUT_ACT)
        make_act(m, &in->act, s);
    if (in->kind == SM_INPUT_LINK) {
        in->link.state = (enum sm_link_state)made_up_below(m, 3);
        made_up_text(m, in->link.why, sizeof in->link.why, false);
        made_up_text(m, in->link.port, sizeof in->link.port, false);
        made_up_text(m, in->link.device, sizeof in->link.device, false);
        made_up_text(m, in->link.identity, sizeof in->link.identity, false);
        made_up_text(m, in->link.settings, sizeof in->link.settings, false);
        in->link.continues = made_up_chance(m);
    }
    if (in->kind == SM_INPUT_CLOCK) {
        in->clock_what = (enum sm_clock_what)made_up_below(m, 2);
        in->clock_by_us = (int64_t)made_up_next(m);
    }
    if (in->kind == SM_INPUT_SENT)
        in->sent_of = made_up_int(m);
}

/* Same bytes but for what is lent, and what is lent has the same contents. */
static bool same_input(const struct sm_input *a, const struct sm_input *b)
{
    static struct sm_input x, y; /* large */

    if (a->chunk.n != b->chunk.n || a->chunk.n_bad != b->chunk.n_bad ||
        a->act.sheet_text_n != b->act.sheet_text_n ||
        (a->act.sheet_text == NULL) != (b->act.sheet_text == NULL))
        return false;
    if ((a->chunk.n > 0 && memcmp(a->chunk.bytes, b->chunk.bytes, a->chunk.n) != 0) ||
        (a->chunk.n_bad > 0 &&
         memcmp(a->chunk.bad, b->chunk.bad, a->chunk.n_bad * sizeof *a->chunk.bad) != 0) ||
        (a->act.sheet_text != NULL &&
         memcmp(a->act.sheet_text, b->act.sheet_text, a->act.sheet_text_n) != 0))
        return false;
    memcpy(&x, a, sizeof x);
    memcpy(&y, b, sizeof y);
    x.chunk.bytes = y.chunk.bytes = NULL;
    x.chunk.bad = y.chunk.bad = NULL;
    x.act.sheet_text = y.act.sheet_text = NULL;
    return memcmp(&x, &y, sizeof x) == 0;
}

static void any_input_comes_back_field_by_field(void **state)
{
    static struct storage s;
    static struct sm_entry_store store;
    static struct sm_entry e;
    static struct sm_input in;
    char why[SM_REASON_SIZE];

    (void)state;
    sm_entry_store_init(&store);
    for (uint64_t seed = 1; seed <= 3000; seed++) {
        struct made_up m = { seed };
        size_t n;

        make_input(&m, &in, &s);
        n = line_of(&in);
        if (sm_entry_read(storage, n, &store, &e, why) != SM_OK)
            fail_msg("seed %llu: %s refused: %s", (unsigned long long)seed, storage, why);
        if (e.kind != SM_ENTRY_INPUT || e.passed_over != 0 || !same_input(&in, &e.input))
            fail_msg("seed %llu: %s comes back differently", (unsigned long long)seed, storage);
        json_decref(e.json);
    }
    sm_entry_store_finish(&store);
}

static void what_is_not_known_is_passed_over_and_counted(void **state)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    char why[SM_REASON_SIZE];
    static const struct {
        const char *line;
        enum sm_entry_kind kind;
        unsigned passed_over;
    } cases[] = {
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\",\"colour\":3,\"x\":[]}",
          SM_ENTRY_INPUT, 2 },
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"act\",\"act\":\"next\","
          "\"peer\":{\"uid\":1,\"pid\":2}}",
          SM_ENTRY_INPUT, 1 },
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"act\",\"act\":\"fly\"}",
          SM_ENTRY_UNKNOWN, 0 },
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"weather\",\"rain\":true}",
          SM_ENTRY_UNKNOWN, 0 },
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"reading\"}", SM_ENTRY_UNKNOWN,
          0 },
        { "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"not-settled\"}",
          SM_ENTRY_EVENT, 0 },
        { "{\"n\":1.0,\"t\":2e3,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"sent\",\"of\":7.0}",
          SM_ENTRY_INPUT, 0 },
    };

    (void)state;
    sm_entry_store_init(&store);
    for (size_t i = 0; i < COUNT(cases); i++) {
        if (sm_entry_read(cases[i].line, strlen(cases[i].line), &store, &e, why) != SM_OK)
            fail_msg("%s: %s", cases[i].line, why);
        if (e.kind != cases[i].kind || (cases[i].passed_over != 0) != (e.passed_over != 0))
            fail_msg("%s: kind %d, want %d; passed over %u, want %u", cases[i].line, (int)e.kind,
                     (int)cases[i].kind, e.passed_over, cases[i].passed_over);
        json_decref(e.json);
    }
    assert_int_equal(e.t_ns, 2000);
    assert_int_equal(e.input.sent_of, 7);
}

#define HEAD "{\"n\":1,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":"

static void a_line_that_is_no_entry_is_refused_with_a_reason(void **state)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    static const char *const lines[] = {
        "",
        "{",
        "[]",
        "null",
        " {}",
        "{}",
        "x",
        HEAD "\"tick\"} ",
        HEAD "\"tick\"}x",
        HEAD "\"tick\",\"k\":\"tick\"}", /* a key twice */
        HEAD "7}",
        HEAD "\"a\\u0000b\"}", /* no kind */
        "{\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":0,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":1.5,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":1e300,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":99999999999999999999,\"t\":0,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":1,\"t\":-1,\"utc\":\"2026-12-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":1,\"t\":0,\"utc\":\"2026-13-01T08:12:03Z\",\"k\":\"tick\"}",
        "{\"n\":1,\"t\":0,\"utc\":7,\"k\":\"tick\"}",
        HEAD "\"bytes\"}",
        HEAD "\"bytes\",\"b\":7}",
        HEAD "\"bytes\",\"b\":\"\\u0100\"}",
        HEAD "\"bytes\",\"b\":\"\xff\"}", /* not UTF-8 */
        HEAD "\"bytes\",\"b\":\"ab\",\"bad\":[2]}",
        HEAD "\"bytes\",\"b\":\"ab\",\"bad\":[1,0]}",
        HEAD "\"bytes\",\"b\":\"ab\",\"bad\":[0,0]}",
        HEAD "\"bytes\",\"b\":\"ab\",\"bad\":[-1]}",
        HEAD "\"bytes\",\"b\":\"ab\",\"bad\":0}",
        HEAD "\"act\"}",
        HEAD "\"act\",\"act\":7}",
        HEAD "\"act\",\"act\":\"next\",\"peer\":7}",
        HEAD "\"act\",\"act\":\"next\",\"id\":\"a\\u0000b\"}",
        HEAD "\"act\",\"act\":\"temperature\",\"temperature\":\"25\"}",
        HEAD "\"act\",\"act\":\"sheet\",\"text\":[]}",
        HEAD "\"link\",\"state\":\"sideways\"}",
        HEAD "\"link\"}",
        HEAD "\"clock\",\"what\":\"jump\"}",
        HEAD "\"clock\",\"what\":\"back\",\"by_us\":1}",
        HEAD "\"sent\"}",
        HEAD "\"sent\",\"of\":-1}",
        HEAD "\"tick\",\"x\":[[[[[[[[[[[[[[[[[[[[]]]]]]]]]]]]]]]]]]]]}",
    };

    (void)state;
    sm_entry_store_init(&store);
    for (size_t i = 0; i < COUNT(lines); i++) {
        char why[SM_REASON_SIZE] = "";

        if (sm_entry_read(lines[i], strlen(lines[i]), &store, &e, why) != SM_ESYNTAX)
            fail_msg("%s: was taken for an entry", lines[i]);
        if (why[0] == '\0')
            fail_msg("%s: refused without a reason", lines[i]);
    }
}

/* HEAD "tick","x": and n times a piece, or n bytes of text. */
static void expect_refused(const char *piece, size_t times, const char *want)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    char why[SM_REASON_SIZE] = "";
    const size_t n = strlen(piece), cap = strlen(HEAD) + n * times + 64;
    char *line = malloc(cap);
    size_t len;

    assert_non_null(line);
    len = (size_t)snprintf(line, cap, HEAD "\"tick\",\"x\":");
    for (size_t i = 0; i < times; i++, len += n)
        memcpy(line + len, piece, n);
    line[len++] = '}';
    sm_entry_store_init(&store);
    if (sm_entry_read(line, len, &store, &e, why) != SM_ESYNTAX)
        fail_msg("%zu times %s: was taken for an entry", times, piece);
    if (strstr(why, want) == NULL)
        fail_msg("%zu times %s: refused as \"%s\", want \"%s\"", times, piece, why, want);
    free(line);
}

static void lines_beyond_the_ceilings_are_refused(void **state)
{
    (void)state;
    expect_refused("[", 100000, "too deep");
    expect_refused("{\"a\":", 100000, "too deep");
    expect_refused("[],", 100000, "too many parts");
    expect_refused("a", SM_ENTRY_MAX, "longer than 1 MiB");
}

/* The quick reader agrees with the thorough one on line[n], or leaves it to it. True: it took it.
 */
static bool quick_agrees(const char *line, size_t n)
{
    static struct sm_entry quick, thorough;
    static struct sm_entry_store a, b;
    char why[SM_REASON_SIZE];

    if (!sm_entry_read_quick(line, n, &a, &quick))
        return false;
    if (sm_entry_read(line, n, &b, &thorough, why) != SM_OK)
        fail_msg("read quickly, but refused: %s: %.*s", why, (int)n, line);
    json_decref(thorough.json);
    assert_int_equal(quick.kind, thorough.kind);
    assert_string_equal(quick.k, thorough.k);
    assert_int_equal(quick.n, thorough.n);
    assert_int_equal(quick.t_ns, thorough.t_ns);
    assert_int_equal(quick.utc_us, thorough.utc_us);
    assert_int_equal(quick.passed_over, thorough.passed_over);
    assert_null(quick.json);
    assert_int_equal(quick.input.kind, thorough.input.kind);
    assert_int_equal(quick.input.n, thorough.input.n);
    assert_int_equal(quick.input.t_ns, thorough.input.t_ns);
    assert_int_equal(quick.input.utc_us, thorough.input.utc_us);
    if (quick.input.kind != SM_INPUT_BYTES)
        return true;
    assert_int_equal(quick.input.chunk.t_ns, thorough.input.chunk.t_ns);
    assert_int_equal(quick.input.chunk.n, thorough.input.chunk.n);
    assert_memory_equal(quick.input.chunk.bytes, thorough.input.chunk.bytes, quick.input.chunk.n);
    assert_int_equal(quick.input.chunk.n_bad, thorough.input.chunk.n_bad);
    return true;
}

static void the_quick_reader_agrees_with_the_thorough_one(void **state)
{
    static unsigned char bytes[SM_BYTES_MAX];
    static char changed[8 * SM_BYTES_MAX];
    struct sm_input in = {
        .kind = SM_INPUT_TICK, .n = 7, .t_ns = 1746600000000, .utc_us = 1796114469600000
    };
    size_t n, taken = 0;

    (void)state;
    assert_true(quick_agrees(storage, line_of(&in)));
    in.kind = SM_INPUT_BYTES;
    in.chunk.bytes = bytes;
    for (size_t i = 0; i < sizeof bytes; i++)
        bytes[i] = (unsigned char)(i + i / 256);
    for (in.chunk.n = 0; in.chunk.n <= 300; in.chunk.n++)
        assert_true(quick_agrees(storage, line_of(&in)));
    in.chunk.n = SM_BYTES_MAX;
    assert_true(quick_agrees(storage, line_of(&in)));

    /* any byte of a line changed to any other, and any one left out */
    in.chunk.bytes = (const unsigned char *)"-1.4 \"\\\x80\r\n";
    in.chunk.n = 11;
    n = line_of(&in);
    for (size_t at = 0; at < n; at++) {
        for (int c = 0; c < 256; c++) {
            memcpy(changed, storage, n);
            changed[at] = (char)c;
            taken += quick_agrees(changed, n);
        }
        memcpy(changed, storage, at);
        memcpy(changed + at, storage + at + 1, n - at - 1);
        taken += quick_agrees(changed, n - 1);
    }
    assert_true(taken > n); /* some changes leave an entry */
    in.chunk.n = 0;
    n = line_of(&in);
    memcpy(changed, storage, n - 2);
    for (size_t more = 0; more <= 2; more++) { /* a byte more than an entry may have */
        const size_t len = n - 2 + SM_BYTES_MAX + more;
        memset(changed + n - 2, 'x', SM_BYTES_MAX + more);
        memcpy(changed + len, "\"}", 2);
        assert_int_equal(quick_agrees(changed, len + 2), more == 0);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(inputs_are_written_as_the_samples_show),
        cmocka_unit_test(text_that_is_not_utf8_is_written_without_growing),
        cmocka_unit_test(any_input_comes_back_field_by_field),
        cmocka_unit_test(what_is_not_known_is_passed_over_and_counted),
        cmocka_unit_test(a_line_that_is_no_entry_is_refused_with_a_reason),
        cmocka_unit_test(lines_beyond_the_ceilings_are_refused),
        cmocka_unit_test(the_quick_reader_agrees_with_the_thorough_one),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
