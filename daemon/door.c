/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door.c: the real system calls behind the door. */
#include "door.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/file.h>
#include <sys/ioctl.h>
#include <sys/random.h>
#include <unistd.h>

#include "door_serial.h"

static int result(int r)
{
    return r < 0 ? -errno : r;
}

static int sys_open(const struct sm_door *d, const char *path, int flags, mode_t mode)
{
    int fd;

    (void)d;
    do
        fd = open(path, flags | O_CLOEXEC, mode);
    while (fd < 0 && errno == EINTR);
    return result(fd);
}

/* Not made again when interrupted: on Linux the descriptor is gone then. */
static int sys_close(const struct sm_door *d, int fd)
{
    (void)d;
    return result(close(fd));
}

static ssize_t sys_read(const struct sm_door *d, int fd, void *buf, size_t n)
{
    ssize_t got;

    (void)d;
    do
        got = read(fd, buf, n);
    while (got < 0 && errno == EINTR);
    return got < 0 ? -errno : got;
}

static ssize_t sys_write(const struct sm_door *d, int fd, const void *buf, size_t n)
{
    ssize_t put;

    (void)d;
    do
        put = write(fd, buf, n);
    while (put < 0 && errno == EINTR);
    return put < 0 ? -errno : put;
}

static int sys_fdatasync(const struct sm_door *d, int fd)
{
    (void)d;
    return result(fdatasync(fd));
}

static int sys_fsync(const struct sm_door *d, int fd)
{
    (void)d;
    return result(fsync(fd));
}

static int sys_flock(const struct sm_door *d, int fd, int how)
{
    int r;

    (void)d;
    do
        r = flock(fd, how);
    while (r < 0 && errno == EINTR);
    return result(r);
}

static int sys_fstat(const struct sm_door *d, int fd, struct stat *ret_st)
{
    (void)d;
    return result(fstat(fd, ret_st));
}

static int sys_stat(const struct sm_door *d, const char *path, struct stat *ret_st)
{
    (void)d;
    return result(stat(path, ret_st));
}

static int sys_mkdir(const struct sm_door *d, const char *path, mode_t mode)
{
    (void)d;
    return result(mkdir(path, mode));
}

static int sys_rename(const struct sm_door *d, const char *from, const char *to)
{
    (void)d;
    return result(rename(from, to));
}

static int sys_unlink(const struct sm_door *d, const char *path)
{
    (void)d;
    return result(unlink(path));
}

static int sys_list(const struct sm_door *d, const char *path,
                    void (*each)(void *arg, const char *name), void *arg)
{
    DIR *dir = opendir(path);
    struct dirent *e;
    int failed;

    (void)d;
    if (dir == NULL)
        return -errno;
    for (errno = 0; (e = readdir(dir)) != NULL; errno = 0)
        if (strcmp(e->d_name, ".") != 0 && strcmp(e->d_name, "..") != 0)
            each(arg, e->d_name);
    failed = errno;
    closedir(dir);
    return -failed;
}

static int sys_realpath(const struct sm_door *d, const char *path, char *ret_path, size_t cap)
{
    char *real = realpath(path, NULL);
    size_t n;

    (void)d;
    if (real == NULL)
        return -errno;
    n = strlen(real);
    if (n < cap)
        memcpy(ret_path, real, n + 1);
    free(real);
    return n < cap ? 0 : -ENAMETOOLONG;
}

static int sys_random(const struct sm_door *d, void *buf, size_t n)
{
    unsigned char *at = buf;

    (void)d;
    while (n > 0) {
        const ssize_t got = getrandom(at, n, 0);
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            return -errno;
        at += got;
        n -= (size_t)got;
    }
    return 0;
}

static int sys_tcgetattr(const struct sm_door *d, int fd, struct termios *ret_t)
{
    (void)d;
    return result(tcgetattr(fd, ret_t));
}

static int sys_tcsetattr(const struct sm_door *d, int fd, const struct termios *t)
{
    (void)d;
    return result(tcsetattr(fd, TCSANOW, t));
}

static int sys_tcflush(const struct sm_door *d, int fd)
{
    (void)d;
    return result(tcflush(fd, TCIOFLUSH));
}

static int sys_ioctl(const struct sm_door *d, int fd, unsigned long request, void *arg)
{
    (void)d;
    return result(ioctl(fd, request, arg));
}

static int sys_poll(const struct sm_door *d, int fd, short events, short *ret_revents)
{
    struct pollfd p = { .fd = fd, .events = events };
    int r;

    (void)d;
    do
        r = poll(&p, 1, 0);
    while (r < 0 && errno == EINTR);
    if (r < 0)
        return -errno;
    *ret_revents = p.revents;
    return r;
}

static int sys_clock(const struct sm_door *d, clockid_t which, struct timespec *ret_ts)
{
    (void)d;
    return result(clock_gettime(which, ret_ts));
}

const struct sm_door *sm_door_system(void)
{
    static const struct sm_door system_door = {
        .open = sys_open,
        .close = sys_close,
        .read = sys_read,
        .write = sys_write,
        .fdatasync = sys_fdatasync,
        .fsync = sys_fsync,
        .flock = sys_flock,
        .fstat = sys_fstat,
        .stat = sys_stat,
        .mkdir = sys_mkdir,
        .rename = sys_rename,
        .unlink = sys_unlink,
        .list = sys_list,
        .realpath = sys_realpath,
        .random = sys_random,
        .tcgetattr = sys_tcgetattr,
        .tcsetattr = sys_tcsetattr,
        .tcflush = sys_tcflush,
        .ioctl = sys_ioctl,
        .poll = sys_poll,
        .serial_open = sm_door_serial_open,
        .serial_close = sm_door_serial_close,
        .serial_setup = sm_door_serial_setup,
        .serial_identity = sm_door_serial_identity,
        .clock = sys_clock,
    };

    return &system_door;
}

const char *sm_door_text(int r)
{
    const char *text = strerrordesc_np(r < 0 ? -r : r);

    return text != NULL ? text : "unknown error";
}
