/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_notify.c: what the service manager is told. */
#include "scratch.h"

#include <sys/socket.h>
#include <sys/un.h>

#include "base/time.h"
#include "notify.h"

static int listen_at(const char *path)
{
    struct sockaddr_un a = { .sun_family = AF_UNIX };
    const int fd = socket(AF_UNIX, SOCK_DGRAM | SOCK_NONBLOCK, 0);

    snprintf(a.sun_path, sizeof a.sun_path, "%s", path);
    assert_int_equal(bind(fd, (const struct sockaddr *)&a, sizeof a), 0);
    return fd;
}

static const char *heard(int fd)
{
    static char buf[1024];
    const ssize_t n = recv(fd, buf, sizeof buf - 1, 0);

    buf[n > 0 ? n : 0] = '\0';
    return buf;
}

static void ready_alive_and_stopping_are_told(void **state)
{
    struct scratch s;
    struct sm_notify n;
    char path[96], pid[32];
    int fd;

    (void)state;
    scratch_make(&s);
    snprintf(path, sizeof path, "%s/notify", s.path);
    snprintf(pid, sizeof pid, "%ld", (long)getpid());
    fd = listen_at(path);
    setenv("NOTIFY_SOCKET", path, 1);
    setenv("WATCHDOG_USEC", "10000000", 1);
    setenv("WATCHDOG_PID", pid, 1);
    sm_notify_init(&n);
    sm_notify_ready(&n, "two\nlines");
    assert_string_equal(heard(fd), "READY=1\nSTATUS=two lines");
    sm_notify_alive(&n, 4 * SM_NS_PER_S);
    assert_string_equal(heard(fd), ""); /* not half the time yet */
    sm_notify_alive(&n, 5 * SM_NS_PER_S);
    assert_string_equal(heard(fd), "WATCHDOG=1");
    sm_notify_alive(&n, 9 * SM_NS_PER_S);
    assert_string_equal(heard(fd), "");
    sm_notify_stopping(&n);
    assert_string_equal(heard(fd), "STOPPING=1");
    sm_notify_finish(&n);
    setenv("WATCHDOG_PID", "1", 1); /* meant for another process */
    sm_notify_init(&n);
    assert_int_equal(n.watchdog_ns, 0);
    sm_notify_finish(&n);
    close(fd);
    scratch_remove(&s);
}

static void without_a_manager_nothing_happens(void **state)
{
    static const char *const nowhere[] = { NULL, "", "relative", "/nowhere/at/all", "@" };

    (void)state;
    for (size_t i = 0; i < COUNT(nowhere); i++) {
        struct sm_notify n;

        if (nowhere[i] == NULL)
            unsetenv("NOTIFY_SOCKET");
        else
            setenv("NOTIFY_SOCKET", nowhere[i], 1);
        setenv("WATCHDOG_USEC", "99999999999999999999", 1);
        sm_notify_init(&n);
        if (n.fd != -1 || n.watchdog_ns != 0)
            fail_msg("%s: connected", nowhere[i] != NULL ? nowhere[i] : "(unset)");
        sm_notify_ready(&n, "ready");
        sm_notify_alive(&n, SM_NS_PER_S);
        sm_notify_finish(&n);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(ready_alive_and_stopping_are_told),
        cmocka_unit_test(without_a_manager_nothing_happens),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
