/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_meters.c: twenty meters in one daemon, five of them as bad as meters get: the fifteen others
 * lose no byte and wait for none of them. */
#include "check.h"

#include <fcntl.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/file.h>
#include <unistd.h>

#include "daemon/scratch.h"
#include "outside.h"
#include "record/head.h"
#include "sim/prng.h"

enum { RUBBISH, JUNK_LINES, HUNG, IN_USE, SILENT, GOOD, METERS = LIVE_METERS };

#define MS INT64_C(1000000)
#define SPAN_MS 8000
#define STEP_MS 10
#define READING_MS 100
#define READINGS (SPAN_MS / READING_MS)
#define FLOOD 2000   /* bytes a step, 200 kB/s: four times the fastest common line */
#define LATE_MS 1000 /* no good meter's reading is logged later than this after it was sent */

static struct live l; /* large */
static struct log_check log_;
static struct sm_sim_prng prng;
static int64_t sent_us[METERS][READINGS];

static void write_meter(size_t meter, const char *text)
{
    char path[128];

    snprintf(path, sizeof path, "%s/conf/meters/m%zu.yaml", l.path, meter + 1);
    scratch_write(path, text);
}

/* Beside what live_make has written: a meter that is asked much and answers nothing, and a silent
 * one. */
static void write_bad_meters(void)
{
    char path[128], text[640];

    snprintf(path, sizeof path, "%s/conf/profiles/asked.yaml", l.path);
    snprintf(text, sizeof text,
             "eol: crlf\nsplit: spaces\nask: { text: \"%0120d\\n\", every: 50 ms, within: 50 ms }\n"
             "channels:\n  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
             "  probe: { at: 3, unit-at: 4, unit: °C, written: C }\n"
             "example: { line: \"-0012.4 mV  20.0 C\", potential: -12.4 mV }\n",
             7);
    scratch_write(path, text);
    snprintf(text, sizeof text,
             "port: %s/line%d\nline: { baud: 9600, bits: 8, parity: none }\nsilence: 10 s\n"
             "profile: asked\nmethod: quick\nsensor: el\n",
             l.path, HUNG + 1);
    write_meter(HUNG, text);
    snprintf(text, sizeof text,
             "port: %s/line%d\nline: { baud: 9600, bits: 8, parity: none }\nsilence: 2 s\n"
             "profile: mv\nmethod: quick\nsensor: el\n",
             l.path, SILENT + 1);
    write_meter(SILENT, text);
}

static void await_all_open(void)
{
    const int64_t end_ns = live_now_ns() + 10000 * MS;
    size_t heard = 0;

    while (heard < METERS) {
        if (live_now_ns() > end_ns)
            fail_msg("only %zu of %d lines were opened", heard, METERS);
        live_sleep_ms(20);
        heard = 0;
        for (size_t m = 0; m < METERS; m++)
            heard += sm_sim_pty_heard(&l.pty[m]);
    }
    live_sleep_ms(300); /* what came before a line was set up is flushed */
}

static void flood(void)
{
    char rubbish[FLOOD + 1];

    for (size_t i = 0; i < FLOOD; i++)
        rubbish[i] = (char)(1 + sm_sim_prng_below(&prng, 255));
    rubbish[FLOOD] = '\0';
    live_send(&l, RUBBISH, rubbish);
    for (size_t i = 0; i < FLOOD; i++)
        rubbish[i] = "x?\r\n"[i % 4];
    live_send(&l, JUNK_LINES, rubbish);
}

static void send_readings(size_t i)
{
    char reading[32];

    live_reading(reading, 0.1 * (double)i);
    for (size_t m = GOOD; m < METERS; m++) {
        sent_us[m][i] = outside_now_us();
        live_send(&l, m, reading);
    }
}

/* All that was sent, in order, each reading in time; the latest of them, in ms. */
static double check_good(size_t meter)
{
    char want[READINGS * 48], got[READINGS * 48 * 2] = "", reading[32];
    size_t n_got = 0, n_want = 0, line = 0;
    int64_t latest_us = 0;
    struct sm_head h;

    for (size_t i = 0; i < READINGS; i++) {
        live_reading(reading, 0.1 * (double)i);
        n_want += (size_t)snprintf(want + n_want, sizeof want - n_want, "%.*s\\u000d\\u000a",
                                   (int)strcspn(reading, "\r"), reading);
    }
    for (size_t i = 0; i < log_.n_lines; i++) {
        const struct log_check_line *e = &log_.line[i];
        const char *b, *end;
        if (!sm_head_read(e->text, e->len - 1, &h) || !sm_head_is(&h, "bytes"))
            continue;
        b = memmem(e->text, e->len, "\"b\":\"", 5);
        assert_non_null(b);
        b += 5;
        end = memchr(b, '"', e->len - (size_t)(b - e->text));
        assert_non_null(end);
        assert_true(n_got + (size_t)(end - b) < sizeof got);
        memcpy(got + n_got, b, (size_t)(end - b));
        n_got += (size_t)(end - b);
        got[n_got] = '\0';
        for (const char *at = b; (at = memmem(at, (size_t)(end - at), "\\u000a", 6)) != NULL; at++)
            if (line < READINGS && outside_utc_us(e) - sent_us[meter][line++] > latest_us)
                latest_us = outside_utc_us(e) - sent_us[meter][line - 1];
    }
    if (n_got != n_want || memcmp(got, want, n_want) != 0)
        fail_msg("m%zu: %zu characters logged, %zu sent; they begin %.60s", meter + 1, n_got,
                 n_want, got);
    return 1e-3 * (double)latest_us;
}

/* Of a flood ten lines a minute are logged in full, the others only counted; nothing is captured.
 */
static void check_flood(size_t meter)
{
    const size_t unread = log_check_count(&log_, "unread"),
                 captures = log_check_count(&log_, "capture");

    print_message("m%zu: %zu entries of %zu are \"unread\"\n", meter + 1, unread, log_.n_lines);
    if (unread - outside_count(&log_, "unread", "\"count\":") != 10)
        fail_msg("m%zu: %zu unread lines logged in full", meter + 1, unread);
    assert_int_equal(captures, 0);
}

static void check_hung(void)
{
    const size_t lost = outside_count(&log_, "link", "does not take the question"),
                 up = outside_count(&log_, "link", "\"state\":\"up\"");

    print_message("m%d: %zu questions, lost %zu times\n", HUNG + 1, log_check_count(&log_, "sent"),
                  lost);
    assert_true(log_check_count(&log_, "sent") > 20);
    assert_int_equal(up, lost + 1);
}

static void check_in_use(void)
{
    assert_int_equal(outside_count(&log_, "link", "is in use by another program"), 1);
    assert_int_equal(log_check_count(&log_, "link"), 1);
}

static void load_log(size_t meter)
{
    char folder[128];

    live_folder(&l, meter, folder, sizeof folder);
    log_check_load(&log_, folder, "twenty meters");
}

static void check_logs(void)
{
    double latest_ms = 0;

    for (size_t m = 0; m < METERS; m++) {
        load_log(m);
        if (m == RUBBISH || m == JUNK_LINES)
            check_flood(m);
        else if (m == HUNG)
            check_hung();
        else if (m == IN_USE)
            check_in_use();
        else if (m == SILENT)
            assert_int_equal(log_check_count(&log_, "silent"), 1);
        else
            latest_ms = fmax(latest_ms, check_good(m));
        log_check_free(&log_);
    }
    print_message("the latest reading of a good meter was logged after %.1f ms\n", latest_ms);
    assert_true(latest_ms < LATE_MS);
}

static void bad_meters_disturb_no_other(void **state)
{
    struct outside begin, end;
    int64_t begin_ns;
    int held;

    (void)state;
    sm_sim_prng_init(&prng, 7, 0);
    live_make(&l, METERS);
    write_bad_meters();
    held = open(l.pty[IN_USE].path, O_RDWR | O_NOCTTY | O_CLOEXEC);
    assert_true(held >= 0);
    assert_int_equal(flock(held, LOCK_EX), 0);
    live_start(&l);
    if (!live_connect(&l, 10000))
        fail_msg("no daemon after 10 s");
    live_disconnect(&l); /* nobody follows */
    await_all_open();
    begin = outside_look(l.daemon);
    begin_ns = live_now_ns();
    for (int ms = 0; ms < SPAN_MS; ms += STEP_MS) {
        while (live_now_ns() < begin_ns + ms * MS)
            live_sleep_ms(1);
        flood();
        if (ms % READING_MS == 0)
            send_readings((size_t)(ms / READING_MS));
    }
    live_sleep_ms(300);
    end = outside_look(l.daemon);
    print_message("%.0f %% of a processor, %ld then %ld KiB, %u then %u descriptors\n",
                  100 * (end.cpu_s - begin.cpu_s) / (1e-3 * SPAN_MS), begin.resident_kb,
                  end.resident_kb, begin.descriptors, end.descriptors);
    outside_stop_and_check(&l, 0, &log_, "twenty meters");
    log_check_free(&log_);
    close(held);
    check_logs();
    live_remove(&l);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(bad_meters_disturb_no_other) };

    return cmocka_run_group_tests_name("meters", tests, NULL, NULL);
}
