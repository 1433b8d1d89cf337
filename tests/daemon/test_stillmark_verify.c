/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_stillmark_verify.c: what `stillmark verify` says of logs that are whole, hurt, torn, missing
 * or signed by somebody else. */
#include "capture_output.h"
#include "record/small_log.h"
#include "scratch.h"
#include "stillmark_verify.h"

static struct scratch scratch;
static char storage[256 * 1024];
static char file[3][160]; /* ordinals 412 to 414 */
static char key_file[160], other_key[160];

/* Three files that follow one another; the last is not closed and has a torn end. */
static int make_files(void **state)
{
    struct small_log l;
    char last[SM_HASH_HEX] = "", line[SM_KEY_HEX + 1];

    (void)state;
    scratch_make(&scratch);
    small_log_begin(&l, storage, sizeof storage);
    for (int i = 0; i < 3; i++) {
        snprintf(file[i], sizeof file[i], "%s/000%lld_2026-12-0%dT081203Z.jsonl", scratch.path,
                 (long long)l.ordinal, i + 1);
        small_log_open(&l, l.ordinal - 1, last);
        small_log_fill(&l, 3);
        if (i < 2)
            small_log_close(&l);
        else
            small_log_bytes(&l, "1 mV\r\n");
        strcpy(last, l.hash);
        if (i == 2)
            l.t.buf[l.t.len -= 20] = '\0';
        scratch_write(file[i], l.t.buf);
        sm_text_init(&l.t, storage, sizeof storage);
        l.hash_from = 0;
        l.t_ns = 0;
        l.from = l.n;
        l.ordinal++;
    }
    snprintf(key_file, sizeof key_file, "%s/key.pub", scratch.path);
    snprintf(line, sizeof line, "%s\n", l.key);
    scratch_write(key_file, line);
    snprintf(other_key, sizeof other_key, "%s/other.pub", scratch.path);
    line[3] = line[3] == '0' ? '1' : '0';
    scratch_write(other_key, line);
    small_log_end(&l);
    return 0;
}

static int drop_files(void **state)
{
    (void)state;
    scratch_remove(&scratch);
    return 0;
}

/* argv ends with NULL. Exit status and one text in what it says on either stream. */
static void expect(char **argv, int want, const char *text)
{
    char *out, *err;
    const int got = capture_run(sm_stillmark_verify, argv, &out, &err);

    if (got != want || strstr(want == 2 ? err : out, text) == NULL)
        fail_msg("exit %d, want %d with \"%s\":\n%s%s", got, want, text, out, err);
    free(out);
    free(err);
}

#define RUN(want, text, ...) expect((char *[]){ __VA_ARGS__, NULL }, want, text)

/* fe812c12f3ab4ce6: sha256sum of the 32 bytes of the public key that the seed of sevens gives */
static void whole_files_verify_in_whatever_order_they_are_given(void **state)
{
    (void)state;
    RUN(0, "unchanged since signed by key fe812c12f3ab4ce6 (not compared: see --key)\n", file[0]);
    RUN(0, "3 files: all verify", file[2], file[0], file[1]);
    RUN(0, "3 files: all verify", scratch.path);
    RUN(0, "files before number 413 are not here\n", file[2], file[1]);
    RUN(0, "its last stamp, for the paper log: entry ", file[0]);
    RUN(0, "\"good\":true", "--json", file[0], file[1]);
}

static void a_torn_end_is_said_and_is_no_failure(void **state)
{
    (void)state;
    RUN(0, "after its last stamp: 0 lines, ", file[2]);
}

static void the_signer_is_compared_when_its_key_is_given(void **state)
{
    (void)state;
    RUN(0, "unchanged since signed by key fe812c12f3ab4ce6 (the key given)", "--key", key_file,
        file[0]);
    RUN(1, "the signature in its stamp is not by the key given", file[0], "--key", other_key);
    RUN(2, "expected a file with a public key", "--key", file[0], file[0]);
    RUN(2, "--key needs a file", file[0], "--key");
}

static void a_log_without_a_signature_cannot_be_compared(void **state)
{
    struct small_log l;
    char path[160];

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    small_log_stamp(&l, false);
    snprintf(path, sizeof path, "%s/alone.jsonl", scratch.path);
    scratch_write(path, l.t.buf);
    RUN(0, "unchanged since stamped; nothing in it is signed", path);
    RUN(1, "the key cannot be compared", path, "--key", key_file);
    scratch_write(path, "");
    RUN(0, "holds no stamp", path);
    remove(path);
    small_log_end(&l);
}

static void a_file_that_is_missing_breaks_the_chain(void **state)
{
    (void)state;
    RUN(1, "the chain is broken: ordinal 413 is missing", file[0], file[2]);
    RUN(1, "ordinal 413 is missing", file[0], file[2], "--json");
    RUN(1, "ordinal 412 is there twice", file[0], file[0]);
}

static void damage_is_named_by_entries_and_line(void **state)
{
    size_t n;
    char *text = scratch_read(file[1], &n), *hurt;

    (void)state;
    assert_non_null(text);
    hurt = strstr(text, "\"-051.2 mV");
    assert_non_null(hurt);
    hurt[0] = 'x';
    scratch_write(file[1], text);
    RUN(1,
        "the hash in its stamp is not that of its entries; line 11 is the first that cannot be "
        "read",
        file[1]);
    RUN(1, "\"bad_line\":11", file[1], "--json");
    RUN(1, "unchanged before it: entries ", file[1]);
    hurt[0] = '"';
    scratch_write(file[1], text);
    free(text);
}

static void what_cannot_be_done_is_said_in_one_line(void **state)
{
    (void)state;
    RUN(2, "which log", NULL);
    RUN(2, "No such file", "/nowhere/at/all.jsonl");
    RUN(2, "no log file in this folder", "/dev");
    RUN(2, "no such option", "--loud", file[0]);
    RUN(0, "stillmark verify LOG", "--help");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(whole_files_verify_in_whatever_order_they_are_given),
        cmocka_unit_test(a_torn_end_is_said_and_is_no_failure),
        cmocka_unit_test(the_signer_is_compared_when_its_key_is_given),
        cmocka_unit_test(a_log_without_a_signature_cannot_be_compared),
        cmocka_unit_test(a_file_that_is_missing_breaks_the_chain),
        cmocka_unit_test(damage_is_named_by_entries_and_line),
        cmocka_unit_test(what_cannot_be_done_is_said_in_one_line),
    };

    return cmocka_run_group_tests(tests, make_files, drop_files);
}
