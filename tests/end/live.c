/* SPDX-License-Identifier: GPL-3.0-or-later */
/* live.c: see live.h. */
#include "live.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <sys/socket.h>
#include <sys/stat.h>
#include <sys/un.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "daemon/scratch.h"
#include "log_check.h"

static const char *const files[][2] = {
    { "conf/profiles/mv.yaml", "eol: crlf\n"
                               "split: spaces\n"
                               "channels:\n"
                               "  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
                               "  probe: { at: 3, unit-at: 4, unit: °C, written: C }\n"
                               "example: { line: \"-0012.4 mV  20.0 C\", potential: -12.4 mV, "
                               "probe: 20.0 °C }\n" },
    { "conf/methods/quick.yaml", "measures: pH\n"
                                 "signal: potential\n"
                                 "temperature: probe\n"
                                 "model: nernst\n"
                                 "rule: spread\n"
                                 "over: 1 s\n"
                                 "dwell: 1 s\n"
                                 "tolerance: { standards: 0.01 pH, samples: 0.02 pH }\n"
                                 "longest-wait: { standards: 1 min, samples: 1 min }\n"
                                 "levels: 5\n"
                                 "slope: { from: 90 %, to: 105 % }\n"
                                 "residual-sd: 1.2 mV\n"
                                 "check: { within: 0.1 pH, every: 10, at-end: yes }\n" },
    { "conf/standards/made-up.yaml",
      "standards:\n"
      "  - { name: S2, values: { 20 °C: 2.00 pH }, lot: A-1, U: 0.01 pH }\n"
      "  - { name: S4, values: { 20 °C: 4.00 pH }, lot: A-2, U: 0.01 pH }\n"
      "  - { name: S6, values: { 20 °C: 6.00 pH }, lot: A-3, U: 0.01 pH }\n"
      "  - { name: S8, values: { 20 °C: 8.00 pH }, lot: A-4, U: 0.01 pH }\n"
      "  - { name: S10, values: { 20 °C: 10.00 pH }, lot: A-5, U: 0.01 pH }\n"
      "  - { name: C7, values: { 20 °C: 7.00 pH }, lot: B-1, U: 0.01 pH }\n" },
};

/* ---- making and removing ---- */

static void write_setup(const struct live *l)
{
    static const char *const folders[] = { "conf", "conf/meters", "conf/profiles", "conf/methods",
                                           "conf/standards" };
    char path[160], text[512], names[512] = "";

    for (size_t i = 0; i < COUNT(folders); i++) {
        snprintf(path, sizeof path, "%s/%s", l->path, folders[i]);
        assert_int_equal(mkdir(path, 0755), 0);
    }
    for (size_t i = 0; i < COUNT(files); i++) {
        snprintf(path, sizeof path, "%s/%s", l->path, files[i][0]);
        scratch_write(path, files[i][1]);
    }
    for (size_t i = 0; i < l->n_meters; i++) {
        snprintf(path, sizeof path, "%s/conf/meters/m%zu.yaml", l->path, i + 1);
        snprintf(text, sizeof text,
                 "port: %s/line%zu\nline: { baud: 9600, bits: 8, parity: none }\nsilence: 10 s\n"
                 "profile: mv\nmethod: quick\nsensor: el-%zu\n",
                 l->path, i + 1, i + 1);
        scratch_write(path, text);
        snprintf(names + strlen(names), sizeof names - strlen(names), "%sm%zu", i > 0 ? ", " : "",
                 i + 1);
    }
    snprintf(path, sizeof path, "%s/conf/stillmark.yaml", l->path);
    snprintf(text, sizeof text,
             "logs: ../logs\nstate: ../state\nmeters: [ %s ]\nstandards: [ made-up ]\n", names);
    scratch_write(path, text);
}

void live_make(struct live *l, size_t n_meters)
{
    struct scratch s;
    char link[96];

    memset(l, 0, sizeof *l);
    assert_in_range(n_meters, 1, LIVE_METERS);
    scratch_make(&s);
    memcpy(l->path, s.path, sizeof l->path);
    snprintf(l->socket, sizeof l->socket, "%s/socket", l->path);
    l->client = -1;
    l->from = -1;
    l->n_meters = n_meters;
    write_setup(l);
    for (size_t i = 0; i < n_meters; i++) {
        snprintf(link, sizeof link, "%s/line%zu", l->path, i + 1);
        assert_int_equal(sm_sim_pty_open(&l->pty[i]), SM_OK);
        assert_int_equal(sm_sim_pty_link(&l->pty[i], link), SM_OK);
    }
}

void live_remove(struct live *l)
{
    struct scratch s;

    live_disconnect(l);
    if (l->daemon != 0)
        live_kill(l);
    for (size_t i = 0; i < l->n_meters; i++)
        sm_sim_pty_close(&l->pty[i]);
    free(l->in);
    free(l->told);
    memcpy(s.path, l->path, sizeof s.path);
    scratch_remove(&s);
}

void live_folder(const struct live *l, size_t meter, char *ret_path, size_t cap)
{
    snprintf(ret_path, cap, "%s/logs/m%zu", l->path, meter + 1);
}

/* ---- programs ---- */

static void send_output_to(const char *path, int target)
{
    const int fd = open(path, O_WRONLY | O_CREAT | O_APPEND, 0644);

    if (fd < 0 || dup2(fd, target) < 0)
        _exit(127);
    close(fd);
}

static pid_t spawn(const struct live *l, const char *const argv[], int out)
{
    char program[512], said[160];
    const char *const name = strrchr(argv[0], '/');
    pid_t pid;

    snprintf(program, sizeof program, "%s%s%s", name == NULL ? SM_BIN_DIR : "",
             name == NULL ? "/" : "", argv[0]);
    snprintf(said, sizeof said, "%s/%.60s.txt", l->path, name == NULL ? argv[0] : name + 1);
    fflush(NULL);
    pid = fork();
    assert_true(pid >= 0);
    if (pid > 0)
        return pid;
    prctl(PR_SET_PDEATHSIG, SIGKILL); /* a test that dies leaves nothing behind */
    if (out >= 0 && (dup2(out, 1) < 0 || dup2(out, 2) < 0))
        _exit(127);
    if (out < 0) {
        send_output_to("/dev/null", 1);
        send_output_to(said, 2);
    }
    execv(program, (char *const *)(uintptr_t)argv); /* execv changes nothing of it */
    fprintf(stderr, "%s: %s\n", program, strerror(errno));
    _exit(127);
}

pid_t live_spawn(const struct live *l, const char *const argv[])
{
    return spawn(l, argv, -1);
}

void live_start(struct live *l)
{
    char setup[128];
    const char *const argv[] = { "stillmarkd", "--setup", setup, "--socket", l->socket, NULL };

    assert_int_equal(l->daemon, 0);
    snprintf(setup, sizeof setup, "%s/conf/stillmark.yaml", l->path);
    l->daemon = live_spawn(l, argv);
}

static int wait_for(pid_t pid)
{
    int status;

    while (waitpid(pid, &status, 0) < 0)
        assert_int_equal(errno, EINTR);
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

void live_kill(struct live *l)
{
    kill(l->daemon, SIGKILL);
    (void)wait_for(l->daemon);
    l->daemon = 0;
}

int live_stop(struct live *l)
{
    int status;

    kill(l->daemon, SIGTERM);
    status = wait_for(l->daemon);
    l->daemon = 0;
    return status;
}

int live_run(const struct live *l, const char *const argv[], char *ret_said, size_t cap)
{
    char rest[4096];
    size_t n = 0;
    ssize_t got;
    int end[2];
    pid_t pid;

    assert_int_equal(pipe2(end, O_CLOEXEC), 0);
    pid = spawn(l, argv, end[1]);
    close(end[1]);
    while ((got = n + 1 < cap ? read(end[0], ret_said + n, cap - 1 - n)
                              : read(end[0], rest, sizeof rest)) > 0)
        n += n + 1 < cap ? (size_t)got : 0;
    ret_said[n] = '\0';
    close(end[0]);
    return wait_for(pid);
}

/* ---- the line ---- */

void live_send(const struct live *l, size_t meter, const char *text)
{
    sm_sim_pty_send(&l->pty[meter], text, strlen(text));
}

void live_reading(char out[32], double mv)
{
    snprintf(out, 32, "%+07.1f mV  20.0 C\r\n", mv);
}

/* ---- the socket ---- */

static bool try_connect(struct live *l)
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    char follow[80], from[40];
    const int fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0);

    assert_true(fd >= 0);
    snprintf(a.sun_path, sizeof a.sun_path, "%s", l->socket);
    if (connect(fd, (const struct sockaddr *)&a, sizeof a) != 0) {
        close(fd);
        return false;
    }
    l->client = fd;
    l->at = l->n = 0;
    snprintf(from, sizeof from, ",\"from\":%lld", (long long)l->from);
    snprintf(follow, sizeof follow, "{\"k\":\"follow\",\"meter\":\"m%zu\"%s}", l->follow + 1,
             l->from >= 0 ? from : "");
    live_request(l, follow);
    return true;
}

bool live_connect(struct live *l, int wait_ms)
{
    const int64_t end_ns = live_now_ns() + (int64_t)wait_ms * 1000000;

    live_disconnect(l);
    while (!try_connect(l)) {
        if (live_now_ns() >= end_ns)
            return false;
        live_sleep_ms(2);
    }
    return true;
}

void live_disconnect(struct live *l)
{
    if (l->client >= 0)
        close(l->client);
    l->client = -1;
}

void live_request(struct live *l, const char *line)
{
    char text[4096];
    const int n = snprintf(text, sizeof text, "%s\n", line);

    assert_true(n > 0 && (size_t)n < sizeof text);
    if (send(l->client, text, (size_t)n, MSG_NOSIGNAL) != n)
        assert_true(errno == EPIPE || errno == ECONNRESET); /* it was killed */
}

/* False: nothing came. */
static bool receive(struct live *l, int wait_ms)
{
    struct pollfd p = { .fd = l->client, .events = POLLIN };
    ssize_t got;

    if (l->client < 0 || poll(&p, 1, wait_ms) <= 0)
        return false;
    if (l->n > l->at)
        memmove(l->in, l->in + l->at, l->n - l->at);
    l->n -= l->at;
    l->at = 0;
    if (l->cap - l->n < 65536) {
        l->cap = 2 * l->cap + 131072;
        l->in = realloc(l->in, l->cap);
        assert_non_null(l->in);
    }
    got = recv(l->client, l->in + l->n, l->cap - l->n, 0);
    if (got <= 0)
        return false;
    l->n += (size_t)got;
    return true;
}

static void keep_if_announced(struct live *l, const char *line, size_t n)
{
    if (!log_check_held_back(line, n))
        return;
    if (l->told_cap - l->told_n < n) {
        l->told_cap = 2 * l->told_cap + n + 65536;
        l->told = realloc(l->told, l->told_cap);
        assert_non_null(l->told);
    }
    memcpy(l->told + l->told_n, line, n);
    l->told_n += n;
}

bool live_line(struct live *l, int wait_ms, const char **ret_line, size_t *ret_n)
{
    const int64_t end_ns = live_now_ns() + (int64_t)wait_ms * 1000000;

    for (;;) {
        const char *from = l->n > l->at ? l->in + l->at : NULL; /* nothing came yet: no buffer */
        const char *newline = from != NULL ? memchr(from, '\n', l->n - l->at) : NULL;
        const int64_t left_ns = end_ns - live_now_ns();

        if (newline != NULL) {
            *ret_line = from;
            *ret_n = (size_t)(newline + 1 - from);
            l->at += *ret_n;
            keep_if_announced(l, *ret_line, *ret_n);
            return true;
        }
        if (!receive(l, left_ns > 0 ? (int)((left_ns + 999999) / 1000000) : 0))
            return false;
    }
}

void live_await(struct live *l, const char *text, int wait_ms, char *ret_line, size_t cap)
{
    const int64_t end_ns = live_now_ns() + (int64_t)wait_ms * 1000000;
    const char *line;
    size_t n;

    while (live_now_ns() < end_ns) {
        if (!live_line(l, 50, &line, &n))
            continue;
        snprintf(ret_line, cap, "%.*s", (int)n, line);
        if (strstr(ret_line, text) != NULL)
            return;
    }
    fail_msg("the daemon did not say %s within %d ms", text, wait_ms);
}

/* ---- time ---- */

int64_t live_now_ns(void)
{
    struct timespec ts;

    clock_gettime(CLOCK_MONOTONIC, &ts);
    return (int64_t)ts.tv_sec * 1000000000 + ts.tv_nsec;
}

void live_sleep_ms(int ms)
{
    const struct timespec ts = { ms / 1000, (long)(ms % 1000) * 1000000 };

    nanosleep(&ts, NULL);
}
