/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_disk.c: the real daemon while its disk is full, its log folder moved away, another daemon
 * wants the same folder, or the disk is slow. The small disk is a tmpfs in a mount namespace of the
 * test's own, so nothing of it is left behind; where that is not allowed, those tests say so and
 * are skipped. */
#include "check.h"

#include <errno.h>
#include <fcntl.h>
#include <sched.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mount.h>
#include <sys/prctl.h>
#include <sys/socket.h>
#include <sys/stat.h>
#include <sys/un.h>
#include <unistd.h>

#include "check_setup.h"
#include "daemon/scratch.h"
#include "door.h"
#include "live.h"
#include "log_check.h"
#include "loop.h"
#include "record/entry.h"
#include "record/head.h"

#define MS INT64_C(1000000)

struct desk {
    struct live live;
    uint64_t sent; /* bytes that the meter sent since somebody listened */
    unsigned acts;
};

/* ---- the meter and the client ---- */

/* A reading every 10 ms, until a line has `want` in it; false: it has not come. */
static bool feed_until(struct desk *d, const char *want, int wait_ms, char *ret_line, size_t cap)
{
    const int64_t end_ns = live_now_ns() + wait_ms * MS;
    const char *line;
    char text[32];
    size_t n;

    while (live_now_ns() < end_ns) {
        const int64_t next_ns = live_now_ns() + 10 * MS;
        live_reading(text, -57.3 + 0.1 * (double)(d->sent / 20 % 3));
        live_send(&d->live, 0, text);
        d->sent += strlen(text);
        while (live_line(&d->live, (int)((next_ns - live_now_ns()) / MS), &line, &n)) {
            if (want == NULL || memmem(line, n, want, strlen(want)) == NULL)
                continue;
            snprintf(ret_line, cap, "%.*s", (int)n, line);
            return true;
        }
    }
    return want == NULL;
}

static void feed(struct desk *d, int ms)
{
    (void)feed_until(d, NULL, ms, NULL, 0);
}

static void expect(struct desk *d, const char *want, int wait_ms, char *ret_line, size_t cap)
{
    if (!feed_until(d, want, wait_ms, ret_line, cap))
        fail_msg("nothing with %s within %d ms; see %s/stillmarkd.txt", want, wait_ms,
                 d->live.path);
}

/* The status has both in it. */
static void check_status(struct desk *d, const char *a, const char *b)
{
    char line[8192];

    live_request(&d->live, "{\"k\":\"status\"}");
    expect(d, "\"k\":\"status\"", 3000, line, sizeof line);
    if (strstr(line, a) == NULL || strstr(line, b) == NULL)
        fail_msg("got the status %s, want %s and %s in it", line, a, b);
}

/* A note, and what it is answered. */
static void note(struct desk *d, const char *answer_has)
{
    char request[160], id[32], line[4096];

    snprintf(id, sizeof id, "\"id\":\"note-%u\"", ++d->acts);
    snprintf(request, sizeof request, "{\"k\":\"act\",\"act\":\"note\",%s,\"text\":\"made up\"}",
             id);
    live_request(&d->live, request);
    expect(d, id, 5000, line, sizeof line);
    while (strstr(line, "\"k\":\"act\"") != NULL) /* the act itself, shown at once */
        expect(d, id, 5000, line, sizeof line);
    if (strstr(line, answer_has) == NULL)
        fail_msg("the note was answered %s, want %s in it", line, answer_has);
}

/* Begins to listen: from here on every byte is the daemon's to log or to miss. */
static void begin(struct desk *d)
{
    char line[8192];

    live_start(&d->live);
    assert_true(live_connect(&d->live, 10000));
    for (int i = 0; i < 100; i++) {
        live_request(&d->live, "{\"k\":\"status\"}");
        live_await(&d->live, "\"k\":\"status\"", 3000, line, sizeof line);
        if (strstr(line, "\"state\":\"up\"") != NULL)
            return;
        live_sleep_ms(50);
    }
    fail_msg("the daemon does not open its port: %s", line);
}

/* Everything that was sent has been read. */
static void let_it_read(struct desk *d)
{
    char line[8192];

    live_sleep_ms(200);
    live_request(&d->live, "{\"k\":\"status\"}");
    live_await(&d->live, "\"k\":\"status\"", 3000, line, sizeof line);
}

/* ---- afterwards ---- */

/* Bytes of the meter in the log's `bytes` entries. */
static uint64_t logged_bytes(const struct log_check *c)
{
    static struct sm_entry_store store;
    static struct sm_entry e;
    char why[SM_REASON_SIZE];
    uint64_t sum = 0;

    sm_entry_store_init(&store);
    for (size_t i = 0; i < c->n_lines; i++) {
        assert_int_equal(sm_entry_read(c->line[i].text, c->line[i].len - 1, &store, &e, why),
                         SM_OK);
        if (e.kind == SM_ENTRY_INPUT && e.input.kind == SM_INPUT_BYTES)
            sum += e.input.chunk.n;
        json_decref(e.json);
    }
    sm_entry_store_finish(&store);
    return sum;
}

/* What the `open` entries say was missed. */
static uint64_t missed_bytes(const struct log_check *c, const char *why)
{
    static const char key[] = "): ";
    uint64_t sum = 0;

    for (size_t i = 0; i < c->n_lines; i++) {
        const struct log_check_line *l = &c->line[i];
        struct sm_head h;
        const char *missed, *at;
        assert_true(sm_head_read(l->text, l->len - 1, &h));
        if (!sm_head_is(&h, "open"))
            continue;
        missed = memmem(l->text, l->len, "nothing was logged", 18);
        if (missed == NULL)
            continue;
        if (memmem(l->text, l->len, why, strlen(why)) == NULL)
            fail_msg("what was missed does not say %s: %.*s", why, (int)l->len, l->text);
        at = memmem(missed, (size_t)(l->text + l->len - missed), key, strlen(key));
        assert_non_null(at);
        sum += strtoull(at + strlen(key), NULL, 10);
    }
    return sum;
}

/* Stops the daemon and looks at all it left: nothing announced is lost, and every byte sent is
 * either logged or said to be missed. */
static void end(struct desk *d, const char *what, const char *why_missed)
{
    static struct log_check c;
    static char said[1 << 16];
    char folder[128];
    const char *argv[64] = { "stillmark-replay" };
    int status;

    let_it_read(d);
    assert_int_equal(live_stop(&d->live), 0);
    live_folder(&d->live, 0, folder, sizeof folder);
    log_check_load(&c, folder, what);
    log_check_has(&c, d->live.told, d->live.told_n, what);
    assert_true(c.last.closed);
    assert_int_equal(c.n_unshown, 0);
    assert_int_equal(logged_bytes(&c) + missed_bytes(&c, why_missed), d->sent);
    assert_true(c.n_files + 2 < COUNT(argv));
    for (size_t i = 0; i < c.n_files; i++)
        argv[i + 1] = c.path[i];
    status = live_run(&d->live, argv, said, sizeof said);
    if (status != 0)
        fail_msg("%s: replay gave %d:\n%s", what, status, said);
    printf("%s: %zu files, %zu entries, %llu of %llu bytes missed and said so\n", what, c.n_files,
           c.n_lines, (unsigned long long)missed_bytes(&c, why_missed),
           (unsigned long long)d->sent);
    log_check_free(&c);
}

/* ---- a small disk ---- */

static void write_text(const char *path, const char *text)
{
    const int fd = open(path, O_WRONLY);

    if (fd >= 0 && write(fd, text, strlen(text)) < 0)
        printf("%s: %s\n", path, strerror(errno));
    close(fd);
}

/* Mounts of our own from now on; false: not allowed here. */
static bool own_mounts(void)
{
    char map[64];
    const unsigned uid = getuid();

    if (unshare(CLONE_NEWNS) != 0) {
        if (unshare(CLONE_NEWUSER | CLONE_NEWNS) != 0)
            return false;
        snprintf(map, sizeof map, "0 %u 1", uid);
        write_text("/proc/self/uid_map", map);
    }
    return mount("none", "/", NULL, MS_REC | MS_PRIVATE, NULL) == 0;
}

static bool mount_small(const struct live *l, const char *size)
{
    char path[128], options[64];

    snprintf(path, sizeof path, "%s/logs", l->path);
    snprintf(options, sizeof options, "size=%s", size);
    if (mkdir(path, 0750) != 0)
        return false;
    if (mount("stillmark-test", path, "tmpfs", 0, options) == 0)
        return true;
    rmdir(path);
    return false;
}

static void fill(const struct live *l)
{
    static const char page[4096];
    char path[128];
    int fd;

    snprintf(path, sizeof path, "%s/logs/ballast", l->path);
    fd = open(path, O_WRONLY | O_CREAT | O_APPEND, 0600);
    assert_true(fd >= 0);
    while (write(fd, page, sizeof page) > 0)
        ;
    assert_int_equal(errno, ENOSPC);
    close(fd);
}

static void make_space(const struct live *l)
{
    char path[128];

    snprintf(path, sizeof path, "%s/logs/ballast", l->path);
    assert_int_equal(unlink(path), 0);
}

static void unmount_small(const struct live *l)
{
    char path[128];

    snprintf(path, sizeof path, "%s/logs", l->path);
    assert_int_equal(umount2(path, MNT_DETACH), 0);
}

static bool may_mount;

static void a_full_disk_is_said_and_the_log_goes_on_when_there_is_space(void **state)
{
    static struct desk d;
    static char line[1 << 20];

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    if (!may_mount || !mount_small(&d.live, "2m")) {
        live_remove(&d.live);
        printf("no file system may be mounted here\n");
        skip();
    }
    begin(&d);
    for (int round = 0; round < 2; round++) {
        note(&d, "\"done\":true");
        feed(&d, 1300 + 171 * round);
        fill(&d.live);
        expect(&d, "\"note\":\"not logged\"", 8000, line, sizeof line);
        assert_non_null(strstr(line, "\"k\":\"raw\""));
        check_status(&d, "\"logging\":false", "No space left on device");
        note(&d, "nothing was done");
        feed(&d, 2100);
        make_space(&d.live);
        expect(&d, "\"k\":\"open\"", 8000, line, sizeof line);
        assert_non_null(strstr(line, "\"how\":\"recovery\""));
        assert_non_null(strstr(line, "nothing was logged"));
        note(&d, "\"done\":true");
        check_status(&d, "\"logging\":true", "\"state\":\"up\"");
    }
    end(&d, "disk full twice", "No space left on device");
    unmount_small(&d.live);
    live_remove(&d.live);
}

static void a_disk_that_is_full_at_the_start_is_waited_for(void **state)
{
    static struct desk d;
    static char line[1 << 20];

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    if (!may_mount || !mount_small(&d.live, "256k")) {
        live_remove(&d.live);
        printf("no file system may be mounted here\n");
        skip();
    }
    fill(&d.live);
    begin(&d);
    expect(&d, "\"note\":\"not logged\"", 8000, line, sizeof line);
    check_status(&d, "\"logging\":false", "No space left on device");
    make_space(&d.live);
    expect(&d, "\"k\":\"open\"", 8000, line, sizeof line);
    note(&d, "\"done\":true");
    end(&d, "disk full at the start", "No space left on device");
    unmount_small(&d.live);
    live_remove(&d.live);
}

/* ---- the folder ---- */

static void a_folder_moved_away_is_said_and_written_again_when_it_is_back(void **state)
{
    static struct desk d;
    static char line[1 << 20];
    char folder[128], away[160];

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    live_folder(&d.live, 0, folder, sizeof folder);
    snprintf(away, sizeof away, "%s/elsewhere", d.live.path);
    begin(&d);
    note(&d, "\"done\":true");
    assert_int_equal(rename(folder, away), 0);
    expect(&d, "\"note\":\"not logged\"", 8000, line, sizeof line);
    feed(&d, 2500); /* no other folder is made in its place */
    check_status(&d, "\"logging\":false", "put it back");
    note(&d, "nothing was done");
    assert_int_equal(access(folder, F_OK), -1);
    assert_int_equal(rename(away, folder), 0);
    expect(&d, "\"k\":\"open\"", 8000, line, sizeof line);
    assert_non_null(strstr(line, "\"ordinal\":2"));
    note(&d, "\"done\":true");
    end(&d, "folder moved away and back", "not in its folder any more");
    live_remove(&d.live);
}

static void a_folder_replaced_by_an_empty_one_goes_on_with_fresh_numbers(void **state)
{
    static struct desk d;
    static char line[1 << 20];
    char folder[128], away[160], whole[256];
    struct sm_head before, after;

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    live_folder(&d.live, 0, folder, sizeof folder);
    snprintf(away, sizeof away, "%s/elsewhere", d.live.path);
    begin(&d);
    note(&d, "\"done\":true");
    feed(&d, 300);
    note(&d, "\"done\":true");
    const char *last = d.live.told + d.live.told_n - 1;
    while (last > d.live.told && last[-1] != '\n')
        last--;
    snprintf(whole, sizeof whole, "%.255s", last);
    assert_true(sm_head_read(whole, strlen(whole), &before));
    assert_int_equal(rename(folder, away), 0);
    assert_int_equal(mkdir(folder, 0750), 0);
    expect(&d, "\"k\":\"open\"", 8000, line, sizeof line);
    assert_true(sm_head_read(line, strlen(line), &after));
    assert_true(after.n > before.n);
    assert_non_null(strstr(line, "\"ordinal\":2"));
    note(&d, "\"done\":true");
    assert_int_equal(live_stop(&d.live), 0);
    live_remove(&d.live);
}

static void a_second_daemon_on_one_folder_is_refused(void **state)
{
    static struct desk d;
    static char said[8192];
    char setup[128], socket[128];
    const char *const argv[] = { "stillmarkd", "--setup", setup, "--socket", socket, NULL };
    struct stat st;

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    snprintf(setup, sizeof setup, "%s/conf/stillmark.yaml", d.live.path);
    snprintf(socket, sizeof socket, "%s/second", d.live.path);
    begin(&d);
    for (int i = 0; i < 3; i++) {
        feed(&d, 200);
        assert_int_equal(live_run(&d.live, argv, said, sizeof said), 2);
        assert_non_null(strstr(said, "another stillmarkd writes this log"));
        assert_int_equal(stat(socket, &st), -1);
    }
    snprintf(socket, sizeof socket, "%s", d.live.socket);
    assert_int_equal(live_run(&d.live, argv, said, sizeof said), 2);
    assert_int_equal(stat(d.live.socket, &st), 0); /* the first one's is left alone */
    note(&d, "\"done\":true");
    end(&d, "two daemons", "");
    live_remove(&d.live);
}

/* ---- a slow disk ---- */

#define SYNC_MS 700

static int slow_fdatasync(const struct sm_door *door, int fd)
{
    (void)door;
    live_sleep_ms(SYNC_MS);
    return sm_door_system()->fdatasync(sm_door_system(), fd);
}

/* The daemon's own loop, in a process of its own, over a disk that takes so long. */
static pid_t start_with_slow_disk(const struct live *l, const char *notify)
{
    struct sm_door door = *sm_door_system();
    struct sm_setup *setup = NULL;
    struct sm_loop *loop = NULL;
    char path[128], why[SM_WHY_SIZE];
    enum sm_status s;
    pid_t pid;

    fflush(NULL);
    pid = fork();
    assert_true(pid >= 0);
    if (pid > 0)
        return pid;
    prctl(PR_SET_PDEATHSIG, SIGKILL);
    setenv("NOTIFY_SOCKET", notify, 1);
    setenv("WATCHDOG_USEC", "4000000", 1);
    door.fdatasync = slow_fdatasync;
    snprintf(path, sizeof path, "%s/conf/stillmark.yaml", l->path);
    if (sm_read_setup(path, &setup) != 0 ||
        sm_loop_create(&door, setup, l->socket, &loop, why) != SM_OK)
        _exit(3);
    s = sm_loop_run(loop, why);
    sm_loop_destroy(loop);
    sm_setup_destroy(setup);
    _exit(s == SM_OK ? 0 : 1);
}

static int hear_notify(const struct live *l, char *ret_path, size_t cap)
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    const int fd = socket(AF_UNIX, SOCK_DGRAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);

    assert_true(fd >= 0);
    snprintf(ret_path, cap, "%s/notify", l->path);
    snprintf(a.sun_path, sizeof a.sun_path, "%.100s", ret_path);
    assert_int_equal(bind(fd, (const struct sockaddr *)&a, sizeof a), 0);
    return fd;
}

static void grow(int64_t *ret_longest_ns, int64_t *last_ns)
{
    const int64_t now_ns = live_now_ns();

    if (*last_ns != 0 && now_ns - *last_ns > *ret_longest_ns)
        *ret_longest_ns = now_ns - *last_ns;
    *last_ns = now_ns;
}

static void a_slow_disk_stalls_neither_port_nor_watchdog(void **state)
{
    static struct desk d;
    char notify[128], message[512], line[4096];
    int64_t reading_ns = 0, alive_ns = 0, reading_gap_ns = 0, alive_gap_ns = 0, asked_ns;
    unsigned readings = 0, alive = 0;
    int fd;

    (void)state;
    memset(&d, 0, sizeof d);
    live_make(&d.live, 1);
    fd = hear_notify(&d.live, notify, sizeof notify);
    d.live.daemon = start_with_slow_disk(&d.live, notify);
    assert_true(live_connect(&d.live, 10000));
    assert_true(feed_until(&d, "\"k\":\"reading\"", 5000, line, sizeof line));
    const int64_t end_ns = live_now_ns() + 7000 * MS;
    while (live_now_ns() < end_ns) {
        if (feed_until(&d, "\"k\":\"reading\"", 400, line, sizeof line)) {
            readings++;
            grow(&reading_gap_ns, &reading_ns);
        }
        const ssize_t n = recv(fd, message, sizeof message - 1, 0);
        if (n > 0 && memmem(message, (size_t)n, "WATCHDOG=1", 10) != NULL) {
            alive++;
            grow(&alive_gap_ns, &alive_ns);
        }
    }
    asked_ns = live_now_ns();
    check_status(&d, "\"logging\":true", "\"state\":\"up\"");
    assert_true(live_now_ns() - asked_ns < 300 * MS); /* answered while the disk works */
    asked_ns = live_now_ns();
    note(&d, "\"done\":true");
    assert_true(live_now_ns() - asked_ns >= SYNC_MS * MS); /* … but no act before it is on disk */
    printf("each sync takes %d ms: %u readings, at most %lld ms apart; alive %u times, at most "
           "%lld ms apart\n",
           SYNC_MS, readings, (long long)(reading_gap_ns / MS), alive,
           (long long)(alive_gap_ns / MS));
    assert_true(reading_gap_ns < 500 * MS);
    assert_true(alive >= 2 && alive_gap_ns < 4000 * MS);
    close(fd);
    let_it_read(&d);
    assert_int_equal(live_stop(&d.live), 0);
    live_remove(&d.live);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_full_disk_is_said_and_the_log_goes_on_when_there_is_space),
        cmocka_unit_test(a_disk_that_is_full_at_the_start_is_waited_for),
        cmocka_unit_test(a_folder_moved_away_is_said_and_written_again_when_it_is_back),
        cmocka_unit_test(a_folder_replaced_by_an_empty_one_goes_on_with_fresh_numbers),
        cmocka_unit_test(a_second_daemon_on_one_folder_is_refused),
        cmocka_unit_test(a_slow_disk_stalls_neither_port_nor_watchdog),
    };

    may_mount = own_mounts();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
