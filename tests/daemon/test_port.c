/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_port.c: opening a port and keeping it, behind a door of adapters that do not exist. */
#include "check.h"

#include <errno.h>
#include <poll.h>
#include <stdio.h>
#include <string.h>
#include <sys/ioctl.h>

#include "door_fail.h"
#include "fake_port_door.h"
#include "port.h"
#include "record/entry.h"

#define USB0 "/dev/ttyUSB0"
#define USB1 "/dev/ttyUSB1"
#define BY_ID "/dev/serial/by-id/usb-invented_A1"
#define ADAPTER_A "usb 0000:0001 serial A1"
#define ADAPTER_B "usb 0000:0001 serial B2"

static struct fake_port_door fake;

static struct sm_port_setup setup_of(const char *port)
{
    struct sm_port_setup s = { .baud = 9600, .bits = 8, .stop = 1, .dtr = true, .rts = true };

    snprintf(s.port, sizeof s.port, "%s", port);
    return s;
}

static int begin(void **state)
{
    (void)state;
    fake_port_door_init(&fake);
    return 0;
}

/* Whatever the test did: nothing is open any more, and the door was used as doors are. */
static int end(void **state)
{
    (void)state;
    if (fake.fault != NULL)
        print_error("%s\n", fake.fault);
    if (fake_open_now(&fake) != 0)
        print_error("%u descriptors still open\n", fake_open_now(&fake));
    return fake.fault != NULL || fake_open_now(&fake) != 0 || fake.opens != fake.closes;
}

static void check_text(const char *what, const char *got, const char *part)
{
    if (strstr(got, part) == NULL)
        fail_msg("%s: \"%s\" does not say \"%s\"", what, got, part);
}

static struct sm_port *open_well(const struct sm_port_setup *s, const char *known,
                                 struct sm_link *ret_link)
{
    struct sm_port *p = NULL;
    const enum sm_status got = sm_port_open(&fake.door, s, known, &p, ret_link);

    if (got != SM_OK || p == NULL)
        fail_msg("%s: status %d: %s", s->port, got, ret_link->why);
    assert_int_equal(ret_link->state, SM_LINK_UP);
    return p;
}

static void refused(const char *what, const struct sm_port_setup *s, const char *known,
                    enum sm_status want, enum sm_link_state state, const char *why)
{
    struct sm_port *untouched = (struct sm_port *)(void *)&fake, *p = untouched;
    struct sm_link link;
    const enum sm_status got = sm_port_open(&fake.door, s, known, &p, &link);

    if (got != want || link.state != state)
        fail_msg("%s: status %d, want %d; link %s, want %s: %s", what, got, want,
                 sm_link_state_name(link.state), sm_link_state_name(state), link.why);
    assert_ptr_equal(p, untouched);
    check_text(what, link.why, why);
    check_text(what, link.why, s->port);
    if (fake_open_now(&fake) != 0)
        fail_msg("%s: %u descriptors still open", what, fake_open_now(&fake));
}

/* ---- why a port cannot be had ---- */

static void a_port_that_is_not_there_is_said(void **state)
{
    const struct sm_port_setup s = setup_of(USB0);

    (void)state;
    refused("no adapter", &s, "", SM_EIO, SM_LINK_LOST, "is not there: is the adapter plugged in?");
}

static void a_port_in_use_is_named_plainly(void **state)
{
    static const struct {
        const char *what;
        bool locked, exclusive;
        int open_error, serial_open_error;
    } cases[] = { { "locked by another program", true, false, 0, 0 },
                  { "marked exclusive", false, true, 0, 0 },
                  { "open says busy", false, false, EBUSY, 0 },
                  { "libserialport says busy", false, false, 0, EBUSY } };
    const struct sm_port_setup s = setup_of(USB0);

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);
        const struct termios before = d->t;
        d->locked = cases[i].locked;
        d->exclusive = cases[i].exclusive;
        d->open_error = cases[i].open_error;
        d->serial_open_error = cases[i].serial_open_error;
        refused(cases[i].what, &s, "", SM_EBUSY, SM_LINK_REFUSED, "is in use by another program");
        if (memcmp(&before, &d->t, sizeof before) != 0 || d->flushed > 0)
            fail_msg("%s: the other program's line was changed", cases[i].what);
        fake_unplug(&fake, USB0);
    }
}

static void a_lock_file_counts_while_its_process_runs(void **state)
{
    const struct sm_port_setup s = setup_of(USB0);
    struct sm_link link;

    (void)state;
    fake_plug(&fake, USB0, ADAPTER_A);
    snprintf(fake.lock_file, sizeof fake.lock_file, "/var/lock/LCK..ttyUSB0");
    snprintf(fake.lock_text, sizeof fake.lock_text, "      4711\n");
    fake.running = 4711;
    refused("lock file", &s, "", SM_EBUSY, SM_LINK_REFUSED, "close process 4711");
    fake.running = 12;
    sm_port_close(open_well(&s, "", &link)); /* left behind by a process that is gone */
    snprintf(fake.lock_text, sizeof fake.lock_text, "nonsense");
    sm_port_close(open_well(&s, "", &link));
}

static void no_access_names_the_group_and_the_owner(void **state)
{
    const struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);

    (void)state;
    d->open_error = EACCES;
    d->st.st_gid = 20;
    d->st.st_mode = S_IFCHR | 0660;
    refused("no access", &s, "", SM_EIO, SM_LINK_REFUSED, "add this user to the group dialout");
    refused("no access", &s, "", SM_EIO, SM_LINK_REFUSED, "user 0 and group 20, mode 0660");
}

static void what_is_no_serial_line_is_refused(void **state)
{
    const struct sm_port_setup s = setup_of("/home/notes.txt");

    (void)state;
    fake_plug(&fake, "/home/notes.txt", "")->no_terminal = true;
    refused("a file", &s, "", SM_EIO, SM_LINK_REFUSED, "is no serial line");
}

static void settings_that_a_port_cannot_have_at_all_are_refused(void **state)
{
    static const int errors[] = { EINVAL, EOPNOTSUPP };
    const struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);

    (void)state;
    for (size_t i = 0; i < COUNT(errors); i++) {
        d->serial_setup_error = errors[i];
        refused("settings", &s, "", SM_EINVAL, SM_LINK_REFUSED, "cannot have the settings");
    }
    d->serial_setup_error = EIO; /* pulled out in the middle of it */
    refused("unplugged meanwhile", &s, "", SM_EIO, SM_LINK_LOST, "does not take its settings");
}

/* ---- settings ---- */

static void settings_are_made_and_read_back(void **state)
{
    struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);
    struct sm_link link;
    struct sm_port *p;

    (void)state;
    s.baud = 1200;
    s.bits = 7;
    s.parity = SM_PARITY_EVEN;
    s.stop = 2;
    s.flow = SM_FLOW_RTS_CTS;
    s.dtr = false;
    d->t.c_iflag = IXON | IXANY | ICRNL | ISTRIP | IGNBRK | BRKINT; /* as somebody left it */
    d->t.c_lflag = ICANON | ECHO | ISIG;
    d->t.c_oflag = OPOST;
    p = open_well(&s, "", &link);
    assert_int_equal(d->t.c_cflag & CRTSCTS, CRTSCTS);
    assert_int_equal(d->t.c_cflag & CSIZE, CS7);
    assert_int_equal(d->t.c_cflag & (tcflag_t)(PARENB | PARODD | CMSPAR), PARENB);
    assert_int_equal(d->t.c_cflag & CSTOPB, CSTOPB);
    assert_int_equal(d->t.c_iflag, INPCK | PARMRK);
    assert_int_equal(d->t.c_lflag, 0);
    assert_int_equal(d->t.c_oflag, 0);
    assert_int_equal(d->t.c_cc[VMIN], 1);
    assert_int_equal(d->lines & TIOCM_DTR, 0);
    assert_int_equal(d->flushed, 1);
    assert_string_equal(link.settings, "1200 7E2, RTS/CTS, DTR off, RTS on");
    assert_string_equal(link.why, "");
    assert_string_equal(link.device, USB0);
    assert_string_equal(link.identity, ADAPTER_A);
    sm_port_close(p);
}

static void xon_xoff_is_on_only_when_asked_for(void **state)
{
    struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);
    struct sm_link link;

    (void)state;
    s.flow = SM_FLOW_XON_XOFF;
    sm_port_close(open_well(&s, "", &link));
    assert_int_equal(d->t.c_iflag, INPCK | PARMRK | IXON | IXOFF);
    assert_string_equal(link.settings, "9600 8N1, XON/XOFF, DTR on, RTS on");
}

static void rates_without_a_name_are_read_back_as_numbers(void **state)
{
    struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);
    struct sm_link link;

    (void)state;
    s.baud = 31250;
    sm_port_close(open_well(&s, "", &link));
    assert_string_equal(link.settings, "31250 8N1, no flow control, DTR on, RTS on");
    d->stuck_baud = true;
    d->baud = 31700; /* the nearest that this adapter can make: 1.4 % off */
    sm_port_close(open_well(&s, "", &link));
    assert_string_equal(link.why, "");
    d->baud = 33000; /* 5.6 % off */
    sm_port_close(open_well(&s, "", &link));
    assert_string_equal(link.why, "the port does not take: baud");
}

static void settings_that_do_not_take_are_told(void **state)
{
    static const struct {
        const char *what;
        tcflag_t stuck_iflag, stuck_cflag;
        bool stuck_baud, stuck_lines, complains;
        const char *why;
    } cases[] = {
        { "7 bits", 0, CSIZE, false, false, false, "the port does not take: bits" },
        { "parity", 0, PARENB, false, false, false, "the port does not take: parity" },
        { "both, and the C library complains", 0, CSIZE | PARENB, false, false, true,
          "the port does not take: bits, parity" },
        { "stop bits", 0, CSTOPB, false, false, false, "the port does not take: stop bits" },
        { "RTS/CTS", 0, CRTSCTS, false, false, false, "the port does not take: flow control" },
        { "IXON stays", IXON, 0, false, false, false, "the port does not take: flow control" },
        { "marks", PARMRK, 0, false, false, false,
          "the port does not take: marking of hurt bytes" },
        { "rate", 0, 0, true, false, false, "the port does not take: baud" },
        { "modem lines", 0, 0, false, true, false, "the port does not take: DTR" },
    };
    struct sm_port_setup s = setup_of(USB0);

    (void)state;
    s.bits = 7;
    s.parity = SM_PARITY_ODD;
    s.stop = 2;
    s.flow = SM_FLOW_RTS_CTS;
    s.dtr = false;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct fake_device *d = fake_plug(&fake, USB0, ADAPTER_A);
        struct sm_link link;
        d->t.c_iflag = IXON;
        d->t.c_cflag = CS8;
        d->baud = 300;
        d->stuck_iflag = cases[i].stuck_iflag;
        d->stuck_cflag = cases[i].stuck_cflag;
        d->stuck_baud = cases[i].stuck_baud;
        d->stuck_lines = cases[i].stuck_lines;
        d->complains = cases[i].complains;
        sm_port_close(open_well(&s, "", &link));
        if (strcmp(link.why, cases[i].why) != 0)
            fail_msg("%s: got \"%s\", want \"%s\"", cases[i].what, link.why, cases[i].why);
        check_text(cases[i].what, link.settings, cases[i].why);
        fake_unplug(&fake, USB0);
    }
}

static void a_port_libserialport_cannot_have_is_opened_plainly(void **state)
{
    static const int errors[] = { EINVAL, ENOTTY };
    struct sm_port_setup s = setup_of("/dev/ttyGS0");
    struct fake_device *d = fake_plug(&fake, "/dev/ttyGS0", "");
    struct sm_link link;

    (void)state;
    s.rts = false;
    d->tells_baud = false;
    for (size_t i = 0; i < COUNT(errors); i++) {
        d->serial_open_error = errors[i];
        d->lines = TIOCM_DTR | TIOCM_RTS;
        sm_port_close(open_well(&s, "", &link));
        assert_string_equal(link.settings, "9600 8N1, no flow control, DTR on, RTS off");
        assert_int_equal(cfgetospeed(&d->t), B9600);
    }
    s.baud = 31250; /* has no name, so this way cannot set it */
    sm_port_close(open_well(&s, "", &link));
    check_text("odd rate", link.why, "the port does not take: baud");
}

/* ---- the same adapter, and another ---- */

static void check_entry(const char *what, const struct sm_link *link, const char *want)
{
    const struct sm_input in = { .kind = SM_INPUT_LINK, .n = 7, .link = *link };
    char line[4096];
    struct sm_text t;
    const char *from;

    sm_text_init(&t, line, sizeof line);
    sm_entry_input(&t, &in);
    from = strstr(line, "\"k\":");
    if (from == NULL || strncmp(from, want, strlen(want)) != 0)
        fail_msg("%s: entry %s, want %s", what, line, want);
}

static void the_link_is_resolved_at_every_reopening(void **state)
{
    const struct sm_port_setup s = setup_of(BY_ID);
    struct sm_link link;

    (void)state;
    snprintf(fake.link_from, sizeof fake.link_from, BY_ID);
    snprintf(fake.link_to, sizeof fake.link_to, USB0);
    fake_plug(&fake, USB0, ADAPTER_A);
    sm_port_close(open_well(&s, "", &link));
    check_entry("first", &link,
                "\"k\":\"link\",\"state\":\"up\",\"port\":\"" BY_ID "\",\"device\":\"" USB0
                "\",\"identity\":\"" ADAPTER_A "\",\"settings\":\"9600 8N1, no flow control, DTR "
                "on, RTS on\"}");
    fake_unplug(&fake, USB0);
    refused("unplugged", &s, ADAPTER_A, SM_EIO, SM_LINK_LOST, "is not there");
    fake_plug(&fake, USB1, ADAPTER_A);
    snprintf(fake.link_to, sizeof fake.link_to, USB1);
    sm_port_close(open_well(&s, ADAPTER_A, &link));
    check_entry("same adapter, other device", &link,
                "\"k\":\"link\",\"state\":\"up\",\"port\":\"" BY_ID "\",\"device\":\"" USB1
                "\",\"identity\":\"" ADAPTER_A "\",");
}

static void another_adapter_under_the_old_name_is_refused(void **state)
{
    struct sm_port_setup s = setup_of(USB0);
    struct fake_device *d;
    struct sm_port *p = NULL;
    struct sm_link link;

    (void)state;
    d = fake_plug(&fake, USB0, ADAPTER_B);
    refused("another", &s, ADAPTER_A, SM_EINVAL, SM_LINK_REFUSED,
            "is another adapter now (" ADAPTER_B ", before " ADAPTER_A "): plug the old one back");
    assert_int_equal(d->flushed, 0);
    assert_int_equal(sm_port_open(&fake.door, &s, ADAPTER_A, &p, &link), SM_EINVAL);
    check_entry("another", &link,
                "\"k\":\"link\",\"state\":\"refused\",\"why\":\"" USB0
                " is another adapter now (" ADAPTER_B ", before " ADAPTER_A
                "): plug the old one back, or set other-adapter: allow\",\"port\":\"" USB0
                "\",\"device\":\"" USB0 "\",\"identity\":\"" ADAPTER_B "\"}");
    d->no_identity = true;
    refused("not known", &s, ADAPTER_A, SM_EINVAL, SM_LINK_REFUSED,
            "is another adapter now (not known, before " ADAPTER_A ")");
}

static void another_adapter_is_taken_where_the_setup_allows_it_and_said(void **state)
{
    struct sm_port_setup s = setup_of(USB0);
    struct sm_link link;

    (void)state;
    s.other_adapter = true;
    fake_plug(&fake, USB0, ADAPTER_B);
    sm_port_close(open_well(&s, ADAPTER_A, &link));
    check_entry("allowed", &link,
                "\"k\":\"link\",\"state\":\"up\",\"why\":\"another adapter than before (" ADAPTER_A
                "), which the setup allows\",\"port\":\"" USB0 "\",\"device\":\"" USB0
                "\",\"identity\":\"" ADAPTER_B "\",");
    sm_port_close(open_well(&s, ADAPTER_B, &link));
    assert_string_equal(link.why, "");
}

/* ---- failures of the door ---- */

/* A port's whole life; false: some call of it failed. */
static bool live(const struct sm_door *door, const struct sm_port_setup *s, const char *what)
{
    static const unsigned char line[] = "1.0 mV\r";
    static struct sm_port_bytes bytes;
    struct sm_port *p = NULL;
    struct sm_link link;
    char why[SM_LINK_TEXT_SIZE] = "";
    struct fake_device *d = &fake.device[0];
    bool well = true;

    d->input = line;
    d->n_input = sizeof line - 1;
    d->revents_empty = 0;
    if (sm_port_open(door, s, "", &p, &link) != SM_OK) {
        if (p != NULL || link.state == SM_LINK_UP || link.why[0] == '\0')
            fail_msg("%s: not opened, and no word why", what);
        return false;
    }
    for (int i = 0; i < 3; i++) {
        const enum sm_port_got got = sm_port_read(p, &bytes, why);
        well = well && got != SM_PORT_LOST && (i > 0 || got == SM_PORT_BYTES);
        if (got == SM_PORT_LOST && why[0] == '\0')
            fail_msg("%s: lost, and no word why", what);
    }
    if (sm_port_write(p, "R\r", 2, why) != SM_OK) {
        well = false;
        if (why[0] == '\0')
            fail_msg("%s: not sent, and no word why", what);
    }
    sm_port_close(p);
    return well;
}

static void a_failing_call_never_leaks_a_descriptor(void **state)
{
    static const char *const ports[] = { USB0, "/dev/pts/7" };
    static const int errors[] = { EIO, EINVAL, ENOMEM };
    struct sm_door_fail failing;
    unsigned failures = 0;

    (void)state;
    for (size_t k = 0; k < COUNT(ports) * COUNT(errors) * 2; k++) {
        const struct sm_port_setup s = setup_of(ports[k % 2]);
        const int error = errors[k / 2 % COUNT(errors)];
        const bool for_good = k >= 2 * COUNT(errors);
        bool reached = true;

        fake_port_door_init(&fake);
        fake_plug(&fake, ports[k % 2], ADAPTER_A);
        sm_door_fail_init(&failing, &fake.door);
        for (unsigned nth = 1; reached; nth++) {
            char what[96];
            snprintf(what, sizeof what, "%s: call %u fails%s with errno %d", ports[k % 2], nth,
                     for_good ? " for good" : "", error);
            sm_door_fail_plan(&failing, SM_CALLS_ANY, nth, for_good, error, true);
            (void)live(&failing.door, &s, what);
            reached = failing.failed > 0;
            failures += failing.failed > 0;
            if (fake.fault != NULL || fake_open_now(&fake) != 0 || fake.opens != fake.closes)
                fail_msg("%s: %u opened, %u closed; %s", what, fake.opens, fake.closes,
                         fake.fault != NULL ? fake.fault : "");
            sm_door_fail_heal(&failing);
            if (!live(&failing.door, &s, what))
                fail_msg("%s: not well afterwards", what);
            assert_true(nth < 100);
        }
    }
    assert_true(failures > 100); /* 12 rounds of some 15 calls */
}

int main(void)
{
#define PORT_TEST(f) cmocka_unit_test_setup_teardown(f, begin, end)
    const struct CMUnitTest tests[] = {
        PORT_TEST(a_port_that_is_not_there_is_said),
        PORT_TEST(a_port_in_use_is_named_plainly),
        PORT_TEST(a_lock_file_counts_while_its_process_runs),
        PORT_TEST(no_access_names_the_group_and_the_owner),
        PORT_TEST(what_is_no_serial_line_is_refused),
        PORT_TEST(settings_that_a_port_cannot_have_at_all_are_refused),
        PORT_TEST(settings_are_made_and_read_back),
        PORT_TEST(xon_xoff_is_on_only_when_asked_for),
        PORT_TEST(rates_without_a_name_are_read_back_as_numbers),
        PORT_TEST(settings_that_do_not_take_are_told),
        PORT_TEST(a_port_libserialport_cannot_have_is_opened_plainly),
        PORT_TEST(the_link_is_resolved_at_every_reopening),
        PORT_TEST(another_adapter_under_the_old_name_is_refused),
        PORT_TEST(another_adapter_is_taken_where_the_setup_allows_it_and_said),
        PORT_TEST(a_failing_call_never_leaks_a_descriptor),
    };

    return cmocka_run_group_tests_name("port", tests, NULL, NULL);
}
