/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_play.c: the bytes of a bench log on a pseudo-terminal, at the times at which they came. */
#include "replay_play.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <poll.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <termios.h>
#include <time.h>
#include <unistd.h>

#include "base/number.h"
#include "base/time.h"
#include "record/entry.h"
#include "record/verify.h"
#include "whole_file.h"

#define SPEED_MAX 1000.0
#define READER_MS 60000 /* so long without a reader is given up */

/* A pseudo-terminal that passes bytes as they are; the other end is kept open so that it stays. */
static int open_terminal(const char **ret_name, int *ret_other)
{
    struct termios raw;
    const int fd = posix_openpt(O_RDWR | O_NOCTTY | O_CLOEXEC | O_NONBLOCK);

    if (fd < 0 || grantpt(fd) != 0 || unlockpt(fd) != 0)
        return -1;
    *ret_name = ptsname(fd);
    if (*ret_name == NULL)
        return -1;
    *ret_other = open(*ret_name, O_RDWR | O_NOCTTY | O_CLOEXEC);
    if (*ret_other < 0 || tcgetattr(*ret_other, &raw) != 0)
        return -1;
    cfmakeraw(&raw);
    return tcsetattr(*ret_other, TCSANOW, &raw) == 0 ? fd : -1;
}

static int64_t clock_ns(void)
{
    struct timespec t;

    clock_gettime(CLOCK_MONOTONIC, &t);
    return (int64_t)t.tv_sec * SM_NS_PER_S + t.tv_nsec;
}

/* What the reader sends (questions to the meter) is taken and forgotten, or it would pile up until
 * the reader's writes fail. */
static void drain(int fd)
{
    char taken[512];

    while (read(fd, taken, sizeof taken) > 0)
        continue;
}

/* Waits until the clock says t_ns: by the clock, so that errors do not add up. */
static void wait_until(int fd, int64_t t_ns)
{
    for (;;) {
        const int64_t left_ns = t_ns - clock_ns();
        struct pollfd p = { .fd = fd, .events = POLLIN };

        if (left_ns <= 0)
            return;
        if (left_ns < SM_NS_PER_MS) {
            const struct timespec t = { .tv_nsec = (long)left_ns };

            nanosleep(&t, NULL);
        } else if (poll(&p, 1,
                        left_ns / SM_NS_PER_MS < READER_MS ? (int)(left_ns / SM_NS_PER_MS)
                                                           : READER_MS) > 0) {
            drain(fd);
        }
    }
}

/* 0, or -1: nobody reads. */
static int write_whole(int fd, const unsigned char *bytes, size_t n)
{
    while (n > 0) {
        struct pollfd p = { .fd = fd, .events = POLLOUT };
        const ssize_t w = write(fd, bytes, n);

        drain(fd);
        if (w > 0) {
            bytes += w;
            n -= (size_t)w;
        } else if (w < 0 && errno == EAGAIN) {
            if (poll(&p, 1, READER_MS) == 0) {
                errno = ETIMEDOUT;
                return -1;
            }
        } else if (w < 0 && errno != EINTR) {
            return -1;
        }
    }
    return 0;
}

static int play(int fd, const char *text, size_t n, double speed)
{
    struct sm_entry_store store;
    struct sm_entry *e = calloc(1, sizeof *e);
    int64_t first_t_ns = -1, begun_ns = 0;
    int result = e == NULL ? 2 : 0;

    sm_entry_store_init(&store);
    while (result == 0 && n > 0) {
        const char *end = memchr(text, '\n', n);
        const size_t line = end == NULL ? n : (size_t)(end - text);
        char why[SM_REASON_SIZE];

        if (sm_entry_read(text, line, &store, e, why) == SM_OK) {
            if (e->kind == SM_ENTRY_INPUT && e->input.kind == SM_INPUT_BYTES) {
                if (first_t_ns < 0) {
                    first_t_ns = e->t_ns;
                    begun_ns = clock_ns();
                }
                wait_until(fd,
                           begun_ns + (int64_t)fmin((double)(e->t_ns - first_t_ns) / speed, 1e18));
                if (write_whole(fd, e->input.chunk.bytes, e->input.chunk.n) != 0) {
                    fprintf(stderr, "stillmark-replay: play: %s\n",
                            errno == ETIMEDOUT ? "nobody has read for a minute" : strerror(errno));
                    result = 2;
                }
            }
            json_decref(e->json);
        }
        text += end == NULL ? line : line + 1;
        n -= end == NULL ? line : line + 1;
    }
    sm_entry_store_finish(&store);
    free(e);
    return result;
}

int sm_replay_play(int argc, char **argv)
{
    const char *log = NULL, *name;
    double speed = 1;
    struct sm_whole_file f;
    struct sm_verify v;
    int fd, other = -1, err, result;

    for (int i = 0; i < argc; i++) {
        if (strcmp(argv[i], "--speed") == 0 && i + 1 < argc) {
            i++;
            if (sm_number_parse(argv[i], strlen(argv[i]), &speed) != SM_OK || !(speed > 0) ||
                speed > SPEED_MAX) {
                fprintf(stderr,
                        "stillmark-replay: play: --speed: expected a number over 0 and up to "
                        "1000\n");
                return 2;
            }
        } else if (log == NULL && argv[i][0] != '-') {
            log = argv[i];
        } else {
            fprintf(stderr, "stillmark-replay: play LOG [--speed N]\n");
            return 2;
        }
    }
    if (log == NULL) {
        fprintf(stderr, "stillmark-replay: play LOG [--speed N]\n");
        return 2;
    }
    err = sm_whole_file_open(log, &f);
    if (err != 0) {
        fprintf(stderr, "stillmark-replay: %s: %s\n", log, strerror(-err));
        return 2;
    }
    fd = open_terminal(&name, &other);
    if (fd < 0) {
        fprintf(stderr, "stillmark-replay: play: no pseudo-terminal: %s\n", strerror(errno));
        sm_whole_file_close(&f);
        return 2;
    }
    printf("%s\n", name);
    fflush(stdout);
    sm_verify(f.text, f.n, NULL, &v);
    if (!v.good)
        fprintf(stderr, "stillmark-replay: play: %s does not verify: played up to entry %lld\n",
                log, (long long)v.last_stamp_n);
    wait_until(fd, clock_ns() + 2 * SM_NS_PER_S); /* time for a reader to open it */
    result = play(fd, f.text, v.stamped_bytes, speed);
    wait_until(fd, clock_ns() + SM_NS_PER_S / 2); /* time for the last bytes to be read */
    close(other);
    close(fd);
    sm_whole_file_close(&f);
    return result;
}
