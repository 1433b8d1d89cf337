/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "check.h"
#include "source_disk.h"

struct folder {
    char path[64];
    struct sm_disk disk;
    struct sm_source source;
};

static const char *in(const struct folder *f, const char *name)
{
    static char path[4][256];
    static unsigned at;

    at = (at + 1) % 4;
    snprintf(path[at], sizeof path[at], "%s/%s", f->path, name);
    return path[at];
}

static void put(const char *path, const char *text, size_t n)
{
    FILE *f = fopen(path, "wb");

    assert_non_null(f);
    assert_int_equal(fwrite(text, 1, n, f), n);
    assert_int_equal(fclose(f), 0);
}

static int begin(void **state)
{
    struct folder *f = calloc(1, sizeof *f);

    assert_non_null(f);
    strcpy(f->path, "/tmp/sm-disk-XXXXXX");
    assert_non_null(mkdtemp(f->path));
    mkdir(in(f, "conf"), 0700);
    mkdir(in(f, "conf/methods"), 0700);
    put(in(f, "conf/s.yaml"), "a: 1\n", 5);
    put(in(f, "outside"), "secret", 6);
    sm_source_disk(&f->disk, in(f, "conf/s.yaml"), &f->source);
    *state = f;
    return 0;
}

static int end(void **state)
{
    static const char *const names[] = { "conf/s.yaml",
                                         "conf/big",
                                         "conf/link",
                                         "conf/inner",
                                         "conf/pipe",
                                         "outside",
                                         "conf/methods/b.yaml",
                                         "conf/methods/a.yaml",
                                         "conf/methods/.c.yaml",
                                         "conf/methods/B.yaml",
                                         "conf/methods",
                                         "conf",
                                         "linked",
                                         "conf-2/x",
                                         "conf-2" };
    struct folder *f = *state;

    for (size_t i = 0; i < COUNT(names); i++)
        remove(in(f, names[i]));
    assert_int_equal(rmdir(f->path), 0);
    free(f);
    return 0;
}

static enum sm_status get(struct folder *f, const char *name, size_t limit, size_t *ret_n,
                          char why[SM_REASON_SIZE])
{
    char *text = NULL;
    const enum sm_status st = f->source.get(f->source.ctx, in(f, name), limit, &text, ret_n, why);

    if (st == SM_OK)
        assert_int_equal(text[*ret_n], '\0');
    free(text);
    return st;
}

static void a_file_is_read_up_to_the_limit_and_not_beyond(void **state)
{
    struct folder *f = *state;
    char why[SM_REASON_SIZE] = "";
    size_t n = 0;

    assert_int_equal(get(f, "conf/s.yaml", 5, &n, why), SM_OK);
    assert_int_equal(n, 5);
    assert_int_equal(get(f, "conf/s.yaml", 4, &n, why), SM_EFULL);
    assert_string_equal(why, "larger than 4 bytes");
    put(in(f, "conf/big"), "", 0);
    assert_int_equal(get(f, "conf/big", 5, &n, why), SM_OK);
    assert_int_equal(n, 0);
}

static void what_is_no_plain_file_inside_is_refused(void **state)
{
    static const struct {
        const char *name, *why;
    } cases[] = { { "conf/none.yaml", "No such file or directory" },
                  { "conf/methods", "not a plain file" },
                  { "conf/pipe", "not a plain file" },
                  { "conf/link", "it leads out of the setup's folder" },
                  { "outside", "it leads out of the setup's folder" },
                  { "conf/../outside", "it leads out of the setup's folder" },
                  { "conf-2/x", "it leads out of the setup's folder" } };
    struct folder *f = *state;

    assert_int_equal(mkfifo(in(f, "conf/pipe"), 0600), 0);
    assert_int_equal(symlink("../outside", in(f, "conf/link")), 0);
    mkdir(in(f, "conf-2"), 0700);
    put(in(f, "conf-2/x"), "x", 1);
    for (size_t i = 0; i < COUNT(cases); i++) {
        char why[SM_REASON_SIZE] = "";
        size_t n = 0;

        assert_int_equal(get(f, cases[i].name, 100, &n, why), SM_EIO);
        if (strcmp(why, cases[i].why) != 0)
            fail_msg("%s: got \"%s\", want \"%s\"", cases[i].name, why, cases[i].why);
    }
}

static void links_that_stay_inside_are_followed(void **state)
{
    struct folder *f = *state;
    char why[SM_REASON_SIZE] = "";
    size_t n = 0;

    assert_int_equal(symlink("s.yaml", in(f, "conf/inner")), 0);
    assert_int_equal(get(f, "conf/inner", 5, &n, why), SM_OK);
    /* the setup file itself, and the folder that it is in, may be reached by a link */
    assert_int_equal(symlink("conf", in(f, "linked")), 0);
    sm_source_disk(&f->disk, in(f, "linked/s.yaml"), &f->source);
    assert_int_equal(get(f, "linked/s.yaml", 5, &n, why), SM_OK);
}

static void collect(void *arg, const char *name)
{
    char *all = arg;

    strcat(all, strrchr(name, '/') + 1);
    strcat(all, " ");
}

static void a_folder_is_listed_in_the_order_of_bytes(void **state)
{
    struct folder *f = *state;
    char all[256] = "";

    put(in(f, "conf/methods/b.yaml"), "", 0);
    put(in(f, "conf/methods/a.yaml"), "", 0);
    put(in(f, "conf/methods/B.yaml"), "", 0);
    put(in(f, "conf/methods/.c.yaml"), "", 0);
    assert_int_equal(f->source.list(f->source.ctx, in(f, "conf/methods"), collect, all), SM_OK);
    assert_string_equal(all, "B.yaml a.yaml b.yaml ");
    assert_int_equal(f->source.list(f->source.ctx, in(f, "nix"), collect, all), SM_EIO);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(a_file_is_read_up_to_the_limit_and_not_beyond, begin, end),
        cmocka_unit_test_setup_teardown(what_is_no_plain_file_inside_is_refused, begin, end),
        cmocka_unit_test_setup_teardown(links_that_stay_inside_are_followed, begin, end),
        cmocka_unit_test_setup_teardown(a_folder_is_listed_in_the_order_of_bytes, begin, end),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
