/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_writer.c: groups go to disk whole and in order, or their file is left alone. No core. */
#include "scratch.h"

#include <poll.h>

#include "door_fail.h"
#include "writer.h"

struct bench {
    struct scratch scratch;
    struct sm_door_fail door;
    struct sm_folder folder;
    struct sm_writer *writer;
};

static void bench_make(struct bench *b)
{
    char why[SM_WHY_SIZE];

    scratch_make(&b->scratch);
    sm_door_fail_init(&b->door, sm_door_system());
    sm_folder_init(&b->folder, &b->door.door, b->scratch.path, "m1");
    assert_int_equal(sm_folder_hold(&b->folder, why), SM_OK);
    assert_int_equal(sm_writer_create(&b->folder, &b->writer), SM_OK);
}

static void bench_remove(struct bench *b)
{
    sm_writer_destroy(b->writer);
    sm_folder_let_go(&b->folder);
    scratch_remove(&b->scratch);
}

static void give(struct bench *b, uint64_t epoch, const char *begins, const char *text, bool ends)
{
    struct sm_group *g = sm_group_create();

    assert_non_null(g);
    g->epoch = epoch;
    g->ends = ends;
    snprintf(g->begins, sizeof g->begins, "%s", begins);
    assert_int_equal(sm_group_add(g, text, strlen(text), false, 0), SM_OK);
    assert_int_equal(sm_writer_group(b->writer, g), SM_OK);
}

/* The next that is done; waits for it. */
static struct sm_done done(struct bench *b)
{
    struct pollfd p = { .fd = sm_writer_fd(b->writer), .events = POLLIN };
    struct sm_done d;

    while (!sm_writer_next(b->writer, &d))
        if (poll(&p, 1, 10000) != 1)
            fail_msg("the writer does not answer");
    return d;
}

static bool done_good(struct bench *b)
{
    struct sm_done d = done(b);
    const bool good = d.good;

    if (!good && d.why[0] == '\0')
        fail_msg("a failure without a sentence");
    sm_group_destroy(d.group);
    sm_beginning_destroy(d.beginning);
    return good;
}

static void check_file(const struct bench *b, const char *name, const char *want)
{
    char path[SM_FOLDER_SIZE + 80];
    size_t n;
    char *got;

    snprintf(path, sizeof path, "%s/%s", b->folder.path, name);
    got = scratch_read(path, &n);
    if (want == NULL && got != NULL)
        fail_msg("%s: is there, should not be", name);
    if (want != NULL && (got == NULL || strcmp(got, want) != 0))
        fail_msg("%s: got \"%s\", want \"%s\"", name, got != NULL ? got : "(no file)", want);
    free(got);
}

static void groups_come_back_in_order_and_lie_in_the_file_in_order(void **state)
{
    struct bench b;
    char want[4096] = "", line[32];
    struct stat st;
    char path[SM_FOLDER_SIZE + 80];

    (void)state;
    bench_make(&b);
    for (int i = 0; i < 100; i++) {
        snprintf(line, sizeof line, "line %d\n", i);
        strcat(want, line);
        give(&b, 1, i == 0 ? "000001_a.jsonl" : "", line, i == 99);
    }
    for (int i = 0; i < 100; i++) {
        struct sm_done d = done(&b);
        assert_true(d.good);
        snprintf(line, sizeof line, "line %d\n", i);
        assert_memory_equal(d.group->text, line, strlen(line));
        sm_group_destroy(d.group);
    }
    check_file(&b, "000001_a.jsonl", want);
    snprintf(path, sizeof path, "%s/000001_a.jsonl", b.folder.path);
    assert_int_equal(stat(path, &st), 0);
    assert_int_equal(st.st_mode & 07137, 0); /* at most 0640 */
    bench_remove(&b);
}

static void a_new_file_follows_the_old_one_in_the_same_queue(void **state)
{
    struct bench b;

    (void)state;
    bench_make(&b);
    give(&b, 1, "000001_a.jsonl", "one\n", false);
    give(&b, 1, "", "two\n", true);
    give(&b, 1, "000002_b.jsonl", "three\n", false);
    give(&b, 1, "", "four\n", false);
    for (int i = 0; i < 4; i++)
        assert_true(done_good(&b));
    check_file(&b, "000001_a.jsonl", "one\ntwo\n");
    check_file(&b, "000002_b.jsonl", "three\nfour\n");
    bench_remove(&b);
}

/* With each call failing in turn: what was called good is in the files, whole and in order; after
 * the first failure nothing of that epoch is good; nothing is ever written behind a failed group; a
 * new epoch works again. */
static void after_a_failure_nothing_more_is_written_to_that_file(void **state)
{
    static const char *const text[] = { "one\n", "two\n", "three\n", "four\n" };
    unsigned reached = 0;

    (void)state;
    for (int mode = 0; mode < 4; mode++) {
        for (unsigned nth = 1;; nth++) {
            struct bench b;
            bool good[4];
            char want[64] = "", path[SM_FOLDER_SIZE + 80];
            unsigned failed;
            size_t n = 0;
            char *got;

            bench_make(&b);
            sm_door_fail_plan(&b.door, SM_CALLS_LOG & ~SM_CALLS(SM_CALL_CLOSE), nth,
                              (mode & 1) != 0, EIO, (mode & 2) != 0);
            for (int i = 0; i < 4; i++)
                give(&b, 1, i == 0 ? "000001_a.jsonl" : "", text[i], false);
            for (int i = 0; i < 4; i++) {
                good[i] = done_good(&b);
                if (i > 0 && good[i] && !good[i - 1])
                    fail_msg("call %u, mode %d: group %d good behind one that failed", nth, mode,
                             i);
                if (good[i])
                    strcat(want, text[i]);
            }
            failed = atomic_load(&b.door.failed);
            sm_door_fail_heal(&b.door);
            snprintf(path, sizeof path, "%s/000001_a.jsonl", b.folder.path);
            got = scratch_read(path, &n);
            if (want[0] != '\0' && (got == NULL || strncmp(got, want, strlen(want)) != 0))
                fail_msg("call %u, mode %d: got \"%s\", want it to begin \"%s\"", nth, mode,
                         got != NULL ? got : "(no file)", want);
            if (got != NULL && strncmp("one\ntwo\nthree\nfour\n", got, n) != 0)
                fail_msg("call %u, mode %d: a hole in \"%s\"", nth, mode, got);
            free(got);
            give(&b, 2, "000002_b.jsonl", "five\n", false);
            assert_true(done_good(&b));
            check_file(&b, "000002_b.jsonl", "five\n");
            bench_remove(&b);
            if (failed == 0)
                break;
            reached++;
        }
    }
    print_message("%u runs, each with another call failing\n", reached);
    assert_true(reached >=
                4 * 12); /* open, stat, rename, open, fsync, and write and sync of four */
}

static void a_file_that_never_got_its_first_group_is_not_left_behind(void **state)
{
    struct bench b;
    char name[8][80];

    (void)state;
    bench_make(&b);
    sm_door_fail_plan(&b.door, SM_CALLS(SM_CALL_FDATASYNC), 1, true, ENOSPC, false);
    for (uint64_t epoch = 1; epoch < 6; epoch++) {
        give(&b, epoch, "000001_a.jsonl", "one\n", false);
        assert_false(done_good(&b));
    }
    assert_int_equal(scratch_list(b.folder.path, ".jsonl", name, 8), 0);
    assert_int_equal(scratch_list(b.folder.path, ".new", name, 8), 0);
    bench_remove(&b);
}

static void a_file_is_never_written_over_another(void **state)
{
    struct bench b;
    char path[SM_FOLDER_SIZE + 80];

    (void)state;
    bench_make(&b);
    snprintf(path, sizeof path, "%s/000001_a.jsonl", b.folder.path);
    scratch_write(path, "of old\n");
    snprintf(path, sizeof path, "%s/000001_a.jsonl.new", b.folder.path);
    scratch_write(path, "left by a crash\n");
    give(&b, 1, "000001_a.jsonl", "one\n", false);
    assert_false(done_good(&b));
    check_file(&b, "000001_a.jsonl", "of old\n");
    give(&b, 2, "000002_a.jsonl", "one\n", false);
    assert_true(done_good(&b));
    bench_remove(&b);
}

static void abandoned_groups_are_not_written(void **state)
{
    struct bench b;
    char path[SM_FOLDER_SIZE + 80], *got;
    size_t n = 0;

    (void)state;
    bench_make(&b);
    give(&b, 1, "000001_a.jsonl", "one\n", false);
    assert_true(done_good(&b));
    sm_writer_abandon(b.writer, 2);
    give(&b, 1, "", "two\n", false);
    assert_false(done_good(&b));
    snprintf(path, sizeof path, "%s/000001_a.jsonl", b.folder.path);
    got = scratch_read(path, &n);
    assert_string_equal(got, "one\n");
    free(got);
    bench_remove(&b);
}

static void ending_the_thread_writes_all_it_was_given(void **state)
{
    struct bench b;
    char line[32], want[2048] = "";

    (void)state;
    bench_make(&b);
    for (int i = 0; i < 50; i++) {
        snprintf(line, sizeof line, "line %d\n", i);
        strcat(want, line);
        give(&b, 1, i == 0 ? "000001_a.jsonl" : "", line, i == 49);
    }
    sm_writer_destroy(b.writer);
    b.writer = NULL;
    check_file(&b, "000001_a.jsonl", want);
    bench_remove(&b);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(groups_come_back_in_order_and_lie_in_the_file_in_order),
        cmocka_unit_test(a_new_file_follows_the_old_one_in_the_same_queue),
        cmocka_unit_test(after_a_failure_nothing_more_is_written_to_that_file),
        cmocka_unit_test(a_file_that_never_got_its_first_group_is_not_left_behind),
        cmocka_unit_test(a_file_is_never_written_over_another),
        cmocka_unit_test(abandoned_groups_are_not_written),
        cmocka_unit_test(ending_the_thread_writes_all_it_was_given),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
