/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_rubbish.c: a meter whose line carries rubbish between its readings, end to end: what cannot
 * be read is kept and counted, and nothing but what the meter showed is ever captured. */
#include "check.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "outside.h"
#include "record/head.h"
#include "sim/prng.h"

#define MS INT64_C(1000000)
#define READING_MS 50
#define PLATEAU_MS 4000
#define RAMP_MS 500
#define PLATEAUS 3

static const double plateau_mv[PLATEAUS] = { 100.0, -50.0, 20.0 };

static struct live l; /* large */
static struct log_check log_;
static struct sm_sim_prng prng;

/* Bytes of any kind but NUL (live_send ends there), with no regard for lines. */
static void send_any(size_t n)
{
    char text[4096];

    for (size_t i = 0; i < n; i++)
        text[i] = (char)(1 + sm_sim_prng_below(&prng, 255));
    text[n] = '\0';
    live_send(&l, 0, text);
}

/* What is not a reading, though it looks like one. */
static void send_nearly(void)
{
    static const char *const nearly[] = {
        "+9999.9\r\n",                  /* no unit */
        "+0777.7 mV  20.0\r\n",         /* no unit of temperature */
        "+0777.7 pH  20.0 C\r\n",       /* another unit */
        "+07\x80\x37.7 mV  20.0 C\r\n", /* a byte hurt */
        "+0777.7 mV\t20.0 C x\r\n",     /* more than there should be */
        "nan mV  20.0 C\r\n",
        "1e999 mV  20.0 C\r\n",
        "+0777.7.7 mV  20.0 C\r\n",
        "\xef\xbb\xbf+0777.7 mV  20.0 C\r\n",
    };

    live_send(&l, 0, nearly[sm_sim_prng_below(&prng, COUNT(nearly))]);
}

/* Between two readings: always a line end last, so that the next reading stands alone. */
static void disturb(unsigned i)
{
    switch (i % 8) {
    case 1:
        send_any(1 + sm_sim_prng_below(&prng, 300));
        break;
    case 3:
        send_nearly();
        return;
    case 5:
        live_send(&l, 0, "+0777.7 m"); /* stops in mid-line */
        break;
    case 7:
        if (i % 40 == 39) /* no end for a long time, twice the ceiling of a line and more */
            send_any(3000);
        break;
    default:
        return;
    }
    live_send(&l, 0, "\r\n");
}

static unsigned readings;

static void send_for(double from_mv, double to_mv, int span_ms)
{
    char reading[32];
    const int n = span_ms / READING_MS;

    for (int i = 0; i < n; i++, readings++) {
        disturb(readings);
        live_reading(reading, from_mv + (to_mv - from_mv) * i / n);
        live_send(&l, 0, reading);
        live_sleep_ms(READING_MS);
    }
}

/* The number after a key in a capture's line. */
static double number_of(const struct log_check_line *line, const char *key)
{
    const char *const at = memmem(line->text, line->len, key, strlen(key));

    if (at == NULL)
        fail_msg("no %s in %.*s", key, (int)line->len, line->text);
    return strtod(at + strlen(key), NULL);
}

static void check_captures(void)
{
    size_t seen[PLATEAUS] = { 0 };
    struct sm_head h;

    for (size_t i = 0; i < log_.n_lines; i++) {
        double value;
        size_t p = 0;
        if (!sm_head_read(log_.line[i].text, log_.line[i].len - 1, &h) ||
            !sm_head_is(&h, "capture"))
            continue;
        value = number_of(&log_.line[i], "\"value\":");
        while (p < PLATEAUS && !(fabs(value - plateau_mv[p]) <= 0.05))
            p++;
        if (p == PLATEAUS)
            fail_msg("captured %.17g mV, which the meter never settled at: %.*s", value,
                     (int)log_.line[i].len, log_.line[i].text);
        seen[p]++;
    }
    for (size_t p = 0; p < PLATEAUS; p++)
        if (seen[p] == 0)
            fail_msg("%.1f mV was not captured", plateau_mv[p]);
    print_message("%zu, %zu, %zu captures\n", seen[0], seen[1], seen[2]);
}

static void rubbish_is_counted_and_never_captured(void **state)
{
    const char *told = getenv("STILLMARK_SEED");
    const unsigned seed = told != NULL ? (unsigned)strtoul(told, NULL, 10) : 11;
    char line[512];

    (void)state;
    print_message("seed %u\n", seed);
    sm_sim_prng_init(&prng, seed, 0);
    live_make(&l, 1);
    l.from = 0;
    live_start(&l);
    if (!live_connect(&l, 5000))
        fail_msg("no daemon after 5 s");
    live_await(&l, "\"state\":\"up\"", 5000, line, sizeof line);
    for (size_t p = 0; p < PLATEAUS; p++) {
        if (p > 0)
            send_for(plateau_mv[p - 1], plateau_mv[p], RAMP_MS);
        send_for(plateau_mv[p], plateau_mv[p], PLATEAU_MS);
        if (p == 1) { /* a restart in the middle */
            assert_int_equal(live_stop(&l), 0);
            live_start(&l);
            if (!live_connect(&l, 5000))
                fail_msg("no daemon after the restart");
            live_await(&l, "\"state\":\"up\"", 5000, line, sizeof line);
        }
    }
    outside_stop_and_check(&l, 0, &log_, "rubbish");
    check_captures();
    print_message("%u readings sent, %zu entries of unread lines\n", readings,
                  log_check_count(&log_, "unread"));
    assert_true(log_check_count(&log_, "unread") >= 10);
    log_check_free(&log_);
    live_remove(&l);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(rubbish_is_counted_and_never_captured) };

    return cmocka_run_group_tests_name("rubbish", tests, NULL, NULL);
}
