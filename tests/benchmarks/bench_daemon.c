/* SPDX-License-Identifier: GPL-3.0-or-later */
/* bench_daemon.c: what the running daemon costs, and how soon it tells.
 *   CPU and memory for 1 and for 20 pseudo-terminals at 10 readings/s, beside a program that does
 *   nothing but read the same terminals into files and sync them once a second;
 *   time from a byte to its durable announcement: of notes (sent to the socket, to the answer) on a
 *   meter that sends 10 readings/s, and of captures (the reading that settles it, to the capture)
 * on 20 of them, beside writing and syncing the same number of bytes to the same disk.
 *
 *     bench_daemon [SECONDS]      for each of the first two; 30 */
#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "base/time.h"
#include "live.h"
#include "log_check.h"
#include "record/head.h"

#define MS INT64_C(1000000)
#define READING_NS (100 * MS)
#define SAMPLES 4096

static int seconds = 30;

static int64_t utc_us_now(void)
{
    struct timespec ts;

    clock_gettime(CLOCK_REALTIME, &ts);
    return (int64_t)ts.tv_sec * 1000000 + ts.tv_nsec / 1000;
}

/* ---- what a process has used ---- */

struct used {
    double cpu_s;
    long rss_kb;
};

static struct used look_at(pid_t pid)
{
    struct used u = { 0 };
    struct timespec ts;
    char path[64], line[1024];
    clockid_t clock;
    FILE *f;

    assert_int_equal(clock_getcpuclockid(pid, &clock), 0); /* user and system, finer than ticks */
    assert_int_equal(clock_gettime(clock, &ts), 0);
    u.cpu_s = (double)ts.tv_sec + (double)ts.tv_nsec / 1e9;
    snprintf(path, sizeof path, "/proc/%ld/status", (long)pid);
    f = fopen(path, "r");
    assert_non_null(f);
    while (fgets(line, sizeof line, f) != NULL)
        if (strncmp(line, "VmRSS:", 6) == 0)
            u.rss_kb = strtol(line + 6, NULL, 10);
    fclose(f);
    return u;
}

/* ---- meters ---- */

struct meters {
    int64_t due_ns[LIVE_METERS];
    int64_t sent_utc_us[LIVE_METERS][2]; /* the last two readings, newest first */
    double mv[LIVE_METERS];
    unsigned n_sent;
};

static void meters_begin(struct meters *m, size_t n)
{
    memset(m, 0, sizeof *m);
    for (size_t i = 0; i < n; i++)
        m->due_ns[i] = live_now_ns() + (int64_t)i * READING_NS / (int64_t)n;
}

/* Sends what is due; when something is due next. */
static int64_t meters_send(struct meters *m, const struct live *l)
{
    const int64_t now_ns = live_now_ns();
    int64_t next_ns = now_ns + READING_NS;
    char text[32];

    for (size_t i = 0; i < l->n_meters; i++) {
        if (m->due_ns[i] <= now_ns) {
            live_reading(text, m->mv[i] + 0.1 * (m->n_sent % 3));
            m->sent_utc_us[i][1] = m->sent_utc_us[i][0];
            m->sent_utc_us[i][0] = utc_us_now();
            live_send(l, i, text);
            m->n_sent++;
            m->due_ns[i] += READING_NS;
        }
        if (m->due_ns[i] < next_ns)
            next_ns = m->due_ns[i];
    }
    return next_ns;
}

static void meters_run(struct meters *m, const struct live *l, int64_t ns)
{
    const int64_t end_ns = live_now_ns() + ns;

    while (live_now_ns() < end_ns) {
        const int64_t wait_ns = meters_send(m, l) - live_now_ns();
        const struct timespec ts = { 0, wait_ns > 0 ? (long)wait_ns : 0 };
        nanosleep(&ts, NULL);
    }
}

/* ---- CPU and memory ---- */

/* The least a logger can do. */
static pid_t start_plain_logger(const struct live *l)
{
    struct pollfd p[LIVE_METERS];
    int file[LIVE_METERS];
    char path[96], buf[4096];
    int64_t sync_ns = live_now_ns();
    const pid_t pid = fork();

    if (pid != 0)
        return pid;
    prctl(PR_SET_PDEATHSIG, SIGKILL);
    for (size_t i = 0; i < l->n_meters; i++) {
        snprintf(path, sizeof path, "%s/plain%zu", l->path, i);
        file[i] = open(path, O_WRONLY | O_CREAT | O_APPEND, 0600);
        p[i] = (struct pollfd){ .fd = open(l->pty[i].path, O_RDWR | O_NOCTTY | O_NONBLOCK),
                                .events = POLLIN };
        if (file[i] < 0 || p[i].fd < 0)
            _exit(1);
    }
    for (;;) {
        (void)poll(p, l->n_meters, 1000);
        for (size_t i = 0; i < l->n_meters; i++) {
            const ssize_t n = (p[i].revents & POLLIN) != 0 ? read(p[i].fd, buf, sizeof buf) : 0;
            if (n > 0 && write(file[i], buf, (size_t)n) != n)
                _exit(1);
        }
        if (live_now_ns() - sync_ns < 1000 * MS)
            continue;
        sync_ns = live_now_ns();
        for (size_t i = 0; i < l->n_meters; i++)
            (void)fdatasync(file[i]);
    }
}

/* CPU seconds per second, memory at the end. */
static struct used measure(const struct live *l, pid_t pid)
{
    struct meters m;
    struct used before, after;

    meters_begin(&m, l->n_meters);
    meters_run(&m, l, 1500 * MS);
    before = look_at(pid);
    meters_run(&m, l, seconds * 1000 * MS);
    after = look_at(pid);
    after.cpu_s = (after.cpu_s - before.cpu_s) / seconds;
    return after;
}

static void cpu_and_memory(size_t n_meters)
{
    struct live l;
    struct used plain, daemon;
    pid_t pid;

    live_make(&l, n_meters);
    pid = start_plain_logger(&l);
    assert_true(pid > 0);
    live_sleep_ms(200);
    plain = measure(&l, pid);
    kill(pid, SIGKILL);
    waitpid(pid, NULL, 0);

    live_start(&l);
    assert_true(live_connect(&l, 10000));
    live_disconnect(&l);
    daemon = measure(&l, l.daemon);
    assert_int_equal(live_stop(&l), 0);
    live_remove(&l);
    printf("%zu pseudo-terminal%s, 10 readings/s each, %d s: CPU %.2f %% of a core, %.1f MB; plain "
           "logger: %.2f %%, %.1f MB; ratio of CPU %.1f\n",
           n_meters, n_meters == 1 ? "" : "s", seconds, 100 * daemon.cpu_s,
           (double)daemon.rss_kb / 1024, 100 * plain.cpu_s, (double)plain.rss_kb / 1024,
           daemon.cpu_s / plain.cpu_s);
}

static void cpu_and_memory_for_1_and_20(void **state)
{
    (void)state;
    cpu_and_memory(1);
    cpu_and_memory(20);
}

/* ---- time to tell ---- */

struct samples {
    double ms[SAMPLES];
    size_t n;
};

static int by_size(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;

    return x < y ? -1 : x > y;
}

static void add_sample(struct samples *s, double ms)
{
    if (s->n < SAMPLES)
        s->ms[s->n++] = ms;
}

/* Sorted when it comes back. */
static double share(struct samples *s, double part)
{
    assert_true(s->n > 0);
    qsort(s->ms, s->n, sizeof s->ms[0], by_size);
    return s->ms[(size_t)((double)(s->n - 1) * part + 0.5)];
}

static void say(const char *what, struct samples *s, struct samples *plain)
{
    printf("%s: %zu, median %.2f ms, 99th percentile %.2f ms; write and sync alone: %.2f ms, %.2f "
           "ms; ratios %.1f, %.1f\n",
           what, s->n, share(s, 0.5), share(s, 0.99), share(plain, 0.5), share(plain, 0.99),
           share(s, 0.5) / share(plain, 0.5), share(s, 0.99) / share(plain, 0.99));
}

static void write_and_sync(const struct live *l, struct samples *ret)
{
    char path[96], text[800];
    int fd;

    snprintf(path, sizeof path, "%s/plain", l->path);
    fd = open(path, O_WRONLY | O_CREAT | O_APPEND, 0600);
    assert_true(fd >= 0);
    memset(text, 'x', sizeof text);
    for (int i = 0; i < 600; i++) {
        const int64_t begin_ns = live_now_ns();
        assert_int_equal(write(fd, text, sizeof text), sizeof text);
        assert_int_equal(fdatasync(fd), 0);
        add_sample(ret, (double)(live_now_ns() - begin_ns) / 1e6);
        live_sleep_ms(5 + i % 20);
    }
    close(fd);
}

static void answers_to_notes(void **state)
{
    static struct live l;
    static struct samples notes, plain;
    struct meters m;
    char request[160], id[40];

    (void)state;
    live_make(&l, 1);
    write_and_sync(&l, &plain);
    live_start(&l);
    assert_true(live_connect(&l, 10000));
    meters_begin(&m, 1);
    meters_run(&m, &l, 1000 * MS);
    for (int i = 0; i < 600; i++) {
        const int64_t begin_ns = live_now_ns();
        bool answered = false;
        snprintf(id, sizeof id, "\"id\":\"b-%d\"", i);
        snprintf(request, sizeof request,
                 "{\"k\":\"act\",\"act\":\"note\",%s,\"text\":\"made up\"}", id);
        live_request(&l, request);
        while (!answered && live_now_ns() - begin_ns < 5000 * MS) {
            const int64_t wait_ns = meters_send(&m, &l) - live_now_ns();
            const char *line;
            size_t n;
            if (live_line(&l, wait_ns > 0 ? (int)(wait_ns / MS) : 0, &line, &n))
                answered = memmem(line, n, id, strlen(id)) != NULL &&
                           memmem(line, n, "\"k\":\"answer\"", 12) != NULL;
        }
        assert_true(answered);
        add_sample(&notes, (double)(live_now_ns() - begin_ns) / 1e6);
        meters_run(&m, &l, (5 + i % 20) * MS);
    }
    assert_int_equal(live_stop(&l), 0);
    say("a note to its answer", &notes, &plain);
    live_remove(&l);
}

/* One meter's client: at each capture the probe goes into another beaker. */
static void take(struct meters *m, struct live *view, struct samples *s, const char *line, size_t n)
{
    const size_t i = view->follow;
    struct sm_head h;
    int64_t utc_us, sent_us;
    char request[160];

    if (!sm_head_read(line, n - 1, &h) || !sm_head_is(&h, "capture"))
        return;
    assert_int_equal(sm_utc_parse(h.when + h.when_n - (SM_UTC_SIZE - 1), SM_UTC_SIZE - 1, &utc_us),
                     SM_OK);
    sent_us = m->sent_utc_us[i][m->sent_utc_us[i][0] <= utc_us ? 0 : 1];
    add_sample(s, (double)(utc_us_now() - sent_us) / 1e3);
    m->mv[i] = m->mv[i] > 0 ? -80 : 80;
    snprintf(request, sizeof request,
             "{\"k\":\"act\",\"act\":\"next\",\"meter\":\"m%zu\",\"id\":\"c-%lld\",\"seen\":%lld}",
             i + 1, (long long)h.n, (long long)h.n);
    live_request(view, request);
}

static void captures_of_twenty(void **state)
{
    static struct live l, view[LIVE_METERS];
    static struct samples captures, plain;
    struct pollfd p[LIVE_METERS];
    struct meters m;
    int64_t end_ns;

    (void)state;
    live_make(&l, LIVE_METERS);
    write_and_sync(&l, &plain);
    live_start(&l);
    for (size_t i = 0; i < LIVE_METERS; i++) {
        view[i] = l;
        view[i].follow = i;
        assert_true(live_connect(&view[i], 10000));
        p[i] = (struct pollfd){ .fd = view[i].client, .events = POLLIN };
    }
    meters_begin(&m, LIVE_METERS);
    end_ns = live_now_ns() + 120000 * MS;
    while (captures.n < 600 && live_now_ns() < end_ns) {
        const int64_t wait_ns = meters_send(&m, &l) - live_now_ns();
        const char *line;
        size_t n;
        (void)poll(p, LIVE_METERS, wait_ns > 0 ? (int)(wait_ns / MS) : 0);
        for (size_t i = 0; i < LIVE_METERS; i++)
            while (live_line(&view[i], 0, &line, &n))
                take(&m, &view[i], &captures, line, n);
    }
    assert_true(captures.n >= 500);
    for (size_t i = 0; i < LIVE_METERS; i++) {
        live_disconnect(&view[i]);
        free(view[i].in);
        free(view[i].told);
    }
    assert_int_equal(live_stop(&l), 0);
    say("the settling reading to its capture, 20 meters", &captures, &plain);
    live_remove(&l);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(cpu_and_memory_for_1_and_20),
                                        cmocka_unit_test(answers_to_notes),
                                        cmocka_unit_test(captures_of_twenty) };

    if (argc == 2)
        seconds = (int)strtol(argv[1], NULL, 10);
    if (seconds <= 0)
        return 2;
    return cmocka_run_group_tests(tests, NULL, NULL);
}
