/* SPDX-License-Identifier: GPL-3.0-or-later */
/* unplug_rounds.c: see unplug_rounds.h. */
#include "unplug_rounds.h"

#include <string.h>

#include "outside.h"

#define MS INT64_C(1000000)
#define BACK_MS 5000   /* the limit */
#define WARM_ROUNDS 3  /* before these, buffers still find their size */
#define GROWTH_KB 1024 /* no growth worth the name: 50 rounds at 20 KiB each would show */

static struct live l; /* large */
static struct log_check log_;
static int64_t next_line_ns;

/* The meter goes on sending, one reading in 50 ms, until the daemon shows a line with this text. */
static void await(const char *kind, const char *text, int wait_ms, const char *what)
{
    const int64_t end_ns = live_now_ns() + wait_ms * MS;
    const char *line;
    char reading[32];
    size_t n;

    while (live_now_ns() < end_ns) {
        if (live_now_ns() >= next_line_ns) {
            live_reading(reading, 100.0);
            live_send(&l, 0, reading);
            next_line_ns = live_now_ns() + 50 * MS;
        }
        if (live_line(&l, 10, &line, &n) && memmem(line, n, kind, strlen(kind)) != NULL &&
            memmem(line, n, text, strlen(text)) != NULL)
            return;
    }
    fail_msg("%s: nothing of %s %s within %d ms", what, kind, text, wait_ms);
}

static void check_log(unsigned rounds)
{
    const size_t up = outside_count(&log_, "link", "\"state\":\"up\""),
                 lost = outside_count(&log_, "link", "\"state\":\"lost\""),
                 hung_up = outside_count(&log_, "link", "was unplugged or the line hung up"),
                 absent = outside_count(&log_, "link", "is not there: is the adapter plugged in?"),
                 refused = outside_count(&log_, "link", "\"state\":\"refused\"");

    if (up != rounds + 1 || hung_up != rounds || lost != hung_up + absent || refused != 0 ||
        absent > rounds)
        fail_msg("%u rounds: %zu up, %zu lost (%zu hung up, %zu not there), %zu refused", rounds,
                 up, lost, hung_up, absent, refused);
}

void unplug_rounds(unsigned rounds)
{
    struct outside begin = { 0 }, end;
    int64_t slowest_ms = 0;
    char what[48];

    live_make(&l, 1);
    live_start(&l);
    if (!live_connect(&l, 5000))
        fail_msg("no daemon after 5 s");
    for (unsigned i = 1; i <= rounds; i++) {
        int64_t back_ns;
        snprintf(what, sizeof what, "round %u", i);
        await("\"k\":\"bytes\"", "100.0 mV", BACK_MS, what);
        outside_unplug(&l, 0);
        await("\"k\":\"link\"", "\"state\":\"lost\"", BACK_MS, what);
        live_sleep_ms((int)(i * 37 % 300)); /* unevenly */
        outside_plug(&l, 0);
        back_ns = live_now_ns();
        await("\"k\":\"link\"", "\"state\":\"up\"", BACK_MS, what);
        if (live_now_ns() - back_ns > slowest_ms * MS)
            slowest_ms = (live_now_ns() - back_ns) / MS;
        if (i == WARM_ROUNDS)
            begin = outside_look(l.daemon);
    }
    await("\"k\":\"bytes\"", "100.0 mV", BACK_MS, "at the end");
    end = outside_look(l.daemon);
    print_message(
        "%u rounds: back after %lld ms at most, %u then %u descriptors, %ld then %ld KiB\n", rounds,
        (long long)slowest_ms, begin.descriptors, end.descriptors, begin.resident_kb,
        end.resident_kb);
    assert_int_equal(end.descriptors, begin.descriptors);
    assert_true(end.resident_kb - begin.resident_kb < GROWTH_KB);
    outside_stop_and_check(&l, 0, &log_, "unplugged");
    check_log(rounds);
    log_check_free(&log_);
    live_remove(&l);
}
