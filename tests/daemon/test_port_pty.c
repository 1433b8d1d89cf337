/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_port_pty.c: a port on a real pseudo-terminal, through the real door. */
#include "check.h"

#include <dirent.h>
#include <fcntl.h>
#include <poll.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <termios.h>
#include <unistd.h>

#include "port.h"

static int master;
static struct sm_port_setup setup;
static struct sm_port_bytes bytes;
static char why[SM_LINK_TEXT_SIZE];

static int begin(void **state)
{
    (void)state;
    master = posix_openpt(O_RDWR | O_NOCTTY | O_CLOEXEC);
    if (master < 0 || grantpt(master) != 0 || unlockpt(master) != 0)
        return 1;
    memset(&setup, 0, sizeof setup);
    setup.baud = 9600;
    setup.bits = 8;
    setup.stop = 1;
    return ptsname_r(master, setup.port, sizeof setup.port);
}

static int end(void **state)
{
    (void)state;
    if (master >= 0)
        close(master);
    return 0;
}

static struct sm_port *open_well(struct sm_link *ret_link)
{
    struct sm_port *p = NULL;

    if (sm_port_open(sm_door_system(), &setup, "", &p, ret_link) != SM_OK)
        fail_msg("%s", ret_link->why);
    return p;
}

static size_t descriptors(void)
{
    DIR *d = opendir("/proc/self/fd");
    size_t n = 0;

    assert_non_null(d);
    while (readdir(d) != NULL)
        n++;
    closedir(d);
    return n;
}

/* Waits until there is something to read, or the line is gone. */
static void wait_for(const struct sm_port *p)
{
    struct pollfd f = { .fd = sm_port_fd(p), .events = POLLIN };

    if (poll(&f, 1, 5000) != 1)
        fail_msg("nothing for 5 s");
}

static void every_byte_passes_unchanged(void **state)
{
    unsigned char all[512];
    struct sm_link link;
    struct sm_port *p = open_well(&link);
    size_t got = 0;

    (void)state;
    for (size_t i = 0; i < sizeof all; i++)
        all[i] = (unsigned char)i;
    assert_int_equal(write(master, all, sizeof all), sizeof all);
    while (got < sizeof all) {
        wait_for(p);
        if (sm_port_read(p, &bytes, why) != SM_PORT_BYTES)
            fail_msg("after %zu bytes: %s", got, why);
        assert_int_equal(bytes.n_bad, 0);
        for (size_t i = 0; i < bytes.n; i++, got++)
            if (got >= sizeof all || bytes.bytes[i] != all[got])
                fail_msg("byte %zu: got %02x", got, bytes.bytes[i]);
    }
    assert_int_equal(sm_port_read(p, &bytes, why), SM_PORT_NOTHING);
    assert_int_equal(sm_port_write(p, "\r\n\xff\x11\x03", 5, why), SM_OK);
    assert_int_equal(read(master, all, sizeof all), 5);
    assert_memory_equal(all, "\r\n\xff\x11\x03", 5);
    sm_port_close(p);
}

static void a_second_opening_says_in_use(void **state)
{
    struct sm_link link, second;
    struct sm_port *p = open_well(&link), *none = NULL;
    const size_t before = descriptors();

    (void)state;
    assert_int_equal(sm_port_open(sm_door_system(), &setup, "", &none, &second), SM_EBUSY);
    assert_null(none);
    assert_int_equal(second.state, SM_LINK_REFUSED);
    assert_non_null(strstr(second.why, "is in use by another program"));
    assert_int_equal(descriptors(), before);
    sm_port_close(p);
    sm_port_close(open_well(&link)); /* given back */
}

static void settings_are_read_back(void **state)
{
    struct termios t;
    struct sm_link link;
    struct sm_port *p;

    (void)state;
    assert_int_equal(tcgetattr(master, &t), 0);
    t.c_iflag |= IXON | IXANY | ICRNL; /* as a terminal is born */
    assert_int_equal(tcsetattr(master, TCSANOW, &t), 0);
    setup.baud = 19200;
    setup.stop = 2;
    p = open_well(&link);
    assert_string_equal(link.settings, "19200 8N2, no flow control");
    assert_string_equal(link.why, "");
    assert_string_equal(link.identity, "pseudo-terminal");
    assert_string_equal(link.device, setup.port);
    assert_int_equal(tcgetattr(sm_port_fd(p), &t), 0);
    assert_int_equal(t.c_iflag, INPCK | PARMRK);
    assert_int_equal(t.c_lflag, 0);
    assert_int_equal(fcntl(sm_port_fd(p), F_GETFD), FD_CLOEXEC);
    sm_port_close(p);
}

/* A pseudo-terminal has no parity and no 7 bits: seen, not from a standard. */
static void what_a_pseudo_terminal_does_not_take_is_told(void **state)
{
    struct sm_link link;

    (void)state;
    setup.bits = 7;
    setup.parity = SM_PARITY_EVEN;
    sm_port_close(open_well(&link));
    assert_string_equal(link.why, "the port does not take: bits, parity");
    assert_string_equal(link.settings,
                        "9600 8N1, no flow control; the port does not take: bits, parity");
}

static void the_other_end_closing_is_lost(void **state)
{
    struct sm_link link;
    struct sm_port *p = open_well(&link);
    const size_t before = descriptors();

    (void)state;
    assert_int_equal(sm_port_read(p, &bytes, why), SM_PORT_NOTHING);
    close(master);
    master = -1;
    wait_for(p);
    assert_int_equal(sm_port_read(p, &bytes, why), SM_PORT_LOST);
    assert_string_equal(why, "the adapter was unplugged or the line hung up");
    assert_int_equal(sm_port_write(p, "R\r", 2, why), SM_EIO);
    sm_port_close(p);
    assert_int_equal(descriptors(), before - 2); /* ours and the other end */
}

static void a_file_is_no_serial_line(void **state)
{
    struct sm_port *none = NULL;
    struct sm_link link;
    char path[] = "/tmp/stillmark-test-XXXXXX";
    const int fd = mkstemp(path);

    (void)state;
    assert_true(fd >= 0);
    close(fd);
    snprintf(setup.port, sizeof setup.port, "%s", path);
    assert_int_equal(sm_port_open(sm_door_system(), &setup, "", &none, &link), SM_EIO);
    assert_int_equal(link.state, SM_LINK_REFUSED);
    assert_non_null(strstr(link.why, "is no serial line"));
    unlink(path);
    assert_int_equal(sm_port_open(sm_door_system(), &setup, "", &none, &link), SM_EIO);
    assert_int_equal(link.state, SM_LINK_LOST);
    assert_non_null(strstr(link.why, "is not there"));
}

int main(void)
{
#define PTY_TEST(f) cmocka_unit_test_setup_teardown(f, begin, end)
    const struct CMUnitTest tests[] = {
        PTY_TEST(every_byte_passes_unchanged),
        PTY_TEST(a_second_opening_says_in_use),
        PTY_TEST(settings_are_read_back),
        PTY_TEST(what_a_pseudo_terminal_does_not_take_is_told),
        PTY_TEST(the_other_end_closing_is_lost),
        PTY_TEST(a_file_is_no_serial_line),
    };

    return cmocka_run_group_tests_name("port-pty", tests, NULL, NULL);
}
