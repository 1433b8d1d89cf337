/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_folder.c: one meter's log folder: who holds it, what its files are called, what the next
 * file begins from. Logs are made by the rig. */
#include "rig.h"

#include "folder.h"

static void names_give_the_order_whatever_the_clock_did(void **state)
{
    static const struct {
        const char *name;
        int64_t ordinal;
    } cases[] = { { "000412_2026-12-01T081203Z.jsonl", 412 },
                  { "1234567_2026-12-01T081203Z.jsonl", 1234567 },
                  { "000412_.jsonl", -1 },
                  { "000412_x.jsonl", 412 },
                  { "412_2026-12-01T081203Z.jsonl", -1 },
                  { "000412_2026-12-01T081203Z.jsonl.new", -1 },
                  { "000412-2026-12-01T081203Z.jsonl", -1 },
                  { "99999999999999999999_x.jsonl", -1 },
                  { "999999999999_x.jsonl", -1 },
                  { "lock", -1 },
                  { "", -1 } };
    char name[SM_FILE_NAME_SIZE];

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++)
        if (sm_file_ordinal(cases[i].name) != cases[i].ordinal)
            fail_msg("%s: %lld, want %lld", cases[i].name,
                     (long long)sm_file_ordinal(cases[i].name), (long long)cases[i].ordinal);
    sm_file_name(name, 412, RIG_UTC_US);
    assert_string_equal(name, "000412_2026-12-01T081203Z.jsonl");
    sm_file_name(name, 1234567, RIG_UTC_US + 999999);
    assert_string_equal(name, "1234567_2026-12-01T081203Z.jsonl");
}

static void a_folder_is_held_by_one_and_held_anew_when_it_was_replaced(void **state)
{
    struct scratch s;
    struct sm_folder one, two;
    char why[SM_WHY_SIZE], moved[96];
    struct stat st;

    (void)state;
    scratch_make(&s);
    sm_folder_init(&one, sm_door_system(), s.path, "m1");
    sm_folder_init(&two, sm_door_system(), s.path, "m1");
    assert_int_equal(sm_folder_hold(&one, why), SM_OK);
    assert_int_equal(stat(one.path, &st), 0);
    assert_int_equal(st.st_mode & 07777, 0750);
    assert_int_equal(sm_folder_hold(&two, why), SM_EBUSY);
    assert_int_equal(sm_folder_hold(&one, why), SM_OK);
    snprintf(moved, sizeof moved, "%s/moved", s.path);
    assert_int_equal(rename(one.path, moved), 0);
    assert_int_equal(sm_folder_hold(&one, why), SM_EIO); /* it may come back */
    assert_non_null(strstr(why, "put it back"));
    assert_int_equal(stat(one.path, &st), -1);
    assert_int_equal(rename(moved, one.path), 0);
    assert_int_equal(sm_folder_hold(&one, why), SM_OK);
    assert_int_equal(rename(one.path, moved), 0);
    assert_int_equal(mkdir(one.path, 0750), 0);
    assert_int_equal(sm_folder_hold(&one, why), SM_OK);
    assert_int_equal(sm_folder_hold(&two, why), SM_EBUSY); /* the new one is held too */
    sm_folder_let_go(&one);
    assert_int_equal(sm_folder_hold(&two, why), SM_OK);
    sm_folder_let_go(&two);
    scratch_remove(&s);
}

/* A folder with two files, the second one open-ended (killed). */
static void make_logs(struct rig *r)
{
    rig_make(r, false);
    rig_start(r);
    assert_true(rig_act(r, "note", "n1", "first file") > 0);
    rig_stop(r);
    r->now.utc_us += 1000000;
    rig_start(r);
    assert_true(rig_act(r, "note", "n2", "second file") > 0);
    rig_kill(r);
}

static struct sm_beginning *recover(const struct rig *r)
{
    struct sm_folder f;
    struct sm_beginning *b = NULL;
    char logs[96], why[SM_WHY_SIZE] = "";

    snprintf(logs, sizeof logs, "%s/logs", r->scratch.path);
    sm_folder_init(&f, sm_door_system(), logs, "m1");
    if (sm_folder_recover(&f, &b, why) != SM_OK)
        fail_msg("recover: %s", why);
    return b;
}

static void the_newest_file_says_what_comes_next(void **state)
{
    struct rig r;
    struct sm_beginning *b;
    char path[256], name[4][80];

    (void)state;
    rig_make(&r, false);
    rig_start(&r); /* makes the folder */
    rig_stop(&r);
    rig_remove(&r);
    make_logs(&r);
    snprintf(path, sizeof path, "%s/000003_2026-12-01T081300Z.jsonl.new", r.folder);
    scratch_write(path, "begun, never shown");
    snprintf(path, sizeof path, "%s/of somebody else.new", r.folder);
    scratch_write(path, "left alone");
    b = recover(&r);
    assert_int_equal(scratch_list(r.folder, ".new", name, 4), 1);
    assert_string_equal(name[0], "of somebody else.new");
    assert_int_equal(b->ordinal, 3);
    assert_true(b->previous.has);
    assert_int_equal(b->previous.ordinal, 2);
    assert_true(b->has_state);
    assert_false(b->state.closed);
    assert_int_equal(b->state.carried.n_acts, 2);
    assert_int_equal(b->next_n, b->state.verify.last_line_n + 1);
    assert_string_equal(b->damage, "");
    sm_beginning_destroy(b);
    rig_remove(&r);
}

/* What the last file of two may look like after a crash or worse, and what is made of it. */
static void torn_damaged_and_empty_last_files_are_told_apart(void **state)
{
    static const struct {
        const char *name;
        enum { TEAR, FLIP_LATE, FLIP_EARLY, EMPTY, RUBBISH } how;
        size_t acts; /* remembered in the state begun from */
        bool damage;
    } cases[] = { { "a torn end", TEAR, 2, false },
                  { "a byte flipped in the last group", FLIP_LATE, 1, true },
                  { "a byte flipped in the first group", FLIP_EARLY, 1, true },
                  { "an empty file", EMPTY, 1, true },
                  { "a file of rubbish", RUBBISH, 1, true } };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct rig r;
        char name[4][80], path[256];
        struct sm_beginning *b;
        size_t n = 0;
        char *text;
        FILE *f;

        make_logs(&r);
        assert_int_equal(scratch_list(r.folder, ".jsonl", name, 4), 2);
        snprintf(path, sizeof path, "%s/%.79s", r.folder, name[1]);
        text = scratch_read(path, &n);
        f = fopen(path, "wb");
        assert_non_null(f);
        if (cases[i].how == FLIP_LATE)
            strstr(text, "second file")[0] ^= 1;
        if (cases[i].how == FLIP_EARLY)
            strstr(text, "\"meter\"")[1] ^= 1;
        if (cases[i].how == RUBBISH)
            memset(text, 'x', n);
        if (cases[i].how != EMPTY)
            assert_int_equal(fwrite(text, 1, n, f), n);
        if (cases[i].how == TEAR)
            fputs("{\"n\":99,\"t\":1,\"utc\":\"2026-1", f);
        fclose(f);
        free(text);
        b = recover(&r);
        if (b->ordinal != 3 || b->previous.ordinal != 2 || !b->has_state ||
            b->state.carried.n_acts != cases[i].acts || (b->damage[0] != '\0') != cases[i].damage)
            fail_msg("%s: ordinal %lld, previous %lld, %zu acts, damage \"%s\"", cases[i].name,
                     (long long)b->ordinal, (long long)b->previous.ordinal, b->state.carried.n_acts,
                     b->damage);
        sm_beginning_destroy(b);
        rig_start(&r); /* and the meter does begin from it */
        assert_true(rig_act(&r, "note", "n3", "third file") > 0);
        rig_stop(&r);
        assert_int_equal(scratch_list(r.folder, ".jsonl", name, 4), 3);
        rig_remove(&r);
    }
}

static void a_file_that_cannot_be_read_is_tried_again(void **state)
{
    struct rig r;

    (void)state;
    make_logs(&r);
    for (unsigned nth = 1; nth <= 2; nth++) { /* listing, then reading */
        sm_door_fail_plan(&r.door, SM_CALLS(SM_CALL_READ) | SM_CALLS(SM_CALL_LIST), nth, true, EIO,
                          false);
        rig_start(&r);
        assert_int_equal(rig_act(&r, "note", "n", "not possible"), 0);
        sm_door_fail_heal(&r.door);
        rig_pass(&r, 3 * SM_NS_PER_S);
        assert_true(rig_act(&r, "note", "m", "possible") > 0);
        rig_stop(&r);
        if (nth == 1)
            assert_true(rig_count(r.told, "\"how\":\"recovery\"") > 0);
    }
    rig_verify(&r);
    rig_remove(&r);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(names_give_the_order_whatever_the_clock_did),
        cmocka_unit_test(a_folder_is_held_by_one_and_held_anew_when_it_was_replaced),
        cmocka_unit_test(the_newest_file_says_what_comes_next),
        cmocka_unit_test(torn_damaged_and_empty_last_files_are_told_apart),
        cmocka_unit_test(a_file_that_cannot_be_read_is_tried_again),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
