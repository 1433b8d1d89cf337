/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_recover.c: what the next file begins from, wherever the one before it ended. */
#include "check.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "record/recover.h"
#include "small_log.h"

static char storage[256 * 1024];

static struct sm_recovered *room(void)
{
    struct sm_recovered *r = malloc(sizeof *r);

    assert_non_null(r);
    return r;
}

static void sheet_act(struct small_log *l, const char *file, const char *text, bool done)
{
    struct sm_input in = {
        .kind = SM_INPUT_ACT, .n = l->n++, .t_ns = l->t_ns, .utc_us = l->utc_us
    };
    struct sm_event e = {
        .kind = SM_EVENT_ANSWER, .n = l->n++, .t_ns = l->t_ns, .utc_us = l->utc_us
    };

    in.act.act = SM_ACT_SHEET;
    strcpy(in.act.id, "s");
    strcpy(in.act.sheet_file, file);
    in.act.sheet_text = text;
    in.act.sheet_text_n = strlen(text);
    sm_entry_input(&l->t, &in);
    e.u.answer.act = in.n;
    strcpy(e.u.answer.id, "s");
    e.u.answer.done = done;
    sm_entry_event(&l->t, &e);
    if (done) {
        l->carried->run.has = true;
        l->carried->run.number = ++l->carried->runs;
    }
    small_log_carried(l);
}

static void the_last_stamped_carried_is_given_back_wherever_a_log_is_cut(void **state)
{
    struct small_log l;
    struct sm_recovered *r = room();

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    small_log_fill(&l, 6);
    small_log_close(&l);
    for (size_t cut = 0; cut <= l.t.len; cut++) {
        const enum sm_status st = sm_recover(storage, cut, r);
        const int64_t stamps = r->verify.stamps > 6 ? 6 : r->verify.stamps;

        if (st != (stamps > 0 ? SM_OK : SM_ESHORT))
            fail_msg("cut at %zu: status %d with %lld stamps", cut, st, (long long)stamps);
        if (r->carried.captures != stamps)
            fail_msg("cut at %zu: carried of group %lld, want %lld", cut,
                     (long long)r->carried.captures, (long long)stamps);
        if (r->next_n != r->verify.last_line_n + 1 || r->closed != (cut == l.t.len))
            fail_msg("cut at %zu: next %lld, closed %d", cut, (long long)r->next_n, r->closed);
        if (stamps > 0 && (r->carried_utc_us != r->last_utc_us ||
                           r->carried_utc_us != 1796112723000000 + stamps * 1000000))
            fail_msg("cut at %zu: carried stated at %lld", cut, (long long)r->carried_utc_us);
        sm_recovered_finish(r);
    }
    small_log_end(&l);
    free(r);
}

static void whole_lines_that_were_left_out_use_up_their_numbers(void **state)
{
    struct small_log l;
    struct sm_recovered *r = room();

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    assert_int_equal(sm_recover(storage, l.t.len, r), SM_ESHORT); /* nothing is stamped */
    assert_int_equal(r->next_n, l.n);
    small_log_stamp(&l, false);
    small_log_bytes(&l, "1 mV\r\n");
    l.carried->captures = 99;
    small_log_carried(&l);
    assert_int_equal(sm_recover(storage, l.t.len, r), SM_OK);
    assert_int_equal(r->carried.captures, 0); /* that of `open` */
    assert_int_equal(r->next_n, l.n);
    assert_int_equal(r->verify.after_lines, 2);
    small_log_end(&l);
    free(r);
}

static void a_log_damaged_before_its_last_stamp_says_so_and_gives_what_stood_before(void **state)
{
    struct small_log l;
    struct sm_recovered *r = room();
    char *hurt;

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    small_log_open(&l, 0, "");
    small_log_fill(&l, 6);
    hurt = strstr(storage, "-053.2");
    assert_non_null(hurt);
    hurt[1] = '9';
    assert_int_equal(sm_recover(storage, l.t.len, r), SM_EVALUE);
    assert_int_equal(r->carried.captures, 3);
    assert_int_equal(r->next_n, l.n);
    assert_int_equal(r->verify.stamps, 3);
    small_log_end(&l);
    free(r);
}

static void expect_sheet(const struct small_log *l, const char *file, const char *text)
{
    struct sm_recovered *r = room();

    assert_int_equal(sm_recover(storage, l->t.len, r), SM_OK);
    assert_string_equal(r->sheet_file, file);
    if (text == NULL) {
        assert_null(r->sheet_text);
    } else {
        assert_non_null(r->sheet_text);
        assert_string_equal(r->sheet_text, text);
        assert_int_equal(r->sheet_text_n, strlen(text));
    }
    sm_recovered_finish(r);
    free(r);
}

static void the_sheet_in_force_is_the_last_one_that_was_accepted(void **state)
{
    struct small_log l;

    (void)state;
    small_log_begin(&l, storage, sizeof storage);
    l.carried->run.has = true;
    small_log_open(&l, 0, "");
    sm_entry_file(&l.t, l.n++, l.utc_us, "conf/sheets/old.yaml", "old\n", 4, true);
    sm_entry_file(&l.t, l.n++, l.utc_us, "conf/profiles/p.yaml", "profile\n", 8, false);
    small_log_stamp(&l, false);
    expect_sheet(&l, "conf/sheets/old.yaml", "old\n");
    sheet_act(&l, "conf/sheets/bad.yaml", "bad\n", false);
    small_log_stamp(&l, true);
    expect_sheet(&l, "conf/sheets/old.yaml", "old\n");
    sheet_act(&l, "conf/sheets/new.yaml", "new: \"\xc2\xb5\"\n", true);
    expect_sheet(&l, "conf/sheets/old.yaml", "old\n"); /* not stamped yet */
    small_log_stamp(&l, true);
    expect_sheet(&l, "conf/sheets/new.yaml", "new: \"\xc2\xb5\"\n");
    l.carried->run.has = false;
    small_log_carried(&l);
    small_log_stamp(&l, true);
    expect_sheet(&l, "", NULL); /* no run, no sheet */
    small_log_end(&l);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_last_stamped_carried_is_given_back_wherever_a_log_is_cut),
        cmocka_unit_test(whole_lines_that_were_left_out_use_up_their_numbers),
        cmocka_unit_test(a_log_damaged_before_its_last_stamp_says_so_and_gives_what_stood_before),
        cmocka_unit_test(the_sheet_in_force_is_the_last_one_that_was_accepted),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
