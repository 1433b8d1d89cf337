/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_port_bytes.c: what comes down a line and goes up it, behind a door of adapters that do not
 * exist: marks decoded however they are cut, the ways in which an adapter goes, questions. */
#include "check.h"

#include <errno.h>
#include <poll.h>
#include <stdio.h>
#include <string.h>

#include "fake_port_door.h"
#include "port.h"

#define SEEDS 300
#define STREAM 3000

static struct fake_port_door fake;
static struct fake_device *dev;
static struct sm_port *port;
static struct sm_port_bytes bytes;
static char why[SM_LINK_TEXT_SIZE];

static int begin(void **state)
{
    struct sm_port_setup s = { .baud = 9600, .bits = 8, .stop = 1, .dtr = true, .rts = true };
    struct sm_link link;

    (void)state;
    fake_port_door_init(&fake);
    dev = fake_plug(&fake, "/dev/ttyUSB0", "usb 0000:0001 serial A1");
    snprintf(s.port, sizeof s.port, "/dev/ttyUSB0");
    why[0] = '\0';
    return sm_port_open(&fake.door, &s, "", &port, &link) != SM_OK;
}

static int end(void **state)
{
    (void)state;
    sm_port_close(port);
    return fake.fault != NULL || fake_open_now(&fake) != 0;
}

static void send(const void *raw, size_t n)
{
    dev->input = raw;
    dev->n_input = n;
    dev->cut = NULL;
    dev->n_cut = dev->at_cut = 0;
}

/* One read that must give exactly these bytes, the one at `bad` hurt (-1: none). */
static void comes(const char *what, const void *raw, size_t n, const void *want, size_t want_n,
                  int bad)
{
    send(raw, n);
    if (sm_port_read(port, &bytes, why) != SM_PORT_BYTES)
        fail_msg("%s: no bytes: %s", what, why);
    if (bytes.n != want_n || memcmp(bytes.bytes, want, want_n) != 0)
        fail_msg("%s: got %zu bytes, want %zu", what, bytes.n, want_n);
    if (bytes.n_bad != (bad >= 0) || (bad >= 0 && bytes.bad[0] != bad))
        fail_msg("%s: %zu hurt, the first at %u; want %d", what, bytes.n_bad, bytes.bad[0], bad);
}

static void marks_are_decoded(void **state)
{
    (void)state;
    comes("plain", "12.3\r", 5, "12.3\r", 5, -1);
    comes("a true FF",
          "a\xff\xff"
          "b",
          4,
          "a\xff"
          "b",
          3, -1);
    comes("a hurt byte", "a\xff\0cd", 5, "acd", 3, 1);
    comes("a break", "ab\xff\0\0", 5, "ab\0", 3, 2);
    comes("a hurt FF", "\xff\0\xff", 3, "\xff", 1, 0);
    comes("NUL is a byte like any", "a\0b", 3, "a\0b", 3, -1);
    comes("no mark after all",
          "\xff"
          "a",
          2,
          "\xff"
          "a",
          2, -1);
}

/* xorshift64 (Marsaglia 2003) */
static uint64_t rnd(uint64_t *s)
{
    *s ^= *s << 13;
    *s ^= *s >> 7;
    *s ^= *s << 17;
    return *s;
}

struct stream {
    unsigned char byte[STREAM], raw[3 * STREAM];
    bool hurt[STREAM];
    size_t n_raw, cut[3 * STREAM];
};

/* Bytes as a line discipline with PARMRK would put them, rich in what is difficult. */
static void make_stream(struct stream *st, uint64_t *seed)
{
    static const unsigned char often[] = { 0, 0xff, 'a', '\r' };

    st->n_raw = 0;
    for (size_t i = 0; i < STREAM; i++) {
        const uint64_t r = rnd(seed);
        st->byte[i] = (r & 3) == 0 ? (unsigned char)(r >> 8) : often[r >> 8 & 3];
        st->hurt[i] = (r >> 20 & 3) == 0;
        if (st->hurt[i]) {
            st->raw[st->n_raw++] = 0xff;
            st->raw[st->n_raw++] = 0;
        } else if (st->byte[i] == 0xff) {
            st->raw[st->n_raw++] = 0xff;
        }
        st->raw[st->n_raw++] = st->byte[i];
    }
    for (size_t i = 0; i < COUNT(st->cut); i++)
        st->cut[i] = 1 + rnd(seed) % (1 + rnd(seed) % 60);
}

static void marks_may_be_cut_anywhere(void **state)
{
    static struct stream st;

    (void)state;
    for (unsigned seed = 1; seed <= SEEDS; seed++) {
        uint64_t s = UINT64_C(0x9e3779b97f4a7c15) * seed;
        size_t got = 0;

        make_stream(&st, &s);
        send(st.raw, st.n_raw);
        dev->cut = st.cut;
        dev->n_cut = COUNT(st.cut);
        while (dev->n_input > 0) {
            size_t b = 0;
            if (sm_port_read(port, &bytes, why) != SM_PORT_BYTES)
                continue; /* a cut within a mark */
            for (size_t i = 0; i < bytes.n; i++, got++) {
                const bool hurt = b < bytes.n_bad && bytes.bad[b] == i;
                b += hurt;
                if (got >= STREAM || bytes.bytes[i] != st.byte[got] || hurt != st.hurt[got])
                    fail_msg("seed %u, byte %zu: got %02x%s, want %02x%s", seed, got,
                             bytes.bytes[i], hurt ? " hurt" : "", st.byte[got % STREAM],
                             st.hurt[got % STREAM] ? " hurt" : "");
            }
            if (b != bytes.n_bad)
                fail_msg("seed %u: %zu hurt bytes named, %zu found", seed, bytes.n_bad, b);
        }
        if (got != STREAM)
            fail_msg("seed %u: %zu bytes, want %u", seed, got, STREAM);
    }
}

static void a_full_read_fits_whatever_it_holds(void **state)
{
    static unsigned char raw[3 * SM_BYTES_MAX];
    size_t got = 0;

    (void)state;
    memset(raw, 'x', sizeof raw);
    comes("half a mark", "a\xff", 2, "a", 1, -1);
    send(raw, sizeof raw); /* "no mark after all" and then as much as can come */
    while (dev->n_input > 0) {
        assert_int_equal(sm_port_read(port, &bytes, why), SM_PORT_BYTES);
        assert_true(bytes.n <= SM_BYTES_MAX);
        if (got == 0)
            assert_int_equal(bytes.bytes[0], 0xff);
        got += bytes.n;
    }
    assert_int_equal(got, sizeof raw + 1);
}

static void a_line_that_does_not_mark_is_taken_as_it_is(void **state)
{
    struct sm_port_setup s = { .baud = 9600, .bits = 8, .stop = 1, .dtr = true, .rts = true };
    struct sm_link link;

    (void)state;
    sm_port_close(port);
    dev->stuck_iflag = PARMRK;
    dev->t.c_iflag = 0;
    snprintf(s.port, sizeof s.port, "/dev/ttyUSB0");
    assert_int_equal(sm_port_open(&fake.door, &s, "", &port, &link), SM_OK);
    comes("unmarked", "\xff\0a\xff\xff", 5, "\xff\0a\xff\xff", 5, -1);
}

/* ---- gone ---- */

static void an_adapter_that_goes_is_lost(void **state)
{
    static const struct {
        const char *what;
        int read; /* of the empty line */
        short revents;
        bool lost;
        const char *why;
    } cases[] = {
        { "idle", -EAGAIN, 0, false, "" },
        { "nothing to read and nothing ready", 0, 0, false, "" },
        { "hung up", -EAGAIN, POLLHUP, true, "unplugged or the line hung up" },
        { "unplugged: end of file, and everything at once", 0, POLLIN | POLLERR | POLLHUP, true,
          "unplugged or the line hung up" },
        { "error", 0, POLLIN | POLLERR, true, "unplugged or the line hung up" },
        { "descriptor not good", -EAGAIN, POLLNVAL, true, "unplugged or the line hung up" },
        { "EIO", -EIO, 0, true, "unplugged or the line hung up" },
        { "ENXIO", -ENXIO, 0, true, "unplugged or the line hung up" },
        { "ENODEV", -ENODEV, 0, true, "unplugged or the line hung up" },
        { "anything else", -EINVAL, 0, true, "reading failed: Invalid argument" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        enum sm_port_got got;
        send("", 0);
        dev->ends = cases[i].read == 0;
        dev->when_empty = cases[i].read;
        dev->revents_empty = cases[i].revents;
        why[0] = '\0';
        got = sm_port_read(port, &bytes, why);
        if (got != (cases[i].lost ? SM_PORT_LOST : SM_PORT_NOTHING))
            fail_msg("%s: got %d: %s", cases[i].what, got, why);
        if ((why[0] != '\0') != cases[i].lost || strstr(why, cases[i].why) == NULL)
            fail_msg("%s: why \"%s\"", cases[i].what, why);
    }
}

static void end_of_file_again_and_again_is_lost_and_does_not_spin(void **state)
{
    unsigned reads = 0;

    (void)state;
    dev->ends = true;
    dev->revents_empty = POLLIN;
    while (sm_port_read(port, &bytes, why) == SM_PORT_NOTHING)
        if (++reads > 1000)
            fail_msg("still not lost after %u empty reads", reads);
    assert_non_null(strstr(why, "end of file again and again"));
}

static void end_of_file_now_and_then_is_not_lost(void **state)
{
    (void)state;
    dev->ends = true;
    for (unsigned i = 0; i < 1000; i++) {
        dev->revents_empty = i % 50 == 0 ? 0 : POLLIN;
        if (sm_port_read(port, &bytes, why) != SM_PORT_NOTHING)
            fail_msg("lost at %u: %s", i, why);
    }
}

static void what_came_before_it_went_is_given_first(void **state)
{
    (void)state;
    dev->ends = true;
    dev->revents_empty = POLLIN | POLLHUP | POLLERR;
    comes("the last bytes", "12.3", 4, "12.3", 4, -1);
    assert_int_equal(sm_port_read(port, &bytes, why), SM_PORT_LOST);
    assert_string_equal(why, "the adapter was unplugged or the line hung up");
}

/* ---- questions ---- */

static void a_question_goes_whole_or_the_port_is_lost(void **state)
{
    static const struct {
        const char *what;
        size_t room;
        int error;
        enum sm_status want;
        const char *why;
    } cases[] = {
        { "whole", 0, 0, SM_OK, "" },
        { "cut", 3, 0, SM_EIO, "does not take the question: check flow control and cable" },
        { "not now", 0, EAGAIN, SM_EIO, "does not take the question" },
        { "unplugged", 0, EIO, SM_EIO, "the question could not be sent: Input/output error" },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        enum sm_status got;
        dev->write_room = cases[i].room;
        dev->write_error = cases[i].error;
        dev->n_written = 0;
        why[0] = '\0';
        got = sm_port_write(port, "READ?\n", 6, why);
        if (got != cases[i].want || strstr(why, cases[i].why) == NULL ||
            (got == SM_OK) != (why[0] == '\0'))
            fail_msg("%s: status %d, \"%s\"", cases[i].what, got, why);
        if (got == SM_OK)
            assert_memory_equal(dev->written, "READ?\n", 6);
    }
}

int main(void)
{
#define BYTES_TEST(f) cmocka_unit_test_setup_teardown(f, begin, end)
    const struct CMUnitTest tests[] = {
        BYTES_TEST(marks_are_decoded),
        BYTES_TEST(marks_may_be_cut_anywhere),
        BYTES_TEST(a_full_read_fits_whatever_it_holds),
        BYTES_TEST(a_line_that_does_not_mark_is_taken_as_it_is),
        BYTES_TEST(an_adapter_that_goes_is_lost),
        BYTES_TEST(end_of_file_again_and_again_is_lost_and_does_not_spin),
        BYTES_TEST(end_of_file_now_and_then_is_not_lost),
        BYTES_TEST(what_came_before_it_went_is_given_first),
        BYTES_TEST(a_question_goes_whole_or_the_port_is_lost),
    };

    return cmocka_run_group_tests_name("port-bytes", tests, NULL, NULL);
}
