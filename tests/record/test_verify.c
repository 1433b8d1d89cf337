/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_verify.c: what a log may be, what it may not be, and where it is hurt. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "record/verify.h"
#include "small_log.h"

static char storage[256 * 1024], copy[256 * 1024];

/* A closed log of about 10 KiB in storage; its length. */
static size_t make_log(struct small_log *l, unsigned groups, bool close)
{
    small_log_begin(l, storage, sizeof storage);
    small_log_open(l, 411, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    small_log_fill(l, groups);
    if (close)
        small_log_close(l);
    return l->t.len;
}

static void a_whole_log_verifies_and_says_what_it_is(void **state)
{
    struct small_log l;
    struct sm_verify v;
    const size_t n = make_log(&l, 9, true);

    (void)state;
    sm_verify(storage, n, NULL, &v);
    if (!v.good)
        fail_msg("%s", v.why);
    assert_int_equal(v.stamps, 10);
    assert_int_equal(v.signed_stamps, 4);
    assert_int_equal(v.ordinal, 412);
    assert_string_equal(v.meter, "bench-2");
    assert_string_equal(v.key, l.key);
    assert_string_equal(v.last_stamp, l.hash);
    assert_int_equal(v.last_stamp_n, l.n - 1);
    assert_int_equal(v.last_signed_n, l.n - 1);
    assert_int_equal(v.first_n, 58210);
    assert_int_equal(v.last_n, l.n - 2);
    assert_int_equal(v.last_line_n, l.n - 1);
    assert_int_equal(v.stamped_bytes, n);
    assert_int_equal(v.after_lines, 0);
    assert_int_equal(v.after_bytes, 0);
    assert_true(v.closed);
    assert_true(v.previous.has);
    assert_int_equal(v.previous.ordinal, 411);
    assert_string_equal(v.previous.stamp,
                        "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    small_log_end(&l);
}

/* n of the entry that a byte belongs to, in the log as it was written. */
static int64_t entry_at(const char *text, size_t at)
{
    while (at > 0 && text[at - 1] != '\n')
        at--;
    return strtoll(text + at + 5, NULL, 10);
}

/* One byte changed at every place in so many ways. */
static void flip_everywhere(size_t n, size_t ways)
{
    static const unsigned char masks[] = { 0x01, 0x20, 0xff, 0x02, 0x04, 0x08, 0x10, 0x40, 0x80 };
    size_t hurt = 0;

    assert_true(ways <= COUNT(masks));
    for (size_t at = 0; at < n; at++)
        for (size_t m = 0; m < ways; m++) {
            struct sm_verify v;
            const int64_t entry = entry_at(storage, at);

            memcpy(copy, storage, n);
            copy[at] = (char)(copy[at] ^ masks[m]);
            sm_verify(copy, n, NULL, &v);
            if (v.good)
                fail_msg("byte %zu (entry %lld) ^ %02x: still good", at, (long long)entry,
                         masks[m]);
            if (entry < v.bad_from || entry > v.bad_to)
                fail_msg("byte %zu (entry %lld) ^ %02x: names entries %lld to %lld (%s)", at,
                         (long long)entry, masks[m], (long long)v.bad_from, (long long)v.bad_to,
                         v.why);
            if (v.why[0] == '\0')
                fail_msg("byte %zu ^ %02x: no reason", at, masks[m]);
            hurt++;
        }
    assert_int_equal(hurt, n * ways);
}

static void one_changed_byte_anywhere_names_its_group(void **state)
{
    struct small_log l;
    const size_t n = make_log(&l, 11, true);

    (void)state;
    assert_in_range(n, 9000, 12 * 1024);
    flip_everywhere(n, 3);
    small_log_end(&l);
}

static void one_changed_byte_names_its_group_where_the_last_stamp_is_unsigned(void **state)
{
    struct small_log l;
    const size_t n = make_log(&l, 2, false);

    (void)state;
    flip_everywhere(n, 9);
    small_log_end(&l);
}

static void the_groups_before_the_damage_stand(void **state)
{
    struct small_log l;
    struct sm_verify v;
    const size_t n = make_log(&l, 9, true);
    char *hurt = strstr(storage, "-055.2 mV"); /* in the sixth group: 58210 + 8 + 4 * 6 … */

    (void)state;
    assert_non_null(hurt);
    hurt[2] = '6';
    sm_verify(storage, n, NULL, &v);
    assert_false(v.good);
    assert_false(v.bad_after);
    assert_int_equal(v.stamps, 5);
    assert_int_equal(v.bad_from, 58210 + 2 + 5 * 6);
    assert_int_equal(v.bad_to, 58210 + 2 + 5 * 6 + 5);
    assert_int_equal(v.bad_line, 0); /* every line of it still parses */
    hurt[-1] = 'x';                  /* the quote in front */
    sm_verify(storage, n, NULL, &v);
    assert_int_equal(v.bad_line, 2 + 5 * 6 + 3);
    assert_int_equal(v.last_line_n, l.n - 1);
    small_log_end(&l);
}

/* The last stamp's line that is whole within cut bytes, found without sm_verify. */
static void last_whole_stamp(size_t cut, size_t *ret_end, int64_t *ret_n, int64_t *ret_lines)
{
    *ret_end = 0;
    *ret_n = 0;
    *ret_lines = 0;
    for (size_t at = 0; at < cut;) {
        const char *newline = memchr(storage + at, '\n', cut - at);
        const char *kind;

        if (newline == NULL)
            return;
        kind = strstr(storage + at, "\"k\":\"");
        (*ret_lines)++;
        if (strncmp(kind, "\"k\":\"stamp\"", 11) == 0) {
            *ret_end = (size_t)(newline + 1 - storage);
            *ret_n = entry_at(storage, at);
            *ret_lines = 0;
        }
        at = (size_t)(newline + 1 - storage);
    }
}

static void a_log_cut_at_any_byte_verifies_up_to_its_last_stamp(void **state)
{
    struct small_log l;
    const size_t n = make_log(&l, 9, true);

    (void)state;
    for (size_t cut = 0; cut <= n; cut++) {
        struct sm_verify v;
        size_t end;
        int64_t stamp, lines;

        memcpy(copy, storage, n);
        memset(copy + cut, 'x', n - cut); /* nothing behind may be looked at */
        last_whole_stamp(cut, &end, &stamp, &lines);
        sm_verify(copy, cut, NULL, &v);
        if (!v.good)
            fail_msg("cut at %zu: %s", cut, v.why);
        if (v.stamped_bytes != end || v.last_stamp_n != stamp)
            fail_msg("cut at %zu: stamped %zu up to entry %lld, want %zu up to %lld", cut,
                     v.stamped_bytes, (long long)v.last_stamp_n, end, (long long)stamp);
        if (v.after_lines != lines || v.after_bytes != cut - end)
            fail_msg("cut at %zu: after it %lld lines, %zu bytes, want %lld, %zu", cut,
                     (long long)v.after_lines, v.after_bytes, (long long)lines, cut - end);
        if (v.closed != (cut == n))
            fail_msg("cut at %zu: closed %d", cut, v.closed);
    }
    small_log_end(&l);
}

static void another_signer_is_told_from_the_one_given(void **state)
{
    const unsigned char seed[32] = { 9 };
    struct small_log l;
    struct sm_verify v;
    struct sm_signer *other;
    char key[SM_KEY_HEX];
    const size_t n = make_log(&l, 3, true);

    (void)state;
    assert_int_equal(sm_signer_create(seed, &other), SM_OK);
    sm_signer_public(other, key);
    sm_verify(storage, n, l.key, &v);
    assert_true(v.good);
    sm_verify(storage, n, key, &v);
    assert_false(v.good);
    assert_string_equal(v.why, "the signature in its stamp is not by the key given");
    sm_signer_destroy(other);
    small_log_end(&l);
}

static void a_stamp_must_have_the_time_of_the_entry_before_it(void **state)
{
    struct small_log l;
    struct sm_verify v;

    (void)state;
    make_log(&l, 1, false);
    small_log_bytes(&l, "7 mV\r\n");
    small_log_time(&l, 1);
    small_log_stamp(&l, true);
    sm_verify(storage, l.t.len, NULL, &v);
    assert_false(v.good);
    assert_string_equal(v.why, "its stamp does not have the time of the entry before it");
    small_log_end(&l);
}

static void what_is_no_log_at_all_is_judged_without_harm(void **state)
{
    struct sm_verify v;
    char *big = malloc(3000000);

    (void)state;
    sm_verify("", 0, NULL, &v);
    assert_true(v.good);
    assert_int_equal(v.stamps, 0);
    sm_verify("\n\n\n", 3, NULL, &v);
    assert_false(v.good);
    sm_verify("hello\n", 6, NULL, &v);
    assert_false(v.good);
    assert_int_equal(v.bad_line, 1);
    assert_non_null(big);
    memset(big, '[', 3000000);
    sm_verify(big, 3000000, NULL, &v); /* one endless line: torn, for all that can be told */
    assert_int_equal(v.stamps, 0);
    memset(big, '\n', 3000000);
    sm_verify(big, 3000000, NULL, &v);
    assert_false(v.good);
    free(big);
}

/* What the two headers say of one another: empty where they go together. */
static void expect_chain(struct sm_verify *a, struct sm_verify *b, const char *want)
{
    char why[SM_REASON_SIZE] = "";
    const enum sm_status st = sm_verify_chain(a, b, why);

    if ((st == SM_OK) != (want[0] == '\0') || strcmp(why, want) != 0)
        fail_msg("status %d, \"%s\", want \"%s\"", st, why, want);
}

static void files_must_follow_one_another(void **state)
{
    struct sm_verify a = { .good = true, .meter = "bench-2", .ordinal = 412, .last_stamp = "5d1e" };
    struct sm_verify b = { .good = true, .meter = "bench-2", .ordinal = 413 };

    (void)state;
    expect_chain(&a, &b, "ordinal 413 does not name the file before it");
    b.previous.has = true;
    b.previous.ordinal = 411;
    expect_chain(&a, &b, "ordinal 413 follows 411, it says");
    b.previous.ordinal = 412;
    expect_chain(&a, &b, "ordinal 413 names another last stamp of ordinal 412 than that file has");
    strcpy(b.previous.stamp, "5d1e");
    expect_chain(&a, &b, "");
    b.ordinal = 414;
    expect_chain(&a, &b, "ordinal 413 is missing");
    b.ordinal = 416;
    expect_chain(&a, &b, "ordinals 413 to 415 are missing");
    b.ordinal = 412;
    expect_chain(&a, &b, "ordinal 412 is there twice");
    b.ordinal = 410;
    expect_chain(&a, &b, "ordinal 410 follows 412");
    strcpy(b.meter, "bench-3");
    expect_chain(&a, &b, "they are of two meters, bench-2 and bench-3");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_whole_log_verifies_and_says_what_it_is),
        cmocka_unit_test(one_changed_byte_anywhere_names_its_group),
        cmocka_unit_test(one_changed_byte_names_its_group_where_the_last_stamp_is_unsigned),
        cmocka_unit_test(the_groups_before_the_damage_stand),
        cmocka_unit_test(a_log_cut_at_any_byte_verifies_up_to_its_last_stamp),
        cmocka_unit_test(another_signer_is_told_from_the_one_given),
        cmocka_unit_test(a_stamp_must_have_the_time_of_the_entry_before_it),
        cmocka_unit_test(what_is_no_log_at_all_is_judged_without_harm),
        cmocka_unit_test(files_must_follow_one_another),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
