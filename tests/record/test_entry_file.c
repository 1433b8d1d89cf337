/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_entry_file.c: the entries about the file itself. */
#include "check.h"

#include <stdlib.h>
#include <string.h>

#include "record/entry.h"

static char storage[SM_ENTRY_MAX];
static struct sm_text t;

#define HASH "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"

/* Reads what stands in storage back, and says what kind it is. */
static enum sm_entry_kind kind_of_line(void)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    char why[SM_REASON_SIZE] = "";

    assert_false(t.cut);
    sm_entry_store_init(&store);
    if (sm_entry_read(t.buf, t.len - 1, &store, &e, why) != SM_OK)
        fail_msg("%s: %s", t.buf, why);
    json_decref(e.json);
    return e.kind;
}

static void open_says_what_the_file_is_and_what_it_begins_from(void **state)
{
    struct sm_carried *c = calloc(1, sizeof *c);
    struct sm_entry_open o = { .n = 58210,
                               .utc_us = 1796112723000000,
                               .program = "0.1.0",
                               .arithmetic = "9f3c",
                               .key = "",
                               .key_note = "",
                               .meter = "bench-2",
                               .ordinal = 412,
                               .how = "first",
                               .missed = "",
                               .carried = c };

    (void)state;
    assert_non_null(c);
    sm_carried_init(c);
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_open(&t, &o);
    assert_string_equal(
        storage, "{\"n\":58210,\"t\":0,\"utc\":\"2026-12-01T08:12:03.000000Z\",\"k\":\"open\","
                 "\"format\":1,\"program\":\"0.1.0\",\"core\":1,\"arithmetic\":\"9f3c\","
                 "\"meter\":\"bench-2\",\"ordinal\":412,\"how\":\"first\",\"carried\":{}}\n");
    assert_int_equal(kind_of_line(), SM_ENTRY_OPEN);
    o.previous.has = true;
    o.previous.ordinal = 411;
    strcpy(o.previous.stamp, HASH);
    o.previous.after_lines = 3;
    o.previous.after_bytes = 250;
    o.key = "ea4a";
    o.key_note = "new key: the old one is missing";
    o.how = "recovery";
    o.aged_ns = 5000000000;
    o.missed = "not logged for 5 s: no space";
    strcpy(c->sensor, "el-14");
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_open(&t, &o);
    assert_string_equal(
        storage, "{\"n\":58210,\"t\":0,\"utc\":\"2026-12-01T08:12:03.000000Z\",\"k\":\"open\","
                 "\"format\":1,\"program\":\"0.1.0\",\"core\":1,\"arithmetic\":\"9f3c\","
                 "\"meter\":\"bench-2\",\"ordinal\":412,\"previous\":{\"ordinal\":411,"
                 "\"stamp\":\"" HASH "\",\"left_out_lines\":3,\"left_out_bytes\":250},"
                 "\"key\":\"ea4a\",\"key_note\":\"new key: the old one is missing\","
                 "\"how\":\"recovery\",\"aged\":5000000000,"
                 "\"missed\":\"not logged for 5 s: no space\","
                 "\"carried\":{\"sensor\":\"el-14\"}}\n");
    free(c);
}

static void files_stamps_and_close_have_their_own_keys(void **state)
{
    (void)state;
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_file(&t, 7, 0, "conf/sheets/m.yaml", "a: \"\xc2\xb5\"\n", 8, true);
    assert_string_equal(storage, "{\"n\":7,\"t\":0,\"utc\":\"1970-01-01T00:00:00.000000Z\","
                                 "\"k\":\"file\",\"name\":\"conf/sheets/m.yaml\","
                                 "\"text\":\"a: \\\"\xc2\xb5\\\"\\u000a\",\"sheet\":true}\n");
    assert_int_equal(kind_of_line(), SM_ENTRY_FILE);
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_close(&t, 8, 5, 0, "stopped");
    assert_string_equal(storage, "{\"n\":8,\"t\":5,\"utc\":\"1970-01-01T00:00:00.000000Z\","
                                 "\"k\":\"close\",\"why\":\"stopped\"}\n");
    assert_int_equal(kind_of_line(), SM_ENTRY_CLOSE);
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_stamp(&t, 9, 5, 0, 7, HASH, NULL);
    assert_string_equal(storage, "{\"n\":9,\"t\":5,\"utc\":\"1970-01-01T00:00:00.000000Z\","
                                 "\"k\":\"stamp\",\"from\":7,\"hash\":\"" HASH "\"}\n");
    assert_int_equal(kind_of_line(), SM_ENTRY_STAMP);
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_stamp(&t, 9, 5, 0, 7, HASH, "b07a");
    assert_non_null(strstr(storage, "\"hash\":\"" HASH "\",\"sig\":\"b07a\"}\n"));
}

static void the_largest_setup_file_fits_on_a_line(void **state)
{
    const size_t n = 128u * 1024u;
    char *text = malloc(n);

    (void)state;
    assert_non_null(text);
    memset(text, '\x01', n); /* six bytes each in the log */
    sm_text_init(&t, storage, sizeof storage);
    sm_entry_file(&t, 7, 0, "conf/methods/m.yaml", text, n, false);
    assert_int_equal(kind_of_line(), SM_ENTRY_FILE);
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(open_says_what_the_file_is_and_what_it_begins_from),
        cmocka_unit_test(files_stamps_and_close_have_their_own_keys),
        cmocka_unit_test(the_largest_setup_file_fits_on_a_line),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
