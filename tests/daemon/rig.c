/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rig.c: see rig.h. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE /* posix_openpt, ptsname_r */
#endif
#include "rig.h"

#include <fcntl.h>
#include <poll.h>
#include <termios.h>

#include "record/head.h"
#include "record/verify.h"
#include "setup/logged.h"

static const char *const files[][2] = {
    { "conf/stillmark.yaml", "logs: logs\n"
                             "state: state\n"
                             "people: [ { who: bench-a } ]\n"
                             "meters: [ m1 ]\n"
                             "standards: [ buffers ]\n" },
    { "conf/profiles/mv.yaml", "eol: crlf\n"
                               "split: spaces\n"
                               "channels:\n"
                               "  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
                               "  probe: { at: 3, unit-at: 4, unit: °C, written: C }\n"
                               "example: { line: \"-0012.4 mV  24.8 C\", potential: -12.4 mV, "
                               "probe: 24.8 °C }\n" },
    { "conf/profiles/mv-ask.yaml", "eol: crlf\n"
                                   "ask: { text: \"R\\r\", every: 1 s, within: 600 ms }\n"
                                   "split: spaces\n"
                                   "channels:\n"
                                   "  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
                                   "  probe: { at: 3, unit-at: 4, unit: °C, written: C }\n"
                                   "example: { line: \"-0012.4 mV  24.8 C\", potential: -12.4 mV, "
                                   "probe: 24.8 °C }\n" },
    { "conf/methods/ph.yaml", "measures: pH\n"
                              "signal: potential\n"
                              "temperature: probe\n"
                              "model: nernst\n"
                              "rule: spread\n"
                              "over: 2 s\n"
                              "tolerance: { standards: 0.01 pH, samples: 0.02 pH }\n"
                              "dwell: 3 s\n"
                              "longest-wait: { standards: 1 min, samples: 1 min }\n"
                              "levels: 5\n"
                              "slope: { from: 90 %, to: 105 % }\n"
                              "residual-sd: 1.2 mV\n"
                              "check: { within: 0.1 pH, every: 10, at-end: yes }\n" },
    { "conf/standards/buffers.yaml",
      "standards:\n"
      "  - { name: B4, values: { 25 °C: 4.01 pH, 20 °C: 4.00 pH }, lot: F-208, U: 0.01 pH }\n"
      "  - { name: C7, values: { 25 °C: 7.01 pH, 20 °C: 7.02 pH }, lot: V-077, U: 0.01 pH }\n" },
};

static void open_line(struct rig *r, char *ret_path, size_t cap)
{
    struct termios t;

    r->master = posix_openpt(O_RDWR | O_NOCTTY | O_CLOEXEC | O_NONBLOCK);
    assert_true(r->master >= 0);
    assert_int_equal(grantpt(r->master), 0);
    assert_int_equal(unlockpt(r->master), 0);
    assert_int_equal(tcgetattr(r->master, &t), 0);
    cfmakeraw(&t);
    assert_int_equal(tcsetattr(r->master, TCSANOW, &t), 0);
    assert_int_equal(ptsname_r(r->master, ret_path, cap), 0);
}

/* The setup names a link, which points to whatever pseudo-terminal is there now. */
void rig_plug(struct rig *r)
{
    char path[64], link[96];

    open_line(r, path, sizeof path);
    snprintf(link, sizeof link, "%s/line", r->scratch.path);
    unlink(link);
    assert_int_equal(symlink(path, link), 0);
}

void rig_unplug(struct rig *r)
{
    char link[96];

    snprintf(link, sizeof link, "%s/line", r->scratch.path);
    unlink(link);
    close(r->master);
    r->master = -1;
}

static void load_setup(struct rig *r, bool asks)
{
    static struct sm_logged logged; /* large */
    struct sm_source source;
    struct sm_blame list[16];
    struct sm_blames blames;
    char meter[512], text[600];

    memset(&logged, 0, sizeof logged);
    for (size_t i = 0; i < COUNT(files); i++)
        assert_int_equal(sm_logged_add(&logged, files[i][0], files[i][1], strlen(files[i][1])),
                         SM_OK);
    snprintf(meter, sizeof meter,
             "port: %s/line\nline: { baud: 9600, bits: 8, parity: none }\nsilence: 10 s\n"
             "profile: %s\nmethod: ph\nsensor: el-1\n",
             r->scratch.path, asks ? "mv-ask" : "mv");
    assert_int_equal(sm_logged_add(&logged, "conf/meters/m1.yaml", meter, strlen(meter)), SM_OK);
    sm_logged_source(&logged, &source);
    sm_blames_init(&blames, list, COUNT(list));
    if (sm_setup_load(&source, "conf/stillmark.yaml", &r->setup, &blames) != SM_OK) {
        sm_blame_write(&blames.list[0], text, sizeof text);
        fail_msg("the rig's setup: %s", text);
    }
    sm_logged_finish(&logged);
    snprintf(r->setup->logs, sizeof r->setup->logs, "%s/logs", r->scratch.path);
}

void rig_make(struct rig *r, bool asks)
{
    unsigned char seed[32] = { 7 };

    memset(r, 0, sizeof *r);
    r->watched = -1;
    scratch_make(&r->scratch);
    snprintf(r->folder, sizeof r->folder, "%s/logs/m1", r->scratch.path);
    load_setup(r, asks);
    assert_int_equal(sm_signer_create(seed, &r->signer), SM_OK);
    sm_door_fail_init(&r->door, sm_door_system());
    r->now.boot_ns = 1000 * SM_NS_PER_S;
    r->now.utc_us = RIG_UTC_US;
    rig_plug(r);
}

void rig_remove(struct rig *r)
{
    if (r->meter != NULL)
        rig_kill(r);
    if (r->master >= 0)
        close(r->master);
    sm_signer_destroy(r->signer);
    sm_setup_destroy(r->setup);
    free(r->told);
    free(r->live);
    scratch_remove(&r->scratch);
}

/* ---- what the meter tells ---- */

static void keep(char **text, size_t *n, const char *line, size_t line_n)
{
    char *more = realloc(*text, *n + line_n + 1);

    assert_non_null(more);
    memcpy(more + *n, line, line_n);
    *n += line_n;
    more[*n] = '\0';
    *text = more;
}

static void on_watch(void *ctx, struct sm_meter *m, int fd)
{
    struct rig *r = ctx;

    (void)m;
    r->watched = fd;
}

static void on_line(void *ctx, struct sm_meter *m, const char *line, size_t n)
{
    struct rig *r = ctx;

    sm_hub_line(r->hub, m, line, n);
    assert_int_equal(line[n - 1], '\n');
    keep(&r->told, &r->told_n, line, n);
}

static void on_live(void *ctx, struct sm_meter *m, const char *kind, const char *line, size_t n)
{
    struct rig *r = ctx;

    sm_hub_live(r->hub, m, kind, line, n);
    keep(&r->live, &r->live_n, line, n);
}

static void on_answer(void *ctx, struct sm_meter *m, int64_t act, const char *line, size_t n)
{
    struct rig *r = ctx;

    sm_hub_answer(r->hub, m, act, line, n);
    r->answered = act;
    snprintf(r->answer, sizeof r->answer, "%.*s", (int)n, line);
}

static void on_lost(void *ctx, struct sm_meter *m, const char *why)
{
    struct rig *r = ctx;

    sm_hub_lost(r->hub, m, why);
    r->lost++;
    snprintf(r->lost_why, sizeof r->lost_why, "%s", why);
}

/* ---- driving it ---- */

bool rig_try_start(struct rig *r)
{
    const struct sm_meter_about about = { &r->door.door,
                                          r->setup,
                                          &r->setup->meter[0],
                                          r->signer,
                                          "",
                                          "0123456789abcdef",
                                          { r, on_watch, on_line, on_live, on_answer, on_lost } };
    char why[SM_WHY_SIZE] = "";

    if (sm_meter_create(&about, &r->meter, why) != SM_OK) {
        assert_true(strlen(why) > 10);
        r->meter = NULL;
        return false;
    }
    sm_meter_start(r->meter, &r->now);
    rig_settle(r);
    return true;
}

void rig_start(struct rig *r)
{
    assert_true(rig_try_start(r));
}

/* A writer that hangs fails the test after 10 s. */
void rig_settle(struct rig *r)
{
    struct sm_meter_disk before, after;
    struct pollfd p = { .fd = sm_meter_written_fd(r->meter), .events = POLLIN };

    for (int i = 0; i < 1000; i++) {
        sm_meter_disk(r->meter, &before);
        if (sm_meter_idle(r->meter))
            return;
        if (poll(&p, 1, 10000) != 1)
            fail_msg("the writer does not answer");
        sm_meter_written(r->meter, &r->now);
        sm_meter_disk(r->meter, &after);
    }
    fail_msg("the writer is never done");
}

void rig_stop(struct rig *r)
{
    sm_meter_stop(r->meter, &r->now);
    rig_settle(r);
    sm_meter_destroy(r->meter);
    r->meter = NULL;
    r->watched = -1;
}

void rig_kill(struct rig *r)
{
    sm_meter_destroy(r->meter);
    r->meter = NULL;
    r->watched = -1;
}

static void step(struct rig *r, int64_t ns)
{
    r->now.boot_ns += ns;
    r->now.utc_us += ns / 1000;
}

void rig_pass(struct rig *r, int64_t ns)
{
    const int64_t end = r->now.boot_ns + ns;

    for (int i = 0; i < 100000; i++) {
        const int64_t due = sm_meter_due(r->meter);
        if (due > end)
            break;
        step(r, due > r->now.boot_ns ? due - r->now.boot_ns : 0);
        sm_meter_wake(r->meter, &r->now);
        rig_settle(r);
        if (sm_meter_due(r->meter) <= r->now.boot_ns)
            step(r, SM_NS_PER_MS);
    }
    step(r, end > r->now.boot_ns ? end - r->now.boot_ns : 0);
    sm_meter_wake(r->meter, &r->now);
    rig_settle(r);
}

void rig_send(struct rig *r, const char *text)
{
    const size_t n = strlen(text);
    struct pollfd p;

    assert_int_equal(write(r->master, text, n), n);
    if (r->watched < 0)
        return;
    p = (struct pollfd){ .fd = r->watched, .events = POLLIN };
    for (int wait_ms = 200; r->watched >= 0 && poll(&p, 1, wait_ms) == 1; wait_ms = 1)
        sm_meter_readable(r->meter, &r->now);
    rig_settle(r);
}

int64_t rig_act(struct rig *r, const char *name, const char *id, const char *text)
{
    struct sm_act act = { 0 };
    char why[SM_WHY_SIZE];
    int64_t n = 0;

    assert_true(sm_act_known(name, &act.act));
    snprintf(act.id, sizeof act.id, "%s", id);
    snprintf(act.door, sizeof act.door, "socket");
    act.has_seen = true;
    act.seen = INT64_C(1000000000);
    if (act.act == SM_ACT_SHEET) {
        snprintf(act.sheet_file, sizeof act.sheet_file, "sheet.yaml");
        act.sheet_text = text;
        act.sheet_text_n = strlen(text);
    } else {
        snprintf(act.text, sizeof act.text, "%s", text);
    }
    if (sm_meter_act(r->meter, &r->now, &act, &n, why) != SM_OK)
        return 0;
    sm_meter_wake(r->meter, &r->now);
    rig_settle(r);
    return n;
}

/* ---- looking at it ---- */

unsigned rig_count(const char *text, const char *what)
{
    unsigned n = 0;

    for (const char *at = text; at != NULL && (at = strstr(at, what)) != NULL; at += strlen(what))
        n++;
    return n;
}

size_t rig_verify(const struct rig *r)
{
    char name[64][80], path[256], why[SM_REASON_SIZE];
    const size_t n = scratch_list(r->folder, ".jsonl", name, 64);
    struct sm_verify before, v;

    for (size_t i = 0; i < n; i++) {
        size_t text_n = 0;
        char *text;

        snprintf(path, sizeof path, "%s/%.79s", r->folder, name[i]);
        text = scratch_read(path, &text_n);
        sm_verify(text, text_n, NULL, &v);
        free(text);
        if (!v.good || v.stamps == 0)
            fail_msg("%s does not verify: entries %lld to %lld: %s", name[i], (long long)v.bad_from,
                     (long long)v.bad_to, v.why);
        if (i > 0 && sm_verify_chain(&before, &v, why) != SM_OK)
            fail_msg("%s does not follow %s: %s", name[i], name[i - 1], why);
        if (i > 0 && v.first_n <= before.last_line_n)
            fail_msg("%s begins with entry %lld, used before", name[i], (long long)v.first_n);
        before = v;
    }
    return n;
}

char *rig_log(const struct rig *r)
{
    char name[64][80], path[256];
    const size_t n = scratch_list(r->folder, ".jsonl", name, 64);
    char *all = NULL;
    size_t all_n = 0;

    keep(&all, &all_n, "", 0);
    for (size_t i = 0; i < n; i++) {
        size_t text_n = 0;
        char *text;

        snprintf(path, sizeof path, "%s/%.79s", r->folder, name[i]);
        text = scratch_read(path, &text_n);
        keep(&all, &all_n, text, text_n);
        free(text);
    }
    return all;
}

void rig_nothing_announced_is_lost(const struct rig *r, const char *what)
{
    static const char *const durable[] = { "capture", "curve",   "check",    "result",
                                           "hold",    "release", "question", "answer" };
    char *log = rig_log(r);
    const char *at = r->told;

    while (at != NULL && *at != '\0') {
        const char *end = strchr(at, '\n');
        char line[8192];
        struct sm_head h;

        snprintf(line, sizeof line, "%.*s", (int)(end + 1 - at), at);
        assert_true(sm_head_read(at, (size_t)(end - at), &h));
        for (size_t i = 0; i < COUNT(durable); i++)
            if (sm_head_is(&h, durable[i]) && strstr(log, line) == NULL)
                fail_msg("%s: announced, but not in the log: %s", what, line);
        at = end + 1;
    }
    free(log);
}
