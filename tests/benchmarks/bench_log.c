/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bench_log.c: how long it takes to verify and to replay a bench log, beside what the least
 * possible work on the same bytes takes: verify  1 GB (or as many MB as asked) against sha256sum of
 * the same file; aim: at most 1.5 × replay  a day of 10 readings/s against a program that only
 * parses the same lines with jansson, which is this one, called with --parse; aim: at most 2 ×
 *
 *     bench_log [MB]
 *     bench_log --day FILE      writes the day's log, to look at with a profiler
 *
 * The day is a simulated session through the core, written as the daemon writes it; the large file
 * repeats it with numbers, times, hashes and signatures of its own. Each time is the least of
 * three, the file being in memory (the page cache) as a whole. */
#include <fcntl.h>
#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include <jansson.h>

#include "log_maker.h"
#include "record/head.h"
#include "sim/random_session.h"
#include "whole_file.h"

#define DAY_NS (INT64_C(86400) * SM_NS_PER_S)
#define BEGIN_UTC_US INT64_C(1796083200000000) /* 2026-12-01T00:00:00Z */

/* ---- a day ---- */

/* Beakers through the day, 10 readings/s; nothing but what a bench does. */
static void make_day(struct log_maker *m)
{
    static struct sm_scenario scenario;
    struct sm_random_session r;
    struct sm_sim *sim = NULL;

    sm_random_session_init(&r, 3000, 11);
    r.tolerance = 0.58;
    r.dwell_s = 3;
    r.rate_from = r.rate_to = 10;
    r.gap_share = 0;
    sm_scenario_init(&scenario);
    assert_int_equal(sm_random_session_make(&r, &scenario), SM_OK);
    assert_int_equal(sm_sim_create(&scenario, &sim), SM_OK);
    log_maker_begin(m, "conf/try.yaml", "try", BEGIN_UTC_US);
    log_maker_play(m, sim, DAY_NS - SM_NS_PER_S);
    log_maker_end(m);
    sm_sim_destroy(sim);
}

/* ---- and many of it in one file ---- */

struct copy {
    FILE *to;
    struct sm_hasher *hasher;
    struct sm_signer *signer;
    int64_t n, from, add_t_ns, last_t_ns, last_utc_us;
    uint64_t bytes;
    char *line;
};

static void put(struct copy *c, const char *text, size_t n)
{
    assert_int_equal(fwrite(text, 1, n, c->to), n);
    sm_hasher_add(c->hasher, text, n);
    c->bytes += n;
}

static void put_stamp(struct copy *c, bool sign)
{
    char hash[SM_HASH_HEX], sig[SM_SIG_HEX];
    struct sm_text t;

    sm_text_init(&t, c->line, SM_ENTRY_MAX);
    sm_hasher_take(c->hasher, hash);
    if (sign)
        assert_int_equal(sm_signer_sign(c->signer, "try", 1, c->n, hash, sig), SM_OK);
    sm_entry_stamp(&t, c->n, c->last_t_ns, c->last_utc_us, c->from, hash, sign ? sig : NULL);
    put(c, t.buf, t.len);
    c->from = c->n + 1;
}

/* One line of the day, with a number and times of its own. */
static void put_line(struct copy *c, const char *line, size_t n)
{
    char utc[SM_UTC_SIZE];
    struct sm_head h;
    struct sm_text t;

    assert_true(sm_head_read(line, n, &h));
    c->n++;
    if (sm_head_is(&h, "stamp")) {
        put_stamp(c, memmem(line, n, "\"sig\":", 6) != NULL);
        return;
    }
    c->last_t_ns = h.t_ns + c->add_t_ns;
    c->last_utc_us = BEGIN_UTC_US + c->last_t_ns / 1000;
    sm_utc_write(utc, c->last_utc_us);
    sm_text_init(&t, c->line, SM_ENTRY_MAX);
    sm_text_addf(&t, "{\"n\":%" PRId64 ",\"t\":%" PRId64 ",\"utc\":\"%s\",\"k\":\"", c->n,
                 c->last_t_ns, utc);
    sm_text_addn(&t, h.k, n - (size_t)(h.k - line));
    sm_text_addn(&t, "\n", 1);
    put(c, t.buf, t.len);
}

static void make_large(const struct log_maker *day, const char *path, uint64_t bytes)
{
    const struct log_maker_file *f = &day->file[0];
    struct copy c = { .to = fopen(path, "wb"), .signer = day->signer, .from = 1 };

    c.line = malloc(SM_ENTRY_MAX);
    assert_true(c.to != NULL && c.line != NULL);
    assert_int_equal(sm_hasher_create(&c.hasher), SM_OK);
    for (unsigned round = 0; c.bytes < bytes; round++) {
        const char *at = f->text, *newline;
        struct sm_head h;
        while ((newline = memchr(at, '\n', f->n - (size_t)(at - f->text))) != NULL) {
            assert_true(sm_head_read(at, (size_t)(newline - at), &h));
            /* one `open` and its files; `close` nowhere */
            if ((round == 0 || h.t_ns > 0) && !sm_head_is(&h, "close"))
                put_line(&c, at, (size_t)(newline - at));
            at = newline + 1;
        }
        c.add_t_ns += DAY_NS;
    }
    assert_int_equal(fclose(c.to), 0);
    sm_hasher_destroy(c.hasher);
    free(c.line);
}

static void write_day(const struct log_maker *day, const char *path)
{
    FILE *f = fopen(path, "wb");

    assert_non_null(f);
    assert_int_equal(fwrite(day->file[0].text, 1, day->file[0].n, f), day->file[0].n);
    assert_int_equal(fclose(f), 0);
}

/* ---- the least a reader of entries can do ---- */

static int parse_only(const char *path)
{
    struct sm_whole_file f;
    size_t lines = 0;

    if (sm_whole_file_open(path, &f) != 0)
        return 2;
    for (const char *at = f.text, *newline;
         (newline = memchr(at, '\n', f.n - (size_t)(at - f.text))) != NULL; at = newline + 1) {
        json_error_t error;
        json_t *o = json_loadb(at, (size_t)(newline - at), JSON_REJECT_DUPLICATES, &error);
        if (o == NULL)
            return 1;
        json_decref(o);
        lines++;
    }
    printf("%zu lines\n", lines);
    sm_whole_file_close(&f);
    return 0;
}

/* ---- times ---- */

static double now_s(void)
{
    struct timespec ts;

    clock_gettime(CLOCK_MONOTONIC, &ts);
    return (double)ts.tv_sec + (double)ts.tv_nsec / 1e9;
}

/* Seconds that the program takes, the least of three. */
static double least_of_three(const char *const argv[])
{
    double least = 1e9;

    for (int i = 0; i < 3; i++) {
        const double begin = now_s();
        int status = -1;
        const pid_t pid = fork();
        if (pid == 0) {
            const int null = open("/dev/null", O_WRONLY);
            dup2(null, 1);
            execvp(argv[0], (char *const *)(uintptr_t)argv);
            _exit(127);
        }
        assert_int_equal(waitpid(pid, &status, 0), pid);
        if (!WIFEXITED(status) || WEXITSTATUS(status) != 0)
            fail_msg("%s %s failed: %d", argv[0], argv[1], status);
        least = now_s() - begin < least ? now_s() - begin : least;
    }
    return least;
}

static const char *day_path;

static void only_the_day(void **state)
{
    static struct log_maker day;

    (void)state;
    make_day(&day);
    write_day(&day, day_path);
    log_maker_finish(&day);
}

static unsigned megabytes = 1000;
static const char *own_name;

static void verify_and_replay(void **state)
{
    static struct log_maker day;
    char large[64], short_[64];
    const char *const verify[] = { SM_BIN_DIR "/stillmark", "verify", large, NULL };
    const char *const sha[] = { "sha256sum", large, NULL };
    const char *const replay[] = { SM_BIN_DIR "/stillmark-replay", short_, NULL };
    const char *const parse[] = { own_name, "--parse", short_, NULL };
    struct stat st;
    double a, b;

    (void)state;
    snprintf(large, sizeof large, "/tmp/stillmark-bench-large.%ld.jsonl", (long)getpid());
    snprintf(short_, sizeof short_, "/tmp/stillmark-bench-day.%ld.jsonl", (long)getpid());
    b = now_s();
    make_day(&day);
    printf("a day of 10 readings/s: %.1f MB, %" PRId64 " entries; simulated, fed and written in "
           "%.1f s\n",
           (double)day.file[0].n / 1e6, day.n, now_s() - b);
    write_day(&day, short_);
    make_large(&day, large, (uint64_t)megabytes * 1000000);
    assert_int_equal(stat(large, &st), 0);
    b = least_of_three(sha);
    a = least_of_three(verify);
    printf("verify of %.0f MB: %.2f s; sha256sum of it: %.2f s; ratio %.2f (aim: at most 1.5)\n",
           (double)st.st_size / 1e6, a, b, a / b);
    b = least_of_three(parse);
    a = least_of_three(replay);
    printf("replay of %.1f MB: %.2f s; parsing it with jansson: %.2f s; ratio %.2f (aim: at most "
           "2)\n",
           (double)day.file[0].n / 1e6, a, b, a / b);
    unlink(large);
    unlink(short_);
    log_maker_finish(&day);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(verify_and_replay) };

    const struct CMUnitTest one_day[] = { cmocka_unit_test(only_the_day) };

    own_name = argv[0];
    if (argc == 3 && strcmp(argv[1], "--day") == 0) {
        day_path = argv[2];
        return cmocka_run_group_tests(one_day, NULL, NULL);
    }
    if (argc == 3 && strcmp(argv[1], "--parse") == 0)
        return parse_only(argv[2]);
    if (argc == 2)
        megabytes = (unsigned)strtoul(argv[1], NULL, 10);
    return cmocka_run_group_tests(tests, NULL, NULL);
}
