/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fuzz_log.c: the readers of a bench log under any bytes: each line as an entry, the whole as a
 * log. Checked: an input that could be read is written and read again as the same bytes, and so is
 * what is carried; what is refused says why; verify and recover stay within the text, and what they
 * call stamped does not depend on what follows it. */
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "record/recover.h"
#include "record/replay.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define CHECK(what)                                                                                \
    do {                                                                                           \
        if (!(what)) {                                                                             \
            fprintf(stderr, "%s:%d: broken: %s\n", __FILE__, __LINE__, #what);                     \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

static char first[2 * SM_ENTRY_MAX], second[2 * SM_ENTRY_MAX];

/* An input's own line, and what becomes of it when it is read and written once more. */
static void check_input(const struct sm_input *in)
{
    static struct sm_entry_store store;
    static struct sm_entry again;
    struct sm_text a, b;
    char why[SM_REASON_SIZE];

    sm_text_init(&a, first, sizeof first);
    sm_entry_input(&a, in);
    CHECK(!a.cut);
    if (a.len > SM_ENTRY_MAX) /* text that grew by escapes beyond what a line may hold */
        return;
    sm_entry_store_init(&store);
    CHECK(sm_entry_read(a.buf, a.len - 1, &store, &again, why) == SM_OK);
    CHECK(again.kind == SM_ENTRY_INPUT && again.passed_over == 0);
    sm_text_init(&b, second, sizeof second);
    sm_entry_input(&b, &again.input);
    CHECK(a.len == b.len && memcmp(a.buf, b.buf, a.len) == 0);
    json_decref(again.json);
    sm_entry_store_finish(&store);
}

static void check_carried(const json_t *o)
{
    static struct sm_carried carried, again;
    struct sm_text a, b;
    unsigned passed_over = 0;
    char why[SM_REASON_SIZE] = "";
    json_t *back;

    if (sm_carried_read(o, &carried, &passed_over, why) != SM_OK) {
        CHECK(why[0] != '\0');
        return;
    }
    sm_text_init(&a, first, sizeof first);
    sm_carried_write(&a, &carried);
    CHECK(!a.cut);
    back = json_loadb(a.buf, a.len, JSON_REJECT_DUPLICATES | JSON_ALLOW_NUL, NULL);
    CHECK(back != NULL);
    CHECK(sm_carried_read(back, &again, &passed_over, why) == SM_OK);
    CHECK(passed_over == 0);
    json_decref(back);
    sm_text_init(&b, second, sizeof second);
    sm_carried_write(&b, &again);
    CHECK(a.len == b.len && memcmp(a.buf, b.buf, a.len) == 0);
}

static void check_line(const char *line, size_t n, const char *other, size_t n_other)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    char why[SM_REASON_SIZE] = "";

    CHECK(sm_replay_agree(SM_COMPARE_BYTES, line, n, line, n, why));
    (void)sm_replay_agree(SM_COMPARE_TOLERANCE, line, n, other, n_other, why);
    why[0] = '\0';
    sm_entry_store_init(&store);
    if (sm_entry_read(line, n, &store, &e, why) != SM_OK) {
        CHECK(why[0] != '\0' && memchr(why, '\0', sizeof why) != NULL);
        sm_entry_store_finish(&store);
        return;
    }
    CHECK(e.n >= 1 && e.t_ns >= 0);
    if (e.kind == SM_ENTRY_INPUT)
        check_input(&e.input);
    if (e.kind == SM_ENTRY_EVENT && e.event == SM_EVENT_CARRIED)
        check_carried(e.json);
    if (e.kind == SM_ENTRY_OPEN)
        check_carried(json_object_get(e.json, "carried"));
    json_decref(e.json);
    sm_entry_store_finish(&store);
}

static void check_whole(const char *text, size_t n)
{
    static struct sm_recovered r;
    struct sm_verify v;

    const enum sm_status st = sm_recover(text, n, &r);
    CHECK(st == SM_OK || st == SM_EVALUE || st == SM_ESHORT);
    CHECK(r.verify.good == (r.verify.why[0] == '\0'));
    CHECK(r.verify.stamped_bytes <= n && r.next_n >= 1);
    CHECK(r.verify.stamped_bytes + r.verify.after_bytes == n || !r.verify.good);
    sm_verify(text, r.verify.stamped_bytes, NULL, &v);
    CHECK(v.good && v.stamps == r.verify.stamps && v.after_bytes == 0);
    sm_recovered_finish(&r);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    const char *text = (const char *)data, *at = text, *before = text;
    size_t n_before = 0;

    while (at < text + size) {
        const char *newline = memchr(at, '\n', (size_t)(text + size - at));
        const size_t n = (size_t)((newline != NULL ? newline : text + size) - at);

        check_line(at, n, before, n_before);
        before = at;
        n_before = n;
        if (newline == NULL)
            break;
        at = newline + 1;
    }
    check_whole(text, size);
    return 0;
}
