/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_port_serial.c: the real libserialport and the real door over a pseudo-terminal that passes
 * for a USB adapter. This program's own ioctl, readlink … come before the C library's, also for
 * libserialport: they answer for /dev/ttyPAIR0 what a kernel would, modem lines and sysfs included.
 */
#include "check.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <sys/stat.h>
#include <sys/syscall.h>
#include <termios.h>
#include <unistd.h>

#include "port.h"

#define DEVICE "/dev/ttyPAIR0"
#define SYSFS "/sys/class/tty/ttyPAIR0"

static char pair[64]; /* what stands behind DEVICE; "" not plugged in */
static const char *serial_number;
static int lines;     /* TIOCM_… */
static bool no_lines; /* as a port without them */
static unsigned serial_opens, line_sets;

/* ---- the kernel's part ---- */

int __lxstat(int version, const char *path, struct stat *st);
int __open_2(const char *path, int flags);

static bool is(const char *path, const char *what)
{
    return pair[0] != '\0' && strcmp(path, what) == 0;
}

static int really_open(const char *path, int flags, mode_t mode)
{
    serial_opens += is(path, DEVICE);
    return (int)syscall(SYS_openat, AT_FDCWD, is(path, DEVICE) ? pair : path, flags, mode);
}

int open(const char *path, int flags, ...)
{
    va_list args;
    mode_t mode;

    va_start(args, flags);
    mode = (flags & O_CREAT) != 0 ? va_arg(args, mode_t) : 0;
    va_end(args);
    return really_open(path, flags, mode);
}

int __open_2(const char *path, int flags)
{
    return really_open(path, flags, 0);
}

int __lxstat(int version, const char *path, struct stat *st)
{
    (void)version;
    if (!is(path, SYSFS))
        return fstatat(AT_FDCWD, path, st, AT_SYMLINK_NOFOLLOW);
    memset(st, 0, sizeof *st);
    st->st_mode = S_IFLNK | 0777;
    return 0;
}

ssize_t readlink(const char *restrict path, char *restrict buf, size_t n)
{
    static const char target[] = "../../devices/made-up/usb1/1-1/1-1:1.0/ttyPAIR0/tty/ttyPAIR0";

    if (!is(path, SYSFS))
        return syscall(SYS_readlink, path, buf, n);
    memcpy(buf, target, n < sizeof target - 1 ? n : sizeof target - 1);
    return (ssize_t)(n < sizeof target - 1 ? n : sizeof target - 1);
}

char *realpath(const char *restrict path, char *restrict resolved)
{
    (void)resolved;
    if (is(path, DEVICE))
        return strdup(path);
    errno = ENOENT;
    return NULL;
}

FILE *fopen(const char *restrict path, const char *restrict mode)
{
    static const struct {
        const char *name, *text;
    } files[] = { { "/busnum", "1\n" },
                  { "/devnum", "5\n" },
                  { "/idVendor", "0000\n" },
                  { "/idProduct", "00a1\n" } };
    const char *name = strrchr(path, '/');
    char text[80];
    FILE *f;

    if (strncmp(path, SYSFS "/device/", sizeof SYSFS "/device/" - 1) != 0 || pair[0] == '\0') {
        const int fd = really_open(path, O_RDONLY | O_CLOEXEC, 0);
        return fd < 0 ? NULL : fdopen(fd, mode);
    }
    for (size_t i = 0; i < COUNT(files); i++)
        if (strcmp(name, files[i].name) == 0)
            return fmemopen((void *)(uintptr_t)files[i].text, strlen(files[i].text), "r");
    if (strcmp(name, "/serial") != 0 || serial_number == NULL) {
        errno = ENOENT;
        return NULL;
    }
    f = fmemopen(NULL, sizeof text, "w+");
    if (f != NULL) {
        fprintf(f, "%s\n", serial_number);
        rewind(f);
    }
    return f;
}

int ioctl(int fd, unsigned long request, ...)
{
    va_list args;
    void *arg;
    int *word;

    va_start(args, request);
    arg = va_arg(args, void *);
    va_end(args);
    word = arg;
    if (request != TIOCMGET && request != TIOCMSET && request != TIOCMBIS && request != TIOCMBIC)
        return (int)syscall(SYS_ioctl, fd, request, arg);
    if (no_lines) {
        errno = ENOTTY;
        return -1;
    }
    line_sets += request != TIOCMGET;
    if (request == TIOCMGET)
        *word = lines;
    else if (request == TIOCMSET)
        lines = *word;
    else if (request == TIOCMBIS)
        lines |= *word;
    else
        lines &= ~*word;
    return 0;
}

/* ---- tests ---- */

static int master = -1;
static struct sm_port_setup setup;
static struct sm_port_bytes bytes;
static char why[SM_LINK_TEXT_SIZE];

static int begin(void **state)
{
    (void)state;
    master = posix_openpt(O_RDWR | O_NOCTTY);
    if (master < 0 || grantpt(master) != 0 || unlockpt(master) != 0 ||
        ptsname_r(master, pair, sizeof pair) != 0)
        return 1;
    serial_number = "A1";
    lines = 0;
    no_lines = false;
    serial_opens = line_sets = 0;
    setup = (struct sm_port_setup){
        .port = DEVICE, .baud = 9600, .bits = 8, .stop = 1, .dtr = true, .rts = true
    };
    return 0;
}

static int end(void **state)
{
    (void)state;
    pair[0] = '\0';
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

static void libserialport_opens_it_and_its_gaps_are_closed(void **state)
{
    struct termios t;
    struct sm_link link;
    struct sm_port *p;

    (void)state;
    setup.flow = SM_FLOW_RTS_CTS;
    setup.baud = 19200;
    setup.dtr = false;
    p = open_well(&link);
    assert_int_equal(serial_opens, 2); /* to hold it, and libserialport's own */
    assert_int_equal(tcgetattr(sm_port_fd(p), &t), 0);
    assert_int_equal(t.c_cflag & CRTSCTS, CRTSCTS);
    assert_int_equal(t.c_iflag, INPCK | PARMRK);
    assert_int_equal(t.c_cc[VMIN], 1);
    assert_int_equal(cfgetospeed(&t), B19200);
    assert_int_equal(fcntl(sm_port_fd(p), F_GETFD), FD_CLOEXEC);
    assert_int_equal(fcntl(sm_port_fd(p), F_GETFL) & O_NONBLOCK, O_NONBLOCK);
    assert_string_equal(link.identity, "usb 0000:00a1 serial A1");
    assert_non_null(strstr(link.settings, "19200 8N1, RTS/CTS, DTR off, RTS "));
    assert_string_equal(link.why, "");
    sm_port_close(p);
}

static void modem_lines_are_as_the_setup_says(void **state)
{
    struct sm_link link;

    (void)state;
    for (unsigned i = 0; i < 4; i++) {
        setup.dtr = (i & 1) != 0;
        setup.rts = (i & 2) != 0;
        sm_port_close(open_well(&link));
        assert_int_equal(lines & (TIOCM_DTR | TIOCM_RTS),
                         (setup.dtr ? TIOCM_DTR : 0) | (setup.rts ? TIOCM_RTS : 0));
        assert_string_equal(link.why, "");
    }
}

static void a_rate_without_a_name_is_set_and_read_back(void **state)
{
    struct sm_link link;

    (void)state;
    setup.baud = 31250;
    sm_port_close(open_well(&link));
    assert_string_equal(link.settings, "31250 8N1, no flow control, DTR on, RTS on");
    assert_string_equal(link.why, "");
}

static void every_byte_passes_unchanged(void **state)
{
    unsigned char all[256];
    struct sm_link link;
    struct sm_port *p = open_well(&link);
    size_t got = 0;

    (void)state;
    for (size_t i = 0; i < sizeof all; i++)
        all[i] = (unsigned char)i;
    assert_int_equal(write(master, all, sizeof all), sizeof all);
    while (got < sizeof all) {
        struct pollfd f = { .fd = sm_port_fd(p), .events = POLLIN };
        assert_int_equal(poll(&f, 1, 5000), 1);
        if (sm_port_read(p, &bytes, why) != SM_PORT_BYTES)
            fail_msg("after %zu bytes: %s", got, why);
        assert_int_equal(bytes.n_bad, 0);
        for (size_t i = 0; i < bytes.n; i++, got++)
            assert_int_equal(bytes.bytes[i], all[got]);
    }
    assert_int_equal(sm_port_write(p, "R\r\n", 3, why), SM_OK);
    assert_int_equal(read(master, all, sizeof all), 3);
    sm_port_close(p);
}

static void a_second_opening_says_in_use(void **state)
{
    struct sm_link link, second;
    struct sm_port *p = open_well(&link), *none = NULL;

    (void)state;
    assert_int_equal(sm_port_open(sm_door_system(), &setup, "", &none, &second), SM_EBUSY);
    assert_non_null(strstr(second.why, "is in use by another program"));
    sm_port_close(p);
}

static void another_adapter_is_refused(void **state)
{
    struct sm_port *none = NULL;
    struct sm_link link;

    (void)state;
    serial_number = "B2\x1b[1m"; /* an adapter may say anything */
    assert_int_equal(
        sm_port_open(sm_door_system(), &setup, "usb 0000:00a1 serial A1", &none, &link), SM_EINVAL);
    assert_string_equal(link.identity, "usb 0000:00a1 serial B2\\x1b[1m");
    assert_int_equal(link.state, SM_LINK_REFUSED);
    serial_number = NULL;
    sm_port_close(open_well(&link));
    assert_string_equal(link.identity, "usb 0000:00a1");
}

static void a_port_without_modem_lines_is_opened_plainly(void **state)
{
    struct sm_link link;

    (void)state;
    no_lines = true;
    sm_port_close(open_well(&link));
    assert_string_equal(link.settings, "9600 8N1, no flow control");
    assert_int_equal(line_sets, 0);
}

static void a_pulled_plug_is_lost(void **state)
{
    struct sm_link link;
    struct sm_port *p = open_well(&link), *none = NULL;

    (void)state;
    close(master);
    master = -1;
    assert_int_equal(sm_port_read(p, &bytes, why), SM_PORT_LOST);
    sm_port_close(p);
    pair[0] = '\0';
    assert_int_equal(sm_port_open(sm_door_system(), &setup, "", &none, &link), SM_EIO);
    assert_non_null(strstr(link.why, "is not there: is the adapter plugged in?"));
}

int main(void)
{
#define SERIAL_TEST(f) cmocka_unit_test_setup_teardown(f, begin, end)
    const struct CMUnitTest tests[] = {
        SERIAL_TEST(libserialport_opens_it_and_its_gaps_are_closed),
        SERIAL_TEST(modem_lines_are_as_the_setup_says),
        SERIAL_TEST(a_rate_without_a_name_is_set_and_read_back),
        SERIAL_TEST(every_byte_passes_unchanged),
        SERIAL_TEST(a_second_opening_says_in_use),
        SERIAL_TEST(another_adapter_is_refused),
        SERIAL_TEST(a_port_without_modem_lines_is_opened_plainly),
        SERIAL_TEST(a_pulled_plug_is_lost),
    };

    return cmocka_run_group_tests_name("port-serial", tests, NULL, NULL);
}
