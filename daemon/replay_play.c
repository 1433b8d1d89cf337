/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay_play.c: the bytes of a bench log on a pseudo-terminal, at the times at which they came. */
#include "replay_play.h"

#include <errno.h>
#include <fcntl.h>
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

/* A pseudo-terminal that passes bytes as they are; the other end is kept open so that it stays. */
static int open_terminal(const char **ret_name, int *ret_other)
{
    struct termios raw;
    const int fd = posix_openpt(O_RDWR | O_NOCTTY | O_CLOEXEC);

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

static void wait_ns(double ns)
{
    struct timespec t;

    if (!(ns > 0))
        return;
    t.tv_sec = (time_t)(ns / 1e9);
    t.tv_nsec = (long)(ns - 1e9 * (double)t.tv_sec);
    while (nanosleep(&t, &t) != 0 && errno == EINTR)
        continue;
}

static int write_whole(int fd, const unsigned char *bytes, size_t n)
{
    while (n > 0) {
        const ssize_t w = write(fd, bytes, n);

        if (w < 0 && errno != EINTR)
            return -1;
        if (w > 0) {
            bytes += w;
            n -= (size_t)w;
        }
    }
    return 0;
}

static int play(int fd, const char *text, size_t n, double speed)
{
    struct sm_entry_store store;
    struct sm_entry *e = calloc(1, sizeof *e);
    int64_t before = -1;
    int result = e == NULL ? 2 : 0;

    sm_entry_store_init(&store);
    while (result == 0 && n > 0) {
        const char *end = memchr(text, '\n', n);
        const size_t line = end == NULL ? n : (size_t)(end - text);
        char why[SM_REASON_SIZE];

        if (sm_entry_read(text, line, &store, e, why) == SM_OK) {
            if (e->kind == SM_ENTRY_INPUT && e->input.kind == SM_INPUT_BYTES) {
                if (before >= 0)
                    wait_ns((double)(e->t_ns - before) / speed);
                before = e->t_ns;
                if (write_whole(fd, e->input.chunk.bytes, e->input.chunk.n) != 0) {
                    fprintf(stderr, "stillmark-replay: play: %s\n", strerror(errno));
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
    wait_ns(2e9); /* time for a reader to open it */
    sm_verify(f.text, f.n, NULL, &v);
    result = play(fd, f.text, v.stamped_bytes, speed);
    wait_ns(5e8); /* time for the last bytes to be read */
    close(other);
    close(fd);
    sm_whole_file_close(&f);
    return result;
}
