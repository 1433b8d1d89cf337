/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_keys.c: the signing key is made once, kept safe, and never replaced in silence. */
#include "scratch.h"

#include "door_fail.h"
#include "keys.h"

struct loaded {
    enum sm_status status;
    char key[SM_KEY_HEX], note[SM_REASON_SIZE], why[512];
};

static struct loaded load(const struct sm_door *door, const char *state, bool logs)
{
    struct loaded l = { 0 };
    struct sm_signer *signer = NULL;

    l.status = sm_keys_load(door, state, logs, &signer, l.note, l.why);
    if (l.status == SM_OK) {
        sm_signer_public(signer, l.key);
        sm_signer_destroy(signer);
    }
    return l;
}

static void first_start_makes_a_key_that_the_next_finds(void **state)
{
    struct scratch s;
    struct loaded first, again;
    char folder[128], path[160];
    struct stat st;
    size_t n;
    char *pub;

    (void)state;
    scratch_make(&s);
    snprintf(folder, sizeof folder, "%s/deep/state", s.path);
    first = load(sm_door_system(), folder, false);
    assert_int_equal(first.status, SM_OK);
    assert_string_equal(first.note, "");
    snprintf(path, sizeof path, "%s/key", folder);
    assert_int_equal(stat(path, &st), 0);
    assert_int_equal(st.st_mode & 07777, 0600);
    assert_int_equal(st.st_size, 32);
    assert_int_equal(stat(folder, &st), 0);
    assert_int_equal(st.st_mode & 07027, 0); /* nobody else writes, others do not look */
    snprintf(path, sizeof path, "%s/key.pub", folder);
    pub = scratch_read(path, &n);
    assert_non_null(pub);
    assert_int_equal(n, 65);
    assert_memory_equal(pub, first.key, 64);
    free(pub);
    again = load(sm_door_system(), folder, true);
    assert_int_equal(again.status, SM_OK);
    assert_string_equal(again.key, first.key);
    assert_string_equal(again.note, "");
    scratch_remove(&s);
}

static void a_key_that_others_can_read_is_refused_with_what_to_do(void **state)
{
    static const mode_t modes[] = { 0640, 0604, 0660, 0644, 0601 };
    struct scratch s;
    char path[160];

    (void)state;
    scratch_make(&s);
    assert_int_equal(load(sm_door_system(), s.path, false).status, SM_OK);
    snprintf(path, sizeof path, "%s/key", s.path);
    for (size_t i = 0; i < COUNT(modes); i++) {
        struct loaded l;
        assert_int_equal(chmod(path, modes[i]), 0);
        l = load(sm_door_system(), s.path, true);
        if (l.status != SM_EINVAL || strstr(l.why, "chmod 600") == NULL)
            fail_msg("mode %04o: status %d, %s", (unsigned)modes[i], l.status, l.why);
    }
    scratch_remove(&s);
}

static void a_file_that_is_no_key_is_never_replaced(void **state)
{
    static const char *const texts[] = { "", "short", "0123456789012345678901234567890123456789" };
    struct scratch s;
    char path[160];

    (void)state;
    for (size_t i = 0; i < COUNT(texts); i++) {
        struct loaded l;
        char *after;
        size_t n;

        scratch_make(&s);
        snprintf(path, sizeof path, "%s/key", s.path);
        scratch_write(path, texts[i]);
        assert_int_equal(chmod(path, 0600), 0);
        l = load(sm_door_system(), s.path, true);
        if (l.status != SM_EINVAL)
            fail_msg("%zu bytes: status %d, want %d", strlen(texts[i]), l.status, SM_EINVAL);
        after = scratch_read(path, &n);
        assert_string_equal(after, texts[i]);
        free(after);
        scratch_remove(&s);
    }
}

static void a_missing_key_beside_logs_is_said(void **state)
{
    struct scratch s;
    struct loaded l;

    (void)state;
    scratch_make(&s);
    l = load(sm_door_system(), s.path, true);
    assert_int_equal(l.status, SM_OK);
    assert_non_null(strstr(l.note, "new key"));
    scratch_remove(&s);
}

/* Whatever call fails: either a key comes back that the next start finds again, or the start is
 * refused with a sentence and the next one, on a sound disk, is fine. */
static void every_call_failed_in_turn_leaves_a_whole_key_or_none(void **state)
{
    const struct sm_door *sys = sm_door_system();
    unsigned failed = 0;

    (void)state;
    for (int existing = 0; existing < 2; existing++) {
        for (int mode = 0; mode < 4; mode++) {
            for (unsigned nth = 1; nth < 60; nth++) {
                struct sm_door_fail f;
                struct scratch s;
                struct loaded before = { 0 }, l, next;

                scratch_make(&s);
                if (existing)
                    before = load(sys, s.path, false);
                sm_door_fail_init(&f, sys);
                sm_door_fail_plan(&f, SM_CALLS_LOG | SM_CALLS(SM_CALL_RANDOM), nth, (mode & 1) != 0,
                                  EIO, (mode & 2) != 0);
                l = load(&f.door, s.path, false);
                failed += atomic_load(&f.failed) > 0;
                next = load(sys, s.path, false);
                if (l.status != SM_OK && l.why[0] == '\0')
                    fail_msg("call %u, mode %d: no sentence", nth, mode);
                if (next.status != SM_OK)
                    fail_msg("call %u, mode %d: the next start: %s", nth, mode, next.why);
                if (l.status == SM_OK && strcmp(l.key, next.key) != 0)
                    fail_msg("call %u, mode %d: another key at the next start", nth, mode);
                if (existing && strcmp(before.key, next.key) != 0)
                    fail_msg("call %u, mode %d: the key was replaced", nth, mode);
                scratch_remove(&s);
            }
        }
    }
    assert_true(failed > 40); /* the plan did reach the calls */
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(first_start_makes_a_key_that_the_next_finds),
        cmocka_unit_test(a_key_that_others_can_read_is_refused_with_what_to_do),
        cmocka_unit_test(a_file_that_is_no_key_is_never_replaced),
        cmocka_unit_test(a_missing_key_beside_logs_is_said),
        cmocka_unit_test(every_call_failed_in_turn_leaves_a_whole_key_or_none),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
