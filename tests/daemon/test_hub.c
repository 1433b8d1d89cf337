/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_hub.c: the control socket, as its clients see it. */
#include "rig.h"

#include <event2/event.h>
#include <fcntl.h>
#include <sys/socket.h>
#include <sys/un.h>

#include "hub.h"
#include "record/head.h"

struct desk { /* a meter, the hub, and the loop under both */
    struct rig rig;
    struct event_base *base;
    struct sm_hub *hub;
    char path[96];
};

static const struct sm_now *stamp(void *ctx)
{
    struct desk *d = ctx;

    return &d->rig.now;
}

static void after(void *ctx, struct sm_meter *m)
{
    struct desk *d = ctx;

    sm_meter_wake(m, &d->rig.now);
}

static enum sm_status make_hub(struct desk *d, struct sm_hub **ret_hub, char why[SM_WHY_SIZE])
{
    const struct sm_hub_about about = {
        d->base, sm_door_system(), &d->rig.meter, 1, d, stamp, stamp, after
    };

    return sm_hub_create(&about, d->path, ret_hub, why);
}

static void desk_make(struct desk *d)
{
    char why[SM_WHY_SIZE];

    memset(d, 0, sizeof *d);
    rig_make(&d->rig, false);
    rig_start(&d->rig);
    snprintf(d->path, sizeof d->path, "%s/socket", d->rig.scratch.path);
    d->base = event_base_new();
    assert_non_null(d->base);
    if (make_hub(d, &d->hub, why) != SM_OK)
        fail_msg("hub: %s", why);
    assert_int_equal(sm_hub_open(d->hub), SM_OK);
    d->rig.hub = d->hub;
}

static void desk_remove(struct desk *d)
{
    d->rig.hub = NULL;
    sm_hub_destroy(d->hub);
    event_base_free(d->base);
    rig_remove(&d->rig);
}

static int connect_to(const struct desk *d)
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    const int fd = socket(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC | SOCK_NONBLOCK, 0);

    snprintf(a.sun_path, sizeof a.sun_path, "%s", d->path);
    assert_true(fd >= 0);
    assert_int_equal(connect(fd, (const struct sockaddr *)&a, sizeof a), 0);
    return fd;
}

static void turn(struct desk *d)
{
    for (int i = 0; i < 50; i++)
        event_base_loop(d->base, EVLOOP_NONBLOCK);
}

static void say_n(struct desk *d, int fd, const char *text, size_t n)
{
    while (n > 0) {
        const ssize_t put = write(fd, text, n);
        if (put > 0) {
            text += put;
            n -= (size_t)put;
        } else if (errno != EAGAIN) {
            return; /* cut off: the test looks at what came back */
        }
        turn(d);
    }
    turn(d);
}

/* All that came, NUL-terminated, into a buffer of its own; *ret_open: it is still connected. */
static char *hear(struct desk *d, int fd, bool *ret_open)
{
    static char buf[1 << 20];
    size_t n = 0;
    ssize_t got = -1;

    for (int i = 0; i < 30; i++) {
        turn(d);
        while (n < sizeof buf - 1 && (got = read(fd, buf + n, sizeof buf - 1 - n)) > 0)
            n += (size_t)got;
        if (got == 0)
            break;
    }
    buf[n] = '\0';
    if (ret_open != NULL)
        *ret_open = got < 0 && errno == EAGAIN;
    return buf;
}

static const char *ask(struct desk *d, int fd, const char *text)
{
    say_n(d, fd, text, strlen(text));
    rig_settle(&d->rig);
    return hear(d, fd, NULL);
}

static void malformed_requests_are_answered_with_an_error_and_no_harm(void **state)
{
    static const char *const bad[] = {
        "garbage\n",
        "{\n",
        "{}\n",
        "[]\n",
        "{\"k\":7}\n",
        "{\"k\":\"dance\"}\n",
        "{\"k\":\"status\",\"k\":\"status\"}\n",
        "{\"k\":\"status\"} trailing\n",
        "{\"k\":\"act\"}\n",
        "{\"k\":\"act\",\"act\":\"next\"}\n",
        "{\"k\":\"status\",\"meter\":\"nix\"}\n",
        "{\"k\":\"status\",\"meter\":7}\n",
        "{\"k\":\"follow\",\"from\":-1}\n",
        "{\"k\":\"follow\",\"from\":\"a\"}\n",
        "{\"k\":\"act\",\"act\":\"note\",\"id\":\"a\",\"text\":\"\xff\"}\n",
        "\x01\x02\x03\n",
        "{\"k\":\"status\",\"meter\":\"\\u001b[2J\"}\n"
    };
    struct desk d;
    int fd;

    (void)state;
    desk_make(&d);
    fd = connect_to(&d);
    for (size_t i = 0; i < COUNT(bad); i++) {
        const char *got = ask(&d, fd, bad[i]);
        if (strncmp(got, "{\"k\":\"error\",", 13) != 0 || rig_count(got, "\n") != 1 ||
            strstr(got, "\"why\":\"") == NULL || strchr(got, 0x1b) != NULL)
            fail_msg("%s: got %s", bad[i], got);
    }
    assert_non_null(strstr(ask(&d, fd, "{\"k\":\"status\"}\n"), "\"meter\":\"m1\""));
    close(fd);
    desk_remove(&d);
}

static void an_endless_line_is_cut_off(void **state)
{
    static char text[SM_REQUEST_MAX + 100000];
    struct desk d;
    bool open;
    char *got;
    int fd;

    (void)state;
    desk_make(&d);
    fd = connect_to(&d);
    memset(text, 'a', sizeof text);
    say_n(&d, fd, text, sizeof text);
    got = hear(&d, fd, &open);
    assert_non_null(strstr(got, "longer than 256 KiB"));
    assert_false(open);
    close(fd);
    desk_remove(&d);
}

static void an_act_is_answered_when_it_is_on_disk_also_to_who_says_no_more(void **state)
{
    static const char act[] =
        "{\"k\":\"act\",\"act\":\"note\",\"id\":\"n1\",\"text\":\"hello\",\"who\":\"bench-a\"}\n";
    struct desk d;
    bool open;
    char *log;
    int fd;

    (void)state;
    desk_make(&d);
    fd = connect_to(&d);
    say_n(&d, fd, act, strlen(act));
    assert_int_equal(shutdown(fd, SHUT_WR), 0);
    assert_string_equal(hear(&d, fd, &open), "");
    assert_true(open);
    rig_settle(&d.rig);
    assert_non_null(strstr(hear(&d, fd, &open), "\"k\":\"answer\""));
    assert_false(open); /* it has had all that it was owed */
    log = rig_log(&d.rig);
    assert_non_null(strstr(log, "\"who\":\"bench-a\",\"door\":\"socket\",\"peer\":{\"uid\":"));
    free(log);
    close(fd);
    desk_remove(&d);
}

static void when_the_log_fails_the_sender_is_told(void **state)
{
    struct desk d;
    const char *got;
    int fd;

    (void)state;
    desk_make(&d);
    fd = connect_to(&d);
    sm_door_fail_plan(&d.rig.door, SM_CALLS(SM_CALL_FDATASYNC), 1, true, EIO, false);
    got = ask(&d, fd, "{\"k\":\"act\",\"act\":\"note\",\"id\":\"n1\",\"text\":\"a\"}\n");
    assert_non_null(strstr(got, "\"id\":\"n1\""));
    assert_non_null(strstr(got, "may or may not be done"));
    got = ask(&d, fd, "{\"k\":\"act\",\"act\":\"note\",\"id\":\"n2\",\"text\":\"a\"}\n");
    assert_non_null(strstr(got, "nothing was done"));
    got = ask(&d, fd, "{\"k\":\"status\"}\n");
    assert_non_null(strstr(got, "\"logging\":false"));
    assert_non_null(strstr(got, "\"not_logged\":{"));
    sm_door_fail_heal(&d.rig.door);
    rig_pass(&d.rig, 3 * SM_NS_PER_S);
    got = ask(&d, fd, "{\"k\":\"act\",\"act\":\"note\",\"id\":\"n3\",\"text\":\"a\"}\n");
    assert_non_null(strstr(got, "\"done\":true"));
    close(fd);
    desk_remove(&d);
}

/* Every entry from `from` to `to` is there, none twice, none below `lowest`. */
static void check_complete(const char *text, int64_t lowest, int64_t from, int64_t to)
{
    static bool seen[20000];

    memset(seen, 0, sizeof seen);
    for (const char *at = text; *at != '\0'; at = strchr(at, '\n') + 1) {
        struct sm_head h;
        const char *end = strchr(at, '\n');
        assert_non_null(end);
        if (!sm_head_read(at, (size_t)(end - at), &h) || h.n == 0)
            continue; /* live */
        if (h.n < lowest || h.n >= (int64_t)COUNT(seen) || seen[h.n])
            fail_msg("entry %lld: not asked for, or sent twice", (long long)h.n);
        seen[h.n] = true;
    }
    for (int64_t n = from; n <= to; n++)
        if (!seen[n])
            fail_msg("entry %lld of %lld to %lld is missing", (long long)n, (long long)from,
                     (long long)to);
}

static void a_follower_gets_every_entry_once_from_the_one_it_names(void **state)
{
    static const int64_t froms[] = { 1, 5, 30, 100000 };
    struct desk d;
    char request[64];
    struct sm_meter_disk disk;
    int fd[COUNT(froms)];

    (void)state;
    desk_make(&d);
    for (int i = 0; i < 40; i++) {
        rig_pass(&d.rig, SM_NS_PER_S / 10);
        rig_send(&d.rig, "-0012.4 mV  24.8 C\r\n");
    }
    for (size_t i = 0; i < COUNT(froms); i++) {
        fd[i] = connect_to(&d);
        snprintf(request, sizeof request, "{\"k\":\"follow\",\"from\":%lld}\n",
                 (long long)froms[i]);
        assert_int_equal(write(fd[i], request, strlen(request)), strlen(request));
        turn(&d);
        for (int k = 0; k < 15; k++) { /* it goes on while they begin to follow */
            rig_pass(&d.rig, SM_NS_PER_S / 10);
            rig_send(&d.rig, "-0012.4 mV  24.8 C\r\n");
        }
    }
    rig_act(&d.rig, "note", "n1", "the last entries");
    sm_meter_disk(d.rig.meter, &disk);
    for (size_t i = 0; i < COUNT(froms); i++) {
        char *log = rig_log(&d.rig), *last = strstr(log, "\"k\":\"answer\"");
        int64_t n;

        while (last > log && last[-1] != '\n')
            last--;
        n = atoll(last + 5) + 2; /* carried and stamp follow the answer */
        /* who asks for what is yet to come gets what comes from now on: the note at least */
        if (froms[i] < n)
            check_complete(hear(&d, fd[i], NULL), froms[i], froms[i], n);
        else
            check_complete(hear(&d, fd[i], NULL), 1, n - 3, n);
        free(log);
        close(fd[i]);
    }
    desk_remove(&d);
}

static void following_goes_on_over_a_change_of_file(void **state)
{
    struct desk d;
    char *log, *last;
    int fd;

    (void)state;
    desk_make(&d);
    fd = connect_to(&d);
    assert_int_equal(write(fd, "{\"k\":\"follow\",\"from\":1}\n", 24), 24);
    turn(&d);
    rig_pass(&d.rig, SM_NS_PER_S);
    d.rig.now.utc_us += SM_US_PER_DAY;
    rig_pass(&d.rig, 3 * SM_NS_PER_S);
    assert_int_equal(rig_verify(&d.rig), 2);
    rig_act(&d.rig, "note", "n1", "in the second file");
    log = rig_log(&d.rig);
    last = strstr(log, "\"k\":\"answer\"");
    while (last > log && last[-1] != '\n')
        last--;
    check_complete(hear(&d, fd, NULL), 1, 1, atoll(last + 5) + 2);
    free(log);
    close(fd);
    desk_remove(&d);
}

static void who_reads_nothing_is_cut_off_and_stalls_nobody(void **state)
{
    struct desk d;
    static char line[100001];
    int lazy, other;
    bool open;

    (void)state;
    desk_make(&d);
    lazy = connect_to(&d);
    other = connect_to(&d);
    assert_int_equal(write(lazy, "{\"k\":\"follow\"}\n", 15), 15);
    turn(&d);
    memset(line, 'x', sizeof line - 1);
    line[sizeof line - 1] = '\n';
    for (int i = 0; i < 200; i++) { /* 20 MB */
        sm_hub_line(d.hub, d.rig.meter, line, sizeof line);
        turn(&d);
    }
    assert_non_null(strstr(ask(&d, other, "{\"k\":\"status\"}\n"), "\"k\":\"status\""));
    do
        hear(&d, lazy, &open);
    while (open && read(lazy, line, 1) > 0);
    assert_false(open);
    close(lazy);
    close(other);
    desk_remove(&d);
}

static void at_most_sixty_four_are_served(void **state)
{
    struct desk d;
    int fd[SM_CLIENTS_MAX + 1];
    bool open;

    (void)state;
    desk_make(&d);
    for (size_t i = 0; i < COUNT(fd); i++) {
        fd[i] = connect_to(&d);
        turn(&d);
    }
    assert_non_null(strstr(hear(&d, fd[SM_CLIENTS_MAX], &open), "64 clients"));
    assert_false(open);
    close(fd[0]);
    turn(&d);
    close(fd[SM_CLIENTS_MAX]);
    fd[0] = connect_to(&d);
    assert_non_null(strstr(ask(&d, fd[0], "{\"k\":\"status\"}\n"), "\"k\":\"status\""));
    for (size_t i = 0; i < SM_CLIENTS_MAX; i++)
        close(fd[i]);
    desk_remove(&d);
}

static void a_stale_socket_is_replaced_and_a_living_one_is_not(void **state)
{
    struct desk d;
    struct sm_hub *second = NULL;
    char why[SM_WHY_SIZE];
    struct stat st;
    int fd;
    struct sockaddr_un a = { .sun_family = AF_UNIX };

    (void)state;
    desk_make(&d);
    assert_int_equal(stat(d.path, &st), 0);
    assert_int_equal(st.st_mode & 07777, 0660);
    assert_int_equal(make_hub(&d, &second, why), SM_EBUSY);
    assert_non_null(strstr(why, "another stillmarkd"));
    sm_hub_destroy(d.hub);
    d.rig.hub = d.hub = NULL;
    assert_int_equal(access(d.path, F_OK), -1); /* taken away when it ended well */
    fd = socket(AF_UNIX, SOCK_STREAM, 0);
    snprintf(a.sun_path, sizeof a.sun_path, "%s", d.path);
    assert_int_equal(bind(fd, (const struct sockaddr *)&a, sizeof a), 0);
    close(fd); /* as a daemon that died leaves it */
    assert_int_equal(make_hub(&d, &d.hub, why), SM_OK);
    sm_hub_destroy(d.hub);
    d.hub = NULL;
    scratch_write(d.path, "not a socket");
    assert_int_equal(make_hub(&d, &second, why), SM_EIO);
    assert_non_null(strstr(why, "no socket"));
    desk_remove(&d);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(malformed_requests_are_answered_with_an_error_and_no_harm),
        cmocka_unit_test(an_endless_line_is_cut_off),
        cmocka_unit_test(an_act_is_answered_when_it_is_on_disk_also_to_who_says_no_more),
        cmocka_unit_test(when_the_log_fails_the_sender_is_told),
        cmocka_unit_test(a_follower_gets_every_entry_once_from_the_one_it_names),
        cmocka_unit_test(following_goes_on_over_a_change_of_file),
        cmocka_unit_test(who_reads_nothing_is_cut_off_and_stalls_nobody),
        cmocka_unit_test(at_most_sixty_four_are_served),
        cmocka_unit_test(a_stale_socket_is_replaced_and_a_living_one_is_not),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
