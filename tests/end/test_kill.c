/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_kill.c: kill -9 of the real daemon under load, again and again over one log folder. Four
 * benches side by side, each a process of its own, kill 200 times in all; to kill more often:
 *
 *     STILLMARK_KILLS=1000 build/bin/test_kill
 *     build/bin/test_kill --bench SEED KILLS        one bench again, as a failure prints it
 *
 * A meter sends 50 to 200 lines/s that settle and move, a client sends notes and goes through bench
 * sheets. What the client was told, also in the last moment, is what the logs must hold. */
#include "check.h"

#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include "live.h"
#include "log_check.h"
#include "record/head.h"
#include "sim/prng.h"

#define MS INT64_C(1000000)
#define BENCHES 4
#define PENDING 8

/* When a life of the daemon ends. */
enum plan {
    WHILE_STARTING,
    AT_AN_ANNOUNCEMENT, /* the moment the client has it */
    AMONG_ACTS,         /* many were sent just now */
    SOON,
    LATE, /* long enough for captures */
    PLANS
};
static const char *const plan_names[PLANS] = { "while starting", "at an announcement", "among acts",
                                               "soon", "late" };

struct pending { /* an act that is not answered yet; sent again to the next daemon */
    unsigned id; /* 0: free */
    char request[1200];
};

struct bench {
    struct live live;
    struct sm_sim_prng prng;
    char what[64];
    unsigned kills, killed[PLANS];
    unsigned announced, captures, results, retried;
    int64_t seen; /* newest durable entry */
    bool all_measured;
    unsigned last_id;
    struct pending pending[PENDING];
    double mv;
    int64_t line_ns, note_ns, beaker_ns; /* when next */
};

/* ---- what the client is told ---- */

/* The number after `key` in a line; 0: none. */
static unsigned number_after(const char *line, size_t n, const char *key)
{
    const char *const at = memmem(line, n, key, strlen(key));

    return at != NULL ? (unsigned)strtoul(at + strlen(key), NULL, 10) : 0;
}

static bool has(const char *line, size_t n, const char *text)
{
    return memmem(line, n, text, strlen(text)) != NULL;
}

static void on_answer(struct bench *b, const char *line, size_t n)
{
    const unsigned id = number_after(line, n, "\"id\":\"k-");

    for (size_t i = 0; i < PENDING; i++)
        if (b->pending[i].id == id)
            b->pending[i].id = 0;
    if (has(line, n, "every item of the sheet has been measured"))
        b->all_measured = true;
}

/* The beaker that the probe is put into is the one that the program says it is in. */
static void on_moved(struct bench *b, const char *line, size_t n)
{
    const unsigned ph = number_after(line, n, "\"name\":\"S");

    b->mv = -58.17 * ((has(line, n, "\"name\":\"C7\"") ? 7.0 : ph != 0 ? (double)ph : 7.5) - 7.0);
}

/* True: an announcement. */
static bool take(struct bench *b, const char *line, size_t n)
{
    struct sm_head h;

    if (!sm_head_read(line, n - 1, &h))
        return false; /* live, or an error */
    if (sm_head_is(&h, "moved"))
        on_moved(b, line, n);
    if (!log_check_held_back(line, n))
        return false;
    b->announced++;
    b->seen = h.n;
    b->captures += sm_head_is(&h, "capture");
    b->results += sm_head_is(&h, "result");
    if (sm_head_is(&h, "answer"))
        on_answer(b, line, n);
    return true;
}

/* ---- load ---- */

static int between(struct bench *b, int from, int to)
{
    return from + (int)sm_sim_prng_below(&b->prng, (unsigned)(to - from + 1));
}

static void act(struct bench *b, const char *rest)
{
    struct pending *p = NULL;

    for (size_t i = 0; i < PENDING && p == NULL; i++)
        p = b->pending[i].id == 0 ? &b->pending[i] : NULL;
    if (p == NULL)
        return; /* the daemon is behind */
    p->id = ++b->last_id;
    snprintf(p->request, sizeof p->request, "{\"k\":\"act\",\"id\":\"k-%u\",\"seen\":%lld,%s}",
             p->id, (long long)b->seen, rest);
    live_request(&b->live, p->request);
}

static void hand_over_sheet(struct bench *b)
{
    act(b, "\"act\":\"sheet\",\"file\":\"quick.yaml\",\"text\":\"method: quick\\nsensor: el-1\\n"
           "items:\\n  - { standard: S2 }\\n  - { standard: S4 }\\n  - { standard: S6 }\\n"
           "  - { standard: S8 }\\n  - { standard: S10 }\\n  - { check: C7 }\\n"
           "  - { sample: a }\\n  - { sample: b }\\n  - { sample: c }\\n  - { check: C7 }\\n\"");
    b->all_measured = false;
}

/* All that is due now. */
static void work(struct bench *b, int64_t now_ns)
{
    char text[200];

    if (now_ns >= b->line_ns) {
        live_reading(text, b->mv + between(b, -1, 1) * 0.1);
        live_send(&b->live, 0, text);
        b->line_ns = now_ns + between(b, 5, 20) * MS;
    }
    if (b->live.client < 0)
        return;
    if (b->all_measured)
        hand_over_sheet(b);
    if (now_ns >= b->beaker_ns) {
        act(b, "\"act\":\"next\"");
        b->beaker_ns = now_ns + between(b, 1200, 1500) * MS;
    }
    if (now_ns >= b->note_ns) {
        snprintf(text, sizeof text, "\"act\":\"note\",\"text\":\"made up, after %lld\"",
                 (long long)b->seen);
        act(b, text);
        b->note_ns = now_ns + between(b, 3, 40) * MS;
    }
}

/* ---- lives ---- */

static void connected(struct bench *b, int64_t now_ns)
{
    b->beaker_ns = now_ns + between(b, 0, 300) * MS;
    b->note_ns = now_ns;
    for (size_t i = 0; i < PENDING; i++) {
        if (b->pending[i].id == 0)
            continue;
        live_request(&b->live, b->pending[i].request);
        b->retried++;
    }
}

/* Until end_ns, or until so many announcements have come. */
static void live_until(struct bench *b, int64_t end_ns, int announcements)
{
    int64_t now_ns = live_now_ns();
    const char *line;
    size_t n;

    while (now_ns < end_ns) {
        if (b->live.client < 0) {
            b->live.from = between(b, 0, 1) == 0 ? 0 : -1;
            if (live_connect(&b->live, 0))
                connected(b, now_ns);
        }
        work(b, now_ns);
        if (b->live.client < 0)
            live_sleep_ms(2);
        while (live_line(&b->live, 2, &line, &n))
            if (take(b, line, n) && announcements > 0 && --announcements == 0)
                return;
        now_ns = live_now_ns();
    }
}

/* As many notes as may wait, and then a moment. */
static void burst(struct bench *b, int64_t end_ns)
{
    live_until(b, end_ns, between(b, 2, 20));
    for (int i = 0; i < PENDING && b->live.client >= 0; i++)
        act(b, "\"act\":\"note\",\"text\":\"one of many\"");
    if (between(b, 0, 2) > 0)
        live_sleep_ms(between(b, 0, 2));
}

static void one_life(struct bench *b)
{
    const int dice = between(b, 0, 99);
    const enum plan plan = dice < 10   ? WHILE_STARTING
                           : dice < 30 ? AT_AN_ANNOUNCEMENT
                           : dice < 45 ? AMONG_ACTS
                           : dice < 65 ? SOON
                                       : LATE;
    const int64_t begin_ns = live_now_ns();
    const char *line;
    size_t n;

    live_start(&b->live);
    if (plan == WHILE_STARTING)
        live_until(b, begin_ns + between(b, 0, 25) * MS, 0);
    else if (plan == AT_AN_ANNOUNCEMENT)
        live_until(b, begin_ns + 5000 * MS, between(b, 1, 60));
    else if (plan == AMONG_ACTS)
        burst(b, begin_ns + 5000 * MS);
    else if (plan == SOON)
        live_until(b, begin_ns + between(b, 50, 400) * MS, 0);
    else
        live_until(b, begin_ns + between(b, 1100, 3200) * MS, 0);
    if (waitpid(b->live.daemon, NULL, WNOHANG) != 0)
        fail_msg("%s: the daemon ended by itself; see %s/stillmarkd.txt", b->what, b->live.path);
    live_kill(&b->live);
    b->killed[plan]++;
    while (live_line(&b->live, 1000, &line, &n)) /* what it said with its last breath */
        take(b, line, n);
    live_disconnect(&b->live);
}

/* ---- afterwards ---- */

/* However often an act was sent, it was done once at most. */
static void acts_were_done_once(const struct bench *b, const struct log_check *c)
{
    unsigned char *done = calloc(b->last_id + 1, 1);
    struct sm_head h;

    assert_non_null(done);
    for (size_t i = 0; i < c->n_lines; i++) {
        const struct log_check_line *l = &c->line[i];
        const unsigned id = number_after(l->text, l->len, "\"id\":\"k-");
        if (!sm_head_read(l->text, l->len - 1, &h) || !sm_head_is(&h, "answer") ||
            !has(l->text, l->len, "\"done\":true"))
            continue;
        assert_in_range(id, 1, b->last_id);
        if (done[id]++ != 0)
            fail_msg("%s: act k-%u was done twice, again in entry %lld", b->what, id,
                     (long long)h.n);
    }
    free(done);
}

/* By the programs that an analyst would use. */
static void verifies_and_replays(const struct bench *b, const struct log_check *c,
                                 const char *folder)
{
    const char *const verify[] = { "stillmark", "verify", folder, NULL };
    const char **argv = calloc(c->n_files + 2, sizeof *argv);
    static char said[1 << 20];
    int status;

    status = live_run(&b->live, verify, said, sizeof said);
    if (status != 0)
        fail_msg("%s: verify gave %d:\n%s", b->what, status, said);
    assert_non_null(argv);
    argv[0] = "stillmark-replay";
    for (size_t i = 0; i < c->n_files; i++)
        argv[i + 1] = c->path[i];
    status = live_run(&b->live, argv, said, sizeof said);
    if (status != 0)
        fail_msg("%s: replay of %zu files gave %d:\n%s", b->what, c->n_files, status, said);
    free(argv);
}

static unsigned arg_seed, arg_kills; /* of --bench */

static void nothing_announced_is_lost_by_kill_9(void **state)
{
    static struct bench b; /* large */
    static struct log_check c;
    char folder[128];

    (void)state;
    snprintf(b.what, sizeof b.what, "--bench %u %u", arg_seed, arg_kills);
    sm_sim_prng_init(&b.prng, arg_seed, 0);
    live_make(&b.live, 1);
    b.all_measured = true; /* a sheet is wanted */
    while (b.kills < arg_kills) {
        one_life(&b);
        b.kills++;
    }
    live_start(&b.live);
    live_until(&b, live_now_ns() + 300 * MS, 0);
    if (live_stop(&b.live) != 0)
        fail_msg("%s: the daemon could not end well", b.what);
    live_disconnect(&b.live);

    live_folder(&b.live, 0, folder, sizeof folder);
    log_check_load(&c, folder, b.what);
    log_check_has(&c, b.live.told, b.live.told_n, b.what);
    acts_were_done_once(&b, &c);
    verifies_and_replays(&b, &c, folder);
    assert_true(c.last.closed);
    if (b.announced < 5 * b.kills || (arg_kills >= 40 && (b.captures == 0 || b.retried == 0)))
        fail_msg("%s: too little load: %u announced, %u captures, %u acts sent again", b.what,
                 b.announced, b.captures, b.retried);
    printf("%s: %u kills (", b.what, b.kills);
    for (size_t i = 0; i < PLANS; i++)
        printf("%s%u %s", i > 0 ? ", " : "", b.killed[i], plan_names[i]);
    printf("), %u entries announced, %u captures and %u results among them, %u acts of %u sent "
           "again; %zu files, %zu entries under stamps, %lld lines after them, %zu files never "
           "shown\n",
           b.announced, b.captures, b.results, b.retried, b.last_id, c.n_files, c.n_lines,
           (long long)c.after_lines, c.n_unshown);
    log_check_free(&c);
    live_remove(&b.live);
}

static pid_t begin_bench(const char *program, unsigned seed, unsigned kills)
{
    char s[16], k[16];
    pid_t pid;

    snprintf(s, sizeof s, "%u", seed);
    snprintf(k, sizeof k, "%u", kills);
    fflush(NULL);
    pid = fork();
    assert_true(pid >= 0);
    if (pid == 0) {
        execl(program, program, "--bench", s, k, (char *)NULL);
        _exit(127);
    }
    return pid;
}

static const char *own_name;

static void four_benches_side_by_side(void **state)
{
    const char *const often = getenv("STILLMARK_KILLS"), *const told = getenv("STILLMARK_SEED");
    const unsigned kills = often != NULL ? (unsigned)strtoul(often, NULL, 10) : 200;
    const unsigned seed = told != NULL ? (unsigned)strtoul(told, NULL, 10)
                                       : (unsigned)(live_now_ns() / 1000 % 100000000) * 10;
    pid_t pid[BENCHES];
    unsigned bad = 0;

    (void)state;
    assert_true(kills >= BENCHES);
    printf("seed %u\n", seed);
    for (unsigned i = 0; i < BENCHES; i++)
        pid[i] = begin_bench(own_name, seed + i, kills / BENCHES + (i < kills % BENCHES));
    for (unsigned i = 0; i < BENCHES; i++) {
        int status;
        assert_int_equal(waitpid(pid[i], &status, 0), pid[i]);
        bad += !WIFEXITED(status) || WEXITSTATUS(status) != 0;
    }
    if (bad > 0)
        fail_msg("%u of %d benches failed; STILLMARK_SEED=%u", bad, BENCHES, seed);
}

int main(int argc, char **argv)
{
    const struct CMUnitTest bench[] = { cmocka_unit_test(nothing_announced_is_lost_by_kill_9) };
    const struct CMUnitTest all[] = { cmocka_unit_test(four_benches_side_by_side) };

    own_name = argv[0];
    if (argc == 4 && strcmp(argv[1], "--bench") == 0) {
        arg_seed = (unsigned)strtoul(argv[2], NULL, 10);
        arg_kills = (unsigned)strtoul(argv[3], NULL, 10);
        return cmocka_run_group_tests(bench, NULL, NULL);
    }
    return cmocka_run_group_tests(all, NULL, NULL);
}
