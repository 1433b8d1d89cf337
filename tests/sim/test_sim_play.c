/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_sim_play.c: `stillmark-sim` itself: files, and a meter on a pseudo-terminal. */
#include "check.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

static char folder[] = "/tmp/stillmark-sim-test-XXXXXX";
static bool hush; /* what the program says to a person is not looked at */
static char scenario_path[64], link_path[64], out_path[64];

static void write_scenario(const char *text)
{
    FILE *f = fopen(scenario_path, "wb");

    if (!f)
        fail_msg("%s: %s", scenario_path, strerror(errno));
    fputs(text, f);
    assert_int_equal(fclose(f), 0);
}

static pid_t start(char *const argv[])
{
    const pid_t pid = fork();

    assert_true(pid >= 0);
    if (pid == 0) {
        if (hush)
            dup2(open("/dev/null", O_WRONLY), STDERR_FILENO);
        execv(SM_BIN_DIR "/stillmark-sim", argv);
        _exit(127);
    }
    return pid;
}

static int ended(pid_t pid)
{
    int status = 0;

    assert_int_equal(waitpid(pid, &status, 0), pid);
    return WIFEXITED(status) ? WEXITSTATUS(status) : 128;
}

static double now_s(void)
{
    struct timespec t;

    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void nap(void)
{
    const struct timespec t = { 0, 5000000 };

    nanosleep(&t, NULL);
}

/* Opens the link, waiting for it up to 10 s. */
static int open_link(void)
{
    const double give_up_s = now_s() + 10;
    int fd;

    while ((fd = open(link_path, O_RDWR | O_NOCTTY | O_NONBLOCK)) < 0) {
        if (now_s() > give_up_s)
            fail_msg("%s: %s after 10 s", link_path, strerror(errno));
        nap();
    }
    return fd;
}

/* Reads until the line hangs up, until want bytes are there, or for 10 s. */
static size_t read_some(int fd, char *buf, size_t want, bool *ret_hung_up)
{
    const double give_up_s = now_s() + 10;
    size_t have = 0;

    *ret_hung_up = false;
    while (have < want && now_s() < give_up_s) {
        struct pollfd f = { fd, POLLIN, 0 };
        if (poll(&f, 1, 100) <= 0)
            continue;
        const ssize_t n = read(fd, buf + have, want - have);
        if (n > 0) {
            have += (size_t)n;
        } else if (n == 0 || errno != EAGAIN) {
            *ret_hung_up = true;
            break;
        }
    }
    return have;
}

static size_t read_file(const char *path, char *buf, size_t cap)
{
    FILE *f = fopen(path, "rb");

    if (!f)
        fail_msg("%s: %s", path, strerror(errno));
    const size_t n = fread(buf, 1, cap - 1, f);
    buf[n] = '\0';
    fclose(f);
    return n;
}

static void files_are_written_as_told(void **state)
{
    static char text[4000];
    char *const csv[] = { "stillmark-sim", scenario_path, "--csv", out_path, NULL };
    char *const lines[] = { "stillmark-sim", scenario_path, "--lines", out_path, NULL };
    char *const truth[] = { "stillmark-sim", scenario_path, "--csv", "/dev/null",
                            "--truth",       out_path,      NULL };

    (void)state;
    write_scenario("shape \"%.1v \\\"\\x01\\n\"\nstep 0.1 mV\nin \"=a\" 0 mV for 2 s\nair 1 s word "
                   "OVR\nunplug 1 s\n");
    assert_int_equal(ended(start(csv)), 0);
    read_file(out_path, text, sizeof text);
    assert_string_equal(text, "time_s,value\n0.000000,0.0\n1.000000,0.0\n");
    assert_int_equal(ended(start(lines)), 0);
    read_file(out_path, text, sizeof text);
    assert_string_equal(
        text, "0\t0.0 \\\"\\u0001\\u000a\n1000000000\t0.0 \\\"\\u0001\\u000a\n"
              "2000000000\tOVR \\\"\\u0001\\u000a\n3000000000\t\tdown\n4000000000\t\tup\n");
    assert_int_equal(ended(start(truth)), 0);
    read_file(out_path, text, sizeof text);
    assert_string_equal(text,
                        "item,name,kind,begin_s,end_s,true_value,unit,temperature_c,true_end_mv,"
                        "t_settle_s,calm_s,stayed_three\n"
                        "1,'=a,sample,0.000000,2.000000,0,mV,20,0,0,2,yes\n"
                        ",,air,2.000000,3.000000,,,,,,,\n"
                        ",,unplug,3.000000,4.000000,,,,,,,\n");
}

static void what_cannot_be_done_exits_2(void **state)
{
    char *const missing[] = { "stillmark-sim", "/nonexistent.scn", "--csv", "/dev/null", NULL };
    char *const nothing[] = { "stillmark-sim", NULL };
    char *const wrong[] = { "stillmark-sim", scenario_path, "--csv", "/dev/null", NULL };
    char *const full[] = { "stillmark-sim", scenario_path, "--csv", "/dev/full", NULL };
    char *const taken[] = { "stillmark-sim", scenario_path, "--link", scenario_path, NULL };

    (void)state;
    hush = true;
    assert_int_equal(ended(start(missing)), 2);
    assert_int_equal(ended(start(nothing)), 2);
    write_scenario("speed 3\n");
    assert_int_equal(ended(start(wrong)), 2);
    write_scenario("in a 0 mV for 2 s\n");
    assert_int_equal(ended(start(full)), 2);
    assert_int_equal(ended(start(taken)), 2); /* a file is never replaced by the link */
    struct stat s;
    assert_true(lstat(scenario_path, &s) == 0 && S_ISREG(s.st_mode));
    hush = false;
}

static void a_streaming_meter_plays_in_real_time(void **state)
{
    char *const argv[] = { "stillmark-sim", scenario_path, "--link", link_path, "--wait", NULL };
    char buf[4096];
    bool hung_up;

    (void)state;
    write_scenario("rate 20 /s\nstart 12.3 mV\nin a 12.3 mV for 1.01 s\n");
    const pid_t pid = start(argv);
    const int fd = open_link();
    const double began_s = now_s();
    const size_t n = read_some(fd, buf, sizeof buf, &hung_up);
    const double took_s = now_s() - began_s;
    close(fd);
    assert_int_equal(ended(pid), 0);
    assert_true(hung_up);
    assert_int_equal(n, 21 * strlen("+0012.3 mV  20.0 C\r\n"));
    assert_memory_equal(buf, "+0012.3 mV  20.0 C\r\n", 20);
    if (took_s < 1.0)
        fail_msg("a second of simulated time took %g s", took_s);
    assert_int_equal(access(link_path, F_OK), -1); /* the link goes with the meter */
}

static void a_meter_that_answers_answers_on_the_terminal(void **state)
{
    char *const argv[] = { "stillmark-sim", scenario_path, "--link", link_path, "--stay", NULL };
    char buf[64];
    bool hung_up;

    (void)state;
    write_scenario("shape r-mv\nanswer 20 ms\nstart -5 mV\nin a -5 mV for 60 s\n");
    const pid_t pid = start(argv);
    const int fd = open_link();
    assert_int_equal(write(fd, "I\r", 2), 2);
    assert_int_equal(read_some(fd, buf, 21, &hung_up), 21);
    assert_memory_equal(buf, "invented meter 0007\r\n", 21);
    assert_int_equal(write(fd, "R\r", 2), 2);
    assert_int_equal(read_some(fd, buf, 20, &hung_up), 20);
    assert_memory_equal(buf, "-0005.0 mV  20.0 C\r\n", 20);
    close(fd);
    kill(pid, SIGTERM);
    assert_int_equal(ended(pid), 0);
    assert_int_equal(access(link_path, F_OK), -1);
}

/* Opens the link again and again, each time until it hangs up: plugs times, under changing names.
 */
static void follow_plugs(char *const argv[], unsigned plugs)
{
    char buf[16384], name[64], last_name[64] = "";
    const pid_t pid = start(argv);
    bool hung_up;

    for (unsigned plug = 1; plug <= plugs; plug++) {
        const int fd = open_link();
        const ssize_t n = readlink(link_path, name, sizeof name - 1);
        name[n > 0 ? n : 0] = '\0';
        if (strcmp(name, last_name) == 0)
            fail_msg("plug %u came back under its old name %s", plug, name);
        memcpy(last_name, name, sizeof name);
        const size_t got = read_some(fd, buf, sizeof buf, &hung_up);
        close(fd);
        if (got == 0 || !hung_up)
            fail_msg("plug %u: %zu bytes, %s", plug, got, hung_up ? "hung up" : "not hung up");
    }
    assert_int_equal(ended(pid), 0);
    assert_int_equal(access(link_path, F_OK), -1);
}

static void the_plug_is_pulled_as_often_as_told(void **state)
{
    char *const scenario[] = {
        "stillmark-sim", scenario_path, "--link", link_path, "--wait", NULL
    };
    char *const replug[] = { "stillmark-sim", scenario_path, "--link", link_path,
                             "--wait",        "--replug",    "5",      "--every",
                             "0.2",           "--away",      "0.05",   NULL };

    (void)state;
    write_scenario("rate 50 /s\nin a 0 mV for 0.5 s\nunplug 0.1 s\nback 0.3 s\n");
    follow_plugs(scenario, 2);
    write_scenario("rate 50 /s\nin a 0 mV for 3 s\n");
    follow_plugs(replug, 6);
}

static int make_folder(void **state)
{
    (void)state;
    if (!mkdtemp(folder))
        return -1;
    snprintf(scenario_path, sizeof scenario_path, "%s/a.scn", folder);
    snprintf(link_path, sizeof link_path, "%s/tty", folder);
    snprintf(out_path, sizeof out_path, "%s/out", folder);
    return 0;
}

static int remove_folder(void **state)
{
    (void)state;
    unlink(scenario_path);
    unlink(link_path);
    unlink(out_path);
    return rmdir(folder);
}

int main(void)
{
    static const struct CMUnitTest tests[] = {
        cmocka_unit_test(files_are_written_as_told),
        cmocka_unit_test(a_streaming_meter_plays_in_real_time),
        cmocka_unit_test(a_meter_that_answers_answers_on_the_terminal),
        cmocka_unit_test(the_plug_is_pulled_as_often_as_told),
        cmocka_unit_test(what_cannot_be_done_exits_2),
    };
    return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
