/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_meter_adapter.c: a meter whose adapter is pulled out and comes back: under another device
 * name, or another adapter under the old one. The adapters are made up, behind the door; the bytes
 * come down a pseudo-terminal. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE /* ptsname_r */
#endif
#include "rig.h"

#include <errno.h>

#define USB0 "/dev/ttyUSB0"
#define USB1 "/dev/ttyUSB1"
#define ADAPTER_A "usb 0000:0001 serial A1"
#define ADAPTER_B "usb 0000:0001 serial B2"
#define GONE_S 30
#define HOUR_S 3600

/* The real door, but for one adapter. */
static struct {
    struct sm_door door;
    const struct rig *rig;
    const char *device, *identity; /* NULL: not plugged in */
    unsigned tries;                /* to find it */
} usb;

static int usb_realpath(const struct sm_door *d, const char *path, char *ret_path, size_t cap)
{
    (void)d;
    (void)path;
    usb.tries++;
    if (usb.device == NULL)
        return -ENOENT;
    snprintf(ret_path, cap, "%s", usb.device);
    return 0;
}

static int usb_open(const struct sm_door *d, const char *path, int flags, mode_t mode)
{
    char behind[64];

    if (usb.device != NULL && strcmp(path, usb.device) == 0) {
        assert_int_equal(ptsname_r(usb.rig->master, behind, sizeof behind), 0);
        path = behind;
    }
    return sm_door_system()->open(d, path, flags, mode);
}

static int usb_identity(const struct sm_door *d, const char *device, char *ret_text, size_t cap)
{
    (void)d;
    (void)device;
    snprintf(ret_text, cap, "%s", usb.identity);
    return 0;
}

static int usb_serial_open(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                           int *ret_fd)
{
    (void)d;
    (void)device;
    (void)ret_port;
    (void)ret_fd;
    return -EINVAL; /* as for a gadget port: the plain way serves */
}

static void plug(struct rig *r, const char *device, const char *identity)
{
    rig_plug(r);
    usb.device = device;
    usb.identity = identity;
}

/* As the loop does: the line is readable, and then it is gone. */
static void unplug(struct rig *r)
{
    rig_unplug(r);
    usb.device = NULL;
    assert_true(r->watched >= 0);
    sm_meter_readable(r->meter, &r->now);
    rig_settle(r);
    assert_int_equal(r->watched, -1);
}

static void begin(struct rig *r)
{
    rig_make(r, false);
    usb.door = *sm_door_system();
    usb.door.realpath = usb_realpath;
    usb.door.open = usb_open;
    usb.door.serial_identity = usb_identity;
    usb.door.serial_open = usb_serial_open;
    usb.rig = r;
    usb.device = USB0;
    usb.identity = ADAPTER_A;
    r->door.under = &usb.door;
    rig_start(r);
    assert_true(r->watched >= 0);
}

static void finish(struct rig *r, size_t files)
{
    rig_stop(r);
    rig_nothing_announced_is_lost(r, "adapters");
    assert_int_equal(rig_verify(r), files);
    rig_remove(r);
}

/* The link entries told, in their order: state, device and identity of each. */
static void check_links(const struct rig *r, const char *const want[], size_t n)
{
    const char *at = r->told;
    size_t i = 0;

    while ((at = strstr(at, "\"k\":\"link\",")) != NULL) {
        const int len = (int)strcspn(at, "\n");
        if (i == n)
            fail_msg("one link entry too many: %.*s", len, at);
        char *line = strndup(at, (size_t)len);
        if (strstr(line, want[i]) == NULL)
            fail_msg("link entry %zu: %s, want %s", i, line, want[i]);
        free(line);
        at += len;
        i++;
    }
    if (i != n)
        fail_msg("%zu link entries, want %zu", i, n);
}

static void the_same_adapter_is_taken_under_another_name_within_5_s(void **state)
{
    static const char *const want[] = { "\"state\":\"up\"",
                                        "the adapter was unplugged or the line hung up",
                                        "is not there: is the adapter plugged in?",
                                        "\"state\":\"up\"" };
    struct rig r;
    unsigned before;

    (void)state;
    begin(&r);
    rig_send(&r, "-0012.4 mV  24.8 C\r\n");
    unplug(&r);
    before = usb.tries;
    rig_pass(&r, GONE_S * SM_NS_PER_S);
    assert_true(usb.tries - before >= GONE_S / 2 - 1 && usb.tries - before <= GONE_S);
    plug(&r, USB1, ADAPTER_A);
    rig_pass(&r, 5 * SM_NS_PER_S);
    assert_true(r.watched >= 0);
    rig_send(&r, "-0012.4 mV  24.8 C\r\n");
    check_links(&r, want, COUNT(want));
    assert_int_equal(rig_count(r.told, "\"device\":\"" USB0 "\",\"identity\":\"" ADAPTER_A "\""),
                     2); /* up, and lost */
    assert_int_equal(rig_count(r.told, "\"device\":\"" USB1 "\",\"identity\":\"" ADAPTER_A "\""),
                     1);
    finish(&r, 1);
}

static void another_adapter_is_refused_for_ever_and_said_once(void **state)
{
    static const char *const want[] = { "\"state\":\"up\"",
                                        "the adapter was unplugged or the line hung up",
                                        "is another adapter now (" ADAPTER_B ", before " ADAPTER_A
                                        "): plug the old one back, or "
                                        "set other-adapter: allow",
                                        "is not there", "\"state\":\"up\"" };
    struct rig r;
    unsigned before;

    (void)state;
    begin(&r);
    unplug(&r);
    plug(&r, USB0, ADAPTER_B);
    before = usb.tries;
    rig_pass(&r, HOUR_S * SM_NS_PER_S);
    assert_int_equal(r.watched, -1);
    assert_true(usb.tries - before <= HOUR_S / 2 + 3);
    rig_unplug(&r);
    usb.device = NULL;
    rig_pass(&r, 3 * SM_NS_PER_S);
    plug(&r, USB0, ADAPTER_A);
    rig_pass(&r, 5 * SM_NS_PER_S);
    assert_true(r.watched >= 0);
    check_links(&r, want, COUNT(want));
    finish(&r, 1);
}

static void another_adapter_is_refused_after_a_restart_too(void **state)
{
    struct rig r;

    (void)state;
    begin(&r);
    rig_pass(&r, 2 * SM_NS_PER_S);
    rig_stop(&r);
    plug(&r, USB0, ADAPTER_B);
    rig_start(&r);
    rig_pass(&r, 5 * SM_NS_PER_S);
    assert_int_equal(r.watched, -1);
    assert_non_null(strstr(r.told, "is another adapter now (" ADAPTER_B ", before " ADAPTER_A));
    plug(&r, USB0, ADAPTER_A);
    rig_pass(&r, 5 * SM_NS_PER_S);
    assert_true(r.watched >= 0);
    finish(&r, 2);
}

static void another_adapter_is_taken_where_the_setup_allows_it(void **state)
{
    static const char *const want[] = { "\"identity\":\"" ADAPTER_A "\"",
                                        "the adapter was unplugged or the line hung up",
                                        "another adapter than before (" ADAPTER_A
                                        "), which the setup allows" };
    struct rig r;

    (void)state;
    begin(&r);
    r.setup->meter[0].port.other_adapter = true;
    unplug(&r);
    plug(&r, USB0, ADAPTER_B);
    rig_pass(&r, 5 * SM_NS_PER_S);
    assert_true(r.watched >= 0);
    check_links(&r, want, COUNT(want));
    assert_int_equal(rig_count(r.told, "\"identity\":\"" ADAPTER_B "\""), 1);
    finish(&r, 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_same_adapter_is_taken_under_another_name_within_5_s),
        cmocka_unit_test(another_adapter_is_refused_for_ever_and_said_once),
        cmocka_unit_test(another_adapter_is_refused_after_a_restart_too),
        cmocka_unit_test(another_adapter_is_taken_where_the_setup_allows_it),
    };

    return cmocka_run_group_tests_name("meter-adapter", tests, NULL, NULL);
}
