/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_shipped_profiles.c: conf/profiles/ reads without a blame, reads its own examples, and says
 * the same as the profiles made in C that the tests of framing and parsing use. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>

#include "reading/parse.h"
#include "reading/shapes.h"
#include "setup/setup.h"

static void load(const char *name, struct sm_profile *ret_profile)
{
    struct sm_blame list[8];
    struct sm_blames blames;
    char path[200], text[SM_BLAME_SIZE + SM_PATH_SIZE + 32];
    size_t n;

    snprintf(path, sizeof path, "conf/profiles/%s.yaml", name);
    char *yaml = check_read_file(path, &n);
    sm_blames_init(&blames, list, COUNT(list));
    const enum sm_status status = sm_profile_load(path, yaml, n, ret_profile, &blames);
    free(yaml);
    if (status == SM_OK && blames.n == 0)
        return;
    text[0] = '\0';
    if (blames.n > 0)
        sm_blame_write(&list[0], text, sizeof text);
    fail_msg("%s: status %d, %zu blames: %s", path, status, blames.n, text);
}

static void same_text(const char *name, const char *what, const char *got, const char *want)
{
    if (strcmp(got, want) != 0)
        fail_msg("%s: %s: got \"%s\", want \"%s\"", name, what, got, want);
}

static void same_count(const char *name, const char *what, int64_t got, int64_t want)
{
    if (got != want)
        fail_msg("%s: %s: got %lld, want %lld", name, what, (long long)got, (long long)want);
}

static void same_question(const char *name, const char *what, const struct sm_question *got,
                          const struct sm_question *want)
{
    same_count(name, what, (int64_t)got->n, (int64_t)want->n);
    if (want->n > 0 && memcmp(got->text, want->text, want->n) != 0)
        fail_msg("%s: %s: another text", name, what);
    same_count(name, what, got->every_ns, want->every_ns);
    same_count(name, what, got->within_ns, want->within_ns);
}

static void same_channel(const char *name, const struct sm_channel *got,
                         const struct sm_channel *want)
{
    same_text(name, "channel", got->name, want->name);
    same_text(name, "written", got->written, want->written);
    same_count(name, "unit", got->unit, want->unit);
    same_count(name, "at", got->at, want->at);
    same_count(name, "unit-at", got->unit_at, want->unit_at);
    same_count(name, "sign-at", got->sign_at, want->sign_at);
    same_count(name, "is: raw", got->raw, want->raw);
    same_count(name, "plausible", got->has_plausible, want->has_plausible);
    check_close("plausible.from", got->plausible_from, want->plausible_from, 1e-9);
    check_close("plausible.to", got->plausible_to, want->plausible_to, 1e-9);
    check_close("scale", got->scale, want->scale, 0);
}

static void same_words(const char *name, const char got[SM_WORDS_MAX][SM_WORD_SIZE],
                       const char want[SM_WORDS_MAX][SM_WORD_SIZE])
{
    for (size_t i = 0; i < SM_WORDS_MAX; i++)
        same_text(name, "word", got[i], want[i]);
}

static void same_profile(const struct sm_profile *got, const struct sm_profile *want)
{
    const char *name = want->name;

    same_text(name, "name", got->name, name);
    same_count(name, "eol", got->framing.eol, want->framing.eol);
    same_count(name, "gap", got->framing.gap_ns, want->framing.gap_ns);
    same_count(name, "strip-bit7", got->framing.strip_bit7, want->framing.strip_bit7);
    same_question(name, "ask", &got->ask, &want->ask);
    same_question(name, "identity", &got->identity, &want->identity);
    same_count(name, "split", got->split, want->split);
    if (want->split == SM_SPLIT_CHAR)
        same_count(name, "split", got->split_char, want->split_char);
    same_text(name, "pattern", got->pattern, want->pattern);
    same_count(name, "status-at", got->status_at, want->status_at);
    same_count(name, "decimal", got->decimal_comma, want->decimal_comma);
    same_count(name, "channels", (int64_t)got->n_channels, (int64_t)want->n_channels);
    for (size_t i = 0; i < want->n_channels; i++)
        same_channel(name, &got->channel[i], &want->channel[i]);
    same_words(name, got->over, want->over);
    same_words(name, got->under, want->under);
    same_words(name, got->open, want->open);
    same_words(name, got->unusable, want->unusable);
    same_words(name, got->mark, want->mark);
    same_count(name, "checksum", got->checksum.kind, want->checksum.kind);
    same_count(name, "checksum mark", got->checksum.mark, want->checksum.mark);
    same_count(name, "checksum skip", (int64_t)got->checksum.from, (int64_t)want->checksum.from);
}

static void the_shipped_profiles_say_what_the_tests_take_them_for(void **state)
{
    (void)state;
    for (size_t i = 0; i < SHAPES; i++) {
        struct sm_profile want, got;

        shape(&want, i);
        load(want.name, &got);
        same_profile(&got, &want);
    }
}

static void the_shipped_profiles_read_their_examples(void **state)
{
    (void)state;
    for (size_t i = 0; i < SHAPES; i++) {
        struct sm_profile want, got;
        struct sm_parser *parser = NULL;
        char why[SM_REASON_SIZE] = "";

        shape(&want, i);
        load(want.name, &got);
        assert_true(got.example.given);
        same_count(want.name, "example", (int64_t)got.example.n, (int64_t)want.example.n);
        assert_memory_equal(got.example.line, want.example.line, want.example.n);
        for (size_t k = 0; k < want.n_channels; k++) {
            assert_true(got.example.has[k]);
            check_close("example", got.example.want[k], want.example.want[k], 1e-9);
        }
        assert_int_equal(sm_parser_create(&got, &parser, why), SM_OK);
        if (sm_parser_check_example(parser, why) != SM_OK)
            fail_msg("%s: %s", want.name, why);
        sm_parser_destroy(parser);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_shipped_profiles_say_what_the_tests_take_them_for),
        cmocka_unit_test(the_shipped_profiles_read_their_examples)
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
