/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/blame: errors in people's files, collected and written. */
#include "check.h"

#include <string.h>

#include "base/blame.h"

static void a_blame_reads_file_line_column_text(void **state)
{
    static const struct {
        unsigned line, column;
        const char *want;
    } cases[] = {
        { 14, 9, "conf/methods/ph.yaml:14:9: slope.from: got \"9.2\"" },
        { 14, 0, "conf/methods/ph.yaml:14: slope.from: got \"9.2\"" },
        { 0, 0, "conf/methods/ph.yaml: slope.from: got \"9.2\"" },
        { 0, 9, "conf/methods/ph.yaml: slope.from: got \"9.2\"" }, /* a column of no line */
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_blame one[1];
        struct sm_blames b;
        char out[200];

        sm_blames_init(&b, one, 1);
        sm_blames_add(&b, "conf/methods/ph.yaml", cases[i].line, cases[i].column, "%s: got \"%s\"",
                      "slope.from", "9.2");
        sm_blame_write(&one[0], out, sizeof out);
        assert_string_equal(out, cases[i].want);
    }
}

static void past_the_ceiling_blames_are_only_counted(void **state)
{
    struct sm_blame list[2];
    struct sm_blames b;

    (void)state;
    sm_blames_init(&b, list, 2);
    assert_int_equal(b.n, 0);
    for (unsigned line = 1; line <= 5; line++)
        sm_blames_add(&b, "f", line, 1, "wrong %u", line);
    assert_int_equal(b.n, 2);
    assert_int_equal(b.left_out, 3);
    assert_string_equal(list[0].text, "wrong 1");
    assert_string_equal(list[1].text, "wrong 2");
    sm_blames_init(&b, NULL, 0);
    sm_blames_add(&b, "f", 1, 1, "wrong");
    assert_int_equal(b.n, 0);
    assert_int_equal(b.left_out, 1);
}

static void long_texts_and_paths_are_cut_at_a_character(void **state)
{
    struct sm_blame one[1];
    struct sm_blames b;
    char text[2 * SM_BLAME_SIZE], path[2 * SM_PATH_SIZE];
    const char *mu = "\xC2\xB5"; /* two bytes, and the room ends in the middle of one */

    (void)state;
    for (size_t i = 0; i + 2 < sizeof text; i += 2)
        memcpy(text + i, mu, 3);
    for (size_t i = 0; i + 2 < sizeof path; i += 2)
        memcpy(path + i, mu, 3);
    sm_blames_init(&b, one, 1);
    sm_blames_add(&b, path, 1, 1, "%s", text);
    assert_int_equal(strlen(one[0].text), SM_BLAME_SIZE - 2);
    assert_int_equal(strlen(one[0].file), SM_PATH_SIZE - 2);
    assert_memory_equal(one[0].text, text, SM_BLAME_SIZE - 2);
}

static void no_control_character_of_a_hostile_file_reaches_the_terminal(void **state)
{
    struct sm_blame one[1];
    struct sm_blames b;
    char out[200];

    (void)state;
    sm_blames_init(&b, one, 1);
    sm_blames_add(&b, "a\033[2Jb", 1, 2, "got \"%s\"", "\x07\x7f\xC2\x9B\xFF\n");
    sm_blame_write(&one[0], out, sizeof out);
    assert_string_equal(out, "a\\x1b[2Jb:1:2: got \"\\x07\\x7f\\xc2\\x9b\\xff\\x0a\"");
}

static void a_blame_is_cut_to_the_room_it_is_written_to(void **state)
{
    static const char want[] = "file.yaml:12:3: wrong";
    struct sm_blame one[1];
    struct sm_blames b;

    (void)state;
    sm_blames_init(&b, one, 1);
    sm_blames_add(&b, "file.yaml", 12, 3, "wrong");
    for (size_t cap = 1; cap <= sizeof want; cap++) {
        char out[sizeof want + 1];
        memset(out, '#', sizeof out);
        sm_blame_write(&one[0], out, cap);
        if (out[cap] != '#')
            fail_msg("cap %zu: wrote past the end", cap);
        if (memchr(out, '\0', cap) == NULL || strncmp(out, want, strlen(out)) != 0)
            fail_msg("cap %zu: got \"%.*s\", want a beginning of \"%s\"", cap, (int)cap, out, want);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_blame_reads_file_line_column_text),
        cmocka_unit_test(past_the_ceiling_blames_are_only_counted),
        cmocka_unit_test(long_texts_and_paths_are_cut_at_a_character),
        cmocka_unit_test(no_control_character_of_a_hostile_file_reaches_the_terminal),
        cmocka_unit_test(a_blame_is_cut_to_the_room_it_is_written_to),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
