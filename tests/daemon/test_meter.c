/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_meter.c: one meter on a pseudo-terminal: what it logs, announces, and carries over midnight,
 * restarts, unplugging and a disk that fails. */
#include "rig.h"

#include <pthread.h>

static const char sheet[] =
    "method: ph\nsensor: el-1\nitems:\n  - { standard: B4 }\n  - { check: C7 }\n"
    "  - { sample: final }\n";

/* A beaker: readings ten a second for so many seconds. */
static void beaker(struct rig *r, const char *line, int seconds)
{
    for (int i = 0; i < 10 * seconds; i++) {
        rig_pass(r, SM_NS_PER_S / 10);
        rig_send(r, line);
    }
    rig_pass(r, 2 * SM_NS_PER_S / 10);
}

static void a_settled_beaker_is_logged_and_announced_when_it_is_on_disk(void **state)
{
    struct rig r;
    char *log;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    assert_true(r.watched >= 0);
    rig_send(&r, "-9\r\n"); /* the first line may have begun before the port was opened */
    beaker(&r, "-0012.4 mV  24.8 C\r\n", 12);
    assert_int_equal(rig_count(r.told, "\"k\":\"capture\""), 1);
    assert_true(rig_count(r.told, "\"k\":\"bytes\"") >= 100);
    assert_true(rig_count(r.live, "\"k\":\"reading\"") >= 100);
    rig_nothing_announced_is_lost(&r, "one beaker");
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    log = rig_log(&r);
    assert_int_equal(rig_count(log, "\"k\":\"open\""), 1);
    assert_int_equal(rig_count(log, "\"how\":\"first\""), 1);
    assert_int_equal(rig_count(log, "\"k\":\"file\""), 5);
    assert_int_equal(rig_count(log, "\"k\":\"close\""), 1);
    assert_int_equal(rig_count(log, "\"state\":\"up\""), 1);
    free(log);
    rig_remove(&r);
}

static void a_durable_event_is_not_told_before_its_group_is_synced(void **state)
{
    struct rig r;
    struct sm_act act = { .act = SM_ACT_NOTE, .id = "n1", .door = "socket", .text = "a note" };
    char why[SM_WHY_SIZE];
    int64_t n;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    assert_int_equal(sm_meter_act(r.meter, &r.now, &act, &n, why), SM_OK);
    sm_meter_wake(r.meter, &r.now); /* handed to the writer; its news not fetched yet */
    assert_int_equal(rig_count(r.told, "\"k\":\"act\""), 1);
    assert_int_equal(rig_count(r.told, "\"k\":\"answer\""), 0);
    assert_int_equal(rig_count(r.told, "\"k\":\"carried\""), 0);
    assert_int_equal(r.answered, 0);
    rig_settle(&r);
    assert_int_equal(rig_count(r.told, "\"k\":\"answer\""), 1);
    assert_int_equal(r.answered, n);
    assert_non_null(strstr(r.answer, "\"done\":true"));
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    rig_remove(&r);
}

static void a_refused_sheet_is_logged_and_answered(void **state)
{
    struct rig r;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    assert_true(rig_act(&r, "sheet", "s1", "method: nothing\nitems: [ { standard: B4 } ]\n") > 0);
    assert_non_null(strstr(r.answer, "\"done\":false"));
    assert_int_equal(rig_count(r.told, "\"refused\":\"sheet.yaml:1:9"), 1);
    assert_true(rig_act(&r, "sheet", "s2", sheet) > 0);
    assert_non_null(strstr(r.answer, "\"done\":true"));
    assert_true(rig_act(&r, "sheet", "s2", sheet) > 0);
    assert_non_null(strstr(r.answer, "\"done\":false")); /* the same id again */
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    rig_remove(&r);
}

static void after_midnight_the_file_is_changed_and_the_sheet_goes_on(void **state)
{
    struct rig r;
    char *log;

    (void)state;
    rig_make(&r, false);
    r.now.utc_us = RIG_UTC_US - RIG_UTC_US % SM_US_PER_DAY + SM_US_PER_DAY - 5000000;
    rig_start(&r);
    assert_true(rig_act(&r, "sheet", "s1", sheet) > 0);
    rig_send(&r, "-9\r\n");
    rig_pass(&r, 10 * SM_NS_PER_S); /* past midnight, nothing in the beaker */
    rig_send(&r, "-0012.4 mV  24.8 C\r\n");
    rig_pass(&r, 2 * SM_NS_PER_S);
    assert_int_equal(rig_verify(&r), 2);
    log = rig_log(&r);
    assert_int_equal(rig_count(log, "\"how\":\"rollover\""), 1);
    assert_int_equal(rig_count(log, "\"k\":\"roll\""), 1);
    assert_int_equal(rig_count(log, "\"continues\":true"), 1);
    assert_int_equal(rig_count(log, "\"sheet\":true"),
                     1); /* the sheet in force, in the second file */
    free(log);
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 2);
    rig_remove(&r);
}

static void an_open_immersion_keeps_the_file_for_an_hour_at_most(void **state)
{
    struct rig r;
    char line[40], *log;

    (void)state;
    rig_make(&r, false);
    r.now.utc_us = RIG_UTC_US - RIG_UTC_US % SM_US_PER_DAY + SM_US_PER_DAY - 30000000;
    r.setup->meter[0].core.silence_ns = 7200 * SM_NS_PER_S;
    for (size_t i = 0; i < SM_CLASS_COUNT; i++)
        r.setup->method[0].rule.longest_wait_ns[i] = 7200 * SM_NS_PER_S;
    rig_start(&r);
    rig_send(&r, "-9\r\n");
    for (int i = 0; i < 3700; i++) { /* drifts and never settles */
        snprintf(line, sizeof line, "%.1f mV  24.8 C\r\n", -100 + 1.0 * i);
        rig_pass(&r, SM_NS_PER_S);
        assert_int_equal(write(r.master, line, strlen(line)), strlen(line));
        sm_meter_readable(r.meter, &r.now);
        rig_settle(&r);
        if (i == 3600 && rig_verify(&r) != 1)
            fail_msg("just before one o'clock: %zu files, want 1", rig_verify(&r));
    }
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 2);
    log = rig_log(&r);
    assert_int_equal(rig_count(log, "\"how\":\"rollover\""), 1);
    assert_int_equal(rig_count(log, "not captured: log changed"), 1);
    free(log);
    rig_remove(&r);
}

static void a_restart_goes_on_where_the_last_stamp_was(void **state)
{
    struct rig r;
    char *log;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    assert_true(rig_act(&r, "sheet", "s1", sheet) > 0);
    rig_stop(&r);
    r.now.utc_us += 60 * 1000000;
    r.now.boot_ns += 60 * SM_NS_PER_S;
    rig_start(&r);
    assert_true(rig_act(&r, "note", "n1", "after the restart") > 0);
    rig_kill(&r);
    r.now.utc_us += 60 * 1000000;
    rig_start(&r);
    assert_true(rig_act(&r, "note", "n1", "a repeat over a restart") > 0);
    assert_non_null(strstr(r.answer, "\"done\":false"));
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 3);
    log = rig_log(&r);
    assert_int_equal(rig_count(log, "\"how\":\"start\""), 1);
    assert_int_equal(rig_count(log, "\"how\":\"recovery\""), 1);
    assert_int_equal(rig_count(log, "\"sheet\":true"), 2);
    assert_int_equal(rig_count(log, "ended without closing"), 1);
    rig_nothing_announced_is_lost(&r, "two restarts");
    free(log);
    rig_remove(&r);
}

static unsigned open_descriptors(void)
{
    char name[256][80];

    return (unsigned)scratch_list("/proc/self/fd", "", name, COUNT(name));
}

static void a_lost_port_is_closed_at_once_and_comes_back(void **state)
{
    struct rig r;
    unsigned descriptors;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    descriptors = open_descriptors();
    for (int i = 0; i < 50; i++) {
        const int watched = r.watched;
        rig_unplug(&r);
        sm_meter_readable(r.meter, &r.now);
        rig_settle(&r);
        assert_true(watched >= 0);
        assert_int_equal(r.watched, -1);
        assert_int_equal(rig_count(r.told, "\"state\":\"lost\""), 2 * i + 1);
        rig_pass(&r, 20 * SM_NS_PER_S); /* not there: said once more, with the other reason */
        assert_int_equal(r.watched, -1);
        rig_plug(&r);
        rig_pass(&r, 5 * SM_NS_PER_S / 2);
        assert_true(r.watched >= 0);
        assert_int_equal(rig_count(r.told, "\"state\":\"up\""), i + 2);
    }
    assert_int_equal(open_descriptors(), descriptors);
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    rig_remove(&r);
}

static void a_question_is_sent_whole_and_logged(void **state)
{
    struct rig r;
    char got[64] = "";
    ssize_t n;

    (void)state;
    rig_make(&r, true);
    rig_start(&r);
    rig_pass(&r, SM_NS_PER_S / 10);
    n = read(r.master, got, sizeof got - 1);
    assert_int_equal(n, 2);
    assert_string_equal(got, "R\r");
    assert_int_equal(rig_count(r.told, "\"k\":\"ask\""), 1);
    assert_int_equal(rig_count(r.told, "\"k\":\"sent\""), 1);
    rig_send(&r, "-0012.4 mV  24.8 C\r\n");
    assert_int_equal(rig_count(r.live, "\"k\":\"reading\""), 1);
    rig_pass(&r, 3 * SM_NS_PER_S);
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    rig_remove(&r);
}

static void the_wall_clock_set_back_is_said_and_changes_nothing_else(void **state)
{
    struct rig r;

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    rig_pass(&r, SM_NS_PER_S);
    r.now.utc_us -= 2 * SM_US_PER_DAY;
    r.now.jump_us = -2 * SM_US_PER_DAY;
    sm_meter_clock(r.meter, &r.now);
    r.now.jump_us = 0;
    rig_pass(&r, 3 * SM_NS_PER_S);
    assert_int_equal(rig_count(r.told, "\"what\":\"jump\",\"by_us\":-172800000000"), 1);
    rig_stop(&r);
    rig_start(&r); /* the entries before are in the future */
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 2);
    rig_remove(&r);
}

static void a_failed_sync_is_a_crash_of_the_meter_that_ends_by_itself(void **state)
{
    static const enum sm_call calls[] = { SM_CALL_FDATASYNC, SM_CALL_WRITE };
    (void)state;
    for (size_t i = 0; i < COUNT(calls); i++) {
        struct rig r;
        char *log;

        rig_make(&r, false);
        rig_start(&r);
        rig_send(&r, "-9\r\n-0012.4 mV  24.8 C\r\n");
        sm_door_fail_plan(&r.door, SM_CALLS(calls[i]), 1, true, ENOSPC, i == 1);
        assert_true(rig_act(&r, "note", "n1", "never answered") > 0);
        assert_int_equal(r.lost, 1);
        assert_int_equal(r.answered, 0);
        assert_int_equal(rig_act(&r, "note", "n2", "refused"), 0);
        rig_send(&r, "-0012.4 mV  24.8 C\r\n");
        assert_int_equal(rig_count(r.live, "\"note\":\"not logged\""), 1);
        rig_pass(&r, 7 * SM_NS_PER_S); /* three more attempts, each in vain */
        sm_door_fail_heal(&r.door);
        rig_pass(&r, 3 * SM_NS_PER_S);
        assert_true(rig_act(&r, "note", "n3", "logged again") > 0);
        assert_non_null(strstr(r.answer, "\"done\":true"));
        rig_nothing_announced_is_lost(&r, "failed sync");
        rig_stop(&r);
        assert_int_equal(rig_verify(&r), 2); /* no file of the attempts in vain */
        log = rig_log(&r);
        assert_int_equal(rig_count(log, "\"how\":\"recovery\""), 1);
        assert_int_equal(rig_count(log, "nothing was logged"), 1);
        free(log);
        rig_remove(&r);
    }
}

static struct {
    pthread_mutex_t lock;
    pthread_cond_t wake;
    bool hangs;
} disk = { PTHREAD_MUTEX_INITIALIZER, PTHREAD_COND_INITIALIZER, false };

static int hanging_sync(const struct sm_door *d, int fd)
{
    (void)d;
    pthread_mutex_lock(&disk.lock);
    while (disk.hangs)
        pthread_cond_wait(&disk.wake, &disk.lock);
    pthread_mutex_unlock(&disk.lock);
    return sm_door_system()->fdatasync(sm_door_system(), fd);
}

static void let_disk(bool hang)
{
    pthread_mutex_lock(&disk.lock);
    disk.hangs = hang;
    pthread_cond_broadcast(&disk.wake);
    pthread_mutex_unlock(&disk.lock);
}

static void a_disk_that_hangs_is_a_failure_after_ten_seconds_and_stalls_nothing(void **state)
{
    static const char line[] = "-0012.4 mV  24.8 C\r\n";
    struct sm_act act = { .act = SM_ACT_NOTE, .id = "n1", .door = "socket", .text = "a note" };
    char why[SM_WHY_SIZE];
    struct rig r;
    int64_t n;

    (void)state;
    rig_make(&r, false);
    r.door.door.fdatasync = hanging_sync;
    rig_start(&r);
    rig_send(&r, line);
    rig_pass(&r, 2 * SM_NS_PER_S);
    let_disk(true);
    assert_int_equal(sm_meter_act(r.meter, &r.now, &act, &n, why), SM_OK);
    for (int i = 0; i < 99; i++) { /* it goes on reading */
        r.now.boot_ns += SM_NS_PER_S / 10;
        r.now.utc_us += 100000;
        assert_int_equal(write(r.master, line, sizeof line - 1), sizeof line - 1);
        sm_meter_readable(r.meter, &r.now);
        sm_meter_written(r.meter, &r.now);
    }
    assert_int_equal(r.lost, 0);
    assert_true(rig_count(r.live, "\"k\":\"reading\"") > 90);
    r.now.boot_ns += SM_NS_PER_S;
    sm_meter_wake(r.meter, &r.now);
    assert_int_equal(r.lost, 1);
    assert_non_null(strstr(r.lost_why, "10 s"));
    assert_int_equal(r.answered, 0);
    assert_int_equal(sm_meter_act(r.meter, &r.now, &act, &n, why), SM_EIO);
    r.now.boot_ns += 3 * SM_NS_PER_S; /* the next attempt waits behind what hangs */
    sm_meter_wake(r.meter, &r.now);
    let_disk(false);
    rig_settle(&r);
    rig_pass(&r, 3 * SM_NS_PER_S);
    assert_int_equal(r.answered, 0); /* on disk after all, but its sender was told otherwise */
    assert_true(rig_act(&r, "note", "n2", "logged again") > 0);
    rig_nothing_announced_is_lost(&r, "a disk that hung");
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 2);
    rig_remove(&r);
}

/* A short session over midnight that touches all that the log's door does. */
static void session(struct rig *r)
{
    rig_send(r, "-9\r\n-0012.4 mV  24.8 C\r\n");
    rig_act(r, "sheet", "a1", sheet);
    rig_pass(r, 3 * SM_NS_PER_S / 2);
    rig_send(r, "-0012.4 mV  24.8 C\r\n");
    rig_act(r, "note", "a2", "before midnight");
    rig_pass(r, 5 * SM_NS_PER_S);
    rig_act(r, "note", "a3", "after midnight");
    rig_pass(r, 5 * SM_NS_PER_S / 2);
}

/* One call fails, in one way; gives how many failed. */
static unsigned session_with_failure(unsigned nth, bool from_the_start, bool for_good, int error,
                                     bool short_write)
{
    struct rig r;
    char what[80];
    unsigned failed;

    snprintf(what, sizeof what, "call %u%s%s, errno %d%s", nth, from_the_start ? " at start" : "",
             for_good ? " and all after" : "", error, short_write ? ", short" : "");
    rig_make(&r, false);
    r.now.utc_us = RIG_UTC_US - RIG_UTC_US % SM_US_PER_DAY + SM_US_PER_DAY - 5000000;
    if (!from_the_start)
        rig_start(&r);
    sm_door_fail_plan(&r.door, SM_CALLS_LOG & ~SM_CALLS(SM_CALL_READ), nth, for_good, error,
                      short_write);
    if (r.meter != NULL || rig_try_start(&r))
        session(&r);
    failed = atomic_load(&r.door.failed);
    sm_door_fail_heal(&r.door);
    rig_nothing_announced_is_lost(&r, what);
    if (r.meter == NULL)
        rig_start(&r);
    rig_pass(&r, 5 * SM_NS_PER_S);
    if (rig_act(&r, "note", "a9", "sound again") == 0)
        fail_msg("%s: not logged again when the disk is sound", what);
    rig_stop(&r);
    rig_start(&r); /* and the next start finds all of it */
    rig_stop(&r);
    rig_verify(&r);
    rig_nothing_announced_is_lost(&r, what);
    rig_remove(&r);
    return failed;
}

static void every_call_of_the_log_failed_in_turn_loses_nothing_announced(void **state)
{
    unsigned reached = 0;

    (void)state;
    for (unsigned mode = 0; mode < 12; mode++) {
        const int error = mode % 3 == 0 ? EIO : ENOSPC;
        for (unsigned nth = 1;; nth++) {
            if (session_with_failure(nth, mode >= 6, (mode / 3) % 2 == 1, error, mode % 3 == 2) ==
                0)
                break;
            reached++;
        }
    }
    print_message("%u sessions, each with another call failing\n", reached);
    assert_true(reached >= 12 * 15); /* a session makes at least so many calls */
}

static void a_log_folder_taken_away_is_made_again(void **state)
{
    struct rig r;
    char moved[160];

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    assert_true(rig_act(&r, "note", "n1", "before") > 0);
    snprintf(moved, sizeof moved, "%s/moved", r.scratch.path);
    assert_int_equal(rename(r.folder, moved), 0);
    assert_true(rig_act(&r, "note", "n2", "the open file is still written") > 0);
    rig_stop(&r);
    rig_start(&r);
    assert_true(rig_act(&r, "note", "n3", "a folder made anew") > 0);
    rig_stop(&r);
    assert_int_equal(rig_verify(&r), 1);
    rig_remove(&r);
}

static void two_daemons_on_one_folder_are_told_apart(void **state)
{
    struct rig r;
    struct sm_meter *second;
    struct sm_meter_about about;
    char why[SM_WHY_SIZE];

    (void)state;
    rig_make(&r, false);
    rig_start(&r);
    about = (struct sm_meter_about){ &r.door.door, r.setup, &r.setup->meter[0], r.signer, "",
                                     "",           { 0 } };
    assert_int_equal(sm_meter_create(&about, &second, why), SM_EBUSY);
    assert_non_null(strstr(why, "another stillmarkd"));
    assert_non_null(strstr(why, "logs/m1"));
    rig_stop(&r);
    rig_remove(&r);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_settled_beaker_is_logged_and_announced_when_it_is_on_disk),
        cmocka_unit_test(a_durable_event_is_not_told_before_its_group_is_synced),
        cmocka_unit_test(a_refused_sheet_is_logged_and_answered),
        cmocka_unit_test(after_midnight_the_file_is_changed_and_the_sheet_goes_on),
        cmocka_unit_test(an_open_immersion_keeps_the_file_for_an_hour_at_most),
        cmocka_unit_test(a_restart_goes_on_where_the_last_stamp_was),
        cmocka_unit_test(a_lost_port_is_closed_at_once_and_comes_back),
        cmocka_unit_test(a_question_is_sent_whole_and_logged),
        cmocka_unit_test(the_wall_clock_set_back_is_said_and_changes_nothing_else),
        cmocka_unit_test(a_failed_sync_is_a_crash_of_the_meter_that_ends_by_itself),
        cmocka_unit_test(a_disk_that_hangs_is_a_failure_after_ten_seconds_and_stalls_nothing),
        cmocka_unit_test(every_call_of_the_log_failed_in_turn_loses_nothing_announced),
        cmocka_unit_test(a_log_folder_taken_away_is_made_again),
        cmocka_unit_test(two_daemons_on_one_folder_are_told_apart),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
