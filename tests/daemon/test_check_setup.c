/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The shipped conf/, read from disk as the daemon does. */
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "check_setup.h"
#include "setup/logged.h"
#include "setup/same_setup.h"
#include "source_disk.h"

static struct sm_setup *shipped(const char *name)
{
    char path[512];
    struct sm_setup *s = NULL;

    snprintf(path, sizeof path, "%s/conf/%s", SM_SOURCE_DIR, name);
    if (sm_read_setup(path, &s) != 0)
        fail_msg("%s is blamed, see above", path);
    return s;
}

static void the_shipped_setups_are_without_blame(void **state)
{
    static const char *const files[] = { "stillmark.yaml", "try.yaml" };

    (void)state;
    for (size_t i = 0; i < COUNT(files); i++) {
        struct sm_setup *s = shipped(files[i]);

        assert_int_equal(s->n_meters, 1);
        assert_true(s->standards.n >= 6);
        assert_true(s->n_methods >= 3);
        sm_setup_destroy(s);
    }
}

static void what_the_log_carries_of_a_setup_gives_it_again(void **state)
{
    struct sm_setup *s = shipped("stillmark.yaml"), *again = NULL;
    struct sm_logged *log = calloc(1, sizeof *log);
    struct sm_blame list[4];
    struct sm_blames blames;
    struct sm_source source;

    (void)state;
    assert_non_null(log);
    for (size_t i = 0; i < s->n_files; i++)
        assert_int_equal(sm_logged_add(log, s->files[i].name, s->files[i].text, s->files[i].n),
                         SM_OK);
    sm_logged_source(log, &source);
    sm_blames_init(&blames, list, COUNT(list));
    assert_int_equal(sm_setup_load(&source, s->files[0].name, &again, &blames), SM_OK);
    assert_same_setup(s, again);
    sm_setup_destroy(s);
    sm_setup_destroy(again);
    sm_logged_finish(log);
    free(log);
}

/* Calls back for every .yaml in conf/FOLDER. */
static size_t each_file(const char *folder,
                        void (*each)(const char *name, const char *text, size_t n))
{
    char path[512];
    struct dirent *e;
    size_t files = 0;
    DIR *d;

    snprintf(path, sizeof path, "%s/conf/%s", SM_SOURCE_DIR, folder);
    d = opendir(path);
    assert_non_null(d);
    while ((e = readdir(d)) != NULL) {
        char *text;
        size_t n;

        if (strstr(e->d_name, ".yaml") == NULL)
            continue;
        snprintf(path, sizeof path, "conf/%s/%s", folder, e->d_name);
        text = check_read_file(path, &n);
        each(path, text, n);
        free(text);
        files++;
    }
    closedir(d);
    return files;
}

static void fail_with(const struct sm_blames *b)
{
    char line[1024];

    if (b->n == 0)
        return;
    sm_blame_write(&b->list[0], line, sizeof line);
    fail_msg("%s", line);
}

static void profile_is_sound(const char *name, const char *text, size_t n)
{
    struct sm_profile *p = calloc(1, sizeof *p);
    struct sm_blame list[4];
    struct sm_blames blames;

    assert_non_null(p);
    sm_blames_init(&blames, list, COUNT(list));
    assert_int_equal(sm_profile_load(name, text, n, p, &blames),
                     blames.n == 0 ? SM_OK : SM_ESYNTAX);
    fail_with(&blames);
    free(p);
}

static struct sm_setup *setup_of_sheets;

static void sheet_is_sound(const char *name, const char *text, size_t n)
{
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);
    struct sm_blame list[4];
    struct sm_blames blames;

    assert_non_null(sheet);
    sm_blames_init(&blames, list, COUNT(list));
    assert_int_equal(sm_sheet_load(setup_of_sheets, name, text, n, sheet, &blames),
                     blames.n == 0 ? SM_OK : SM_ESYNTAX);
    fail_with(&blames);
    free(sheet);
}

static void every_shipped_profile_reads_its_own_example(void **state)
{
    (void)state;
    assert_true(each_file("profiles", profile_is_sound) >= 5);
}

static void every_shipped_sheet_is_sound(void **state)
{
    (void)state;
    setup_of_sheets = shipped("stillmark.yaml");
    assert_true(each_file("sheets", sheet_is_sound) >= 2);
    sm_setup_destroy(setup_of_sheets);
}

static void the_demonstrations_method_says_that_it_is_shortened(void **state)
{
    struct sm_setup *s = shipped("try.yaml");
    const struct sm_method *m = &s->method[s->meter[0].core.own_method];

    (void)state;
    assert_string_equal(m->name, "try-ph");
    assert_int_equal(m->rule.dwell_ns, INT64_C(3000000000));
    assert_int_equal(m->rule.over_ns, INT64_C(2000000000));
    assert_non_null(strstr(m->note, "shortened for the demonstration only"));
    sm_setup_destroy(s);
}

static void a_meter_is_described_in_plain_words(void **state)
{
    struct sm_setup *s = shipped("stillmark.yaml");
    char line[4096];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, line, sizeof line);
    sm_describe_meter(s, 0, &t);
    assert_string_equal(
        line,
        "bench-2: /dev/serial/by-id/usb-adapter-0007-port0 at 9600 8N1, no flow control; profile "
        "r-mv reads potential in mV (raw), probe in °C, asking every 1 s; method ph-surface: pH by "
        "nernst, settled by rule spread within 0.02 pH for samples, dwell 30 s; sensor el-14; 6 "
        "standards, 3 methods");
    sm_setup_destroy(s);
}

static void a_tolerance_under_three_display_steps_is_warned_of(void **state)
{
    struct sm_setup *s =
        shipped("stillmark.yaml"); /* its profile's example shows steps of 0.1 mV */
    struct sm_rule *rule = &s->method[s->meter[0].core.own_method].rule;
    char line[4096];
    struct sm_text t;

    (void)state;
    sm_text_init(&t, line, sizeof line);
    sm_warn_meter(s, 0, &t);
    assert_string_equal(line, "");
    rule->tolerance[SM_CLASS_CHECK] = 0.299;
    sm_warn_meter(s, 0, &t);
    assert_string_equal(line,
                        "bench-2: warning: the tolerance for checks is 0.299 mV, less than three "
                        "display steps of 0.1 mV: hardly anything will settle\n");
    sm_setup_destroy(s);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_shipped_setups_are_without_blame),
        cmocka_unit_test(what_the_log_carries_of_a_setup_gives_it_again),
        cmocka_unit_test(every_shipped_profile_reads_its_own_example),
        cmocka_unit_test(every_shipped_sheet_is_sound),
        cmocka_unit_test(the_demonstrations_method_says_that_it_is_shortened),
        cmocka_unit_test(a_meter_is_described_in_plain_words),
        cmocka_unit_test(a_tolerance_under_three_display_steps_is_warned_of),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
