/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door_fail.c: a door that counts and fails. Each function asks `due` first and else goes through
 * to the door under it. */
#include "door_fail.h"

#include <errno.h>
#include <string.h>

static struct sm_door_fail *self(const struct sm_door *d)
{
    /* door is the first member, and the object itself is never const */
    return (struct sm_door_fail *)(uintptr_t)d;
}

bool sm_door_fail_due(struct sm_door_fail *f, enum sm_call c)
{
    unsigned at;

    atomic_fetch_add(&f->count[c], 1);
    if ((f->calls & SM_CALLS(c)) == 0)
        return false;
    at = atomic_fetch_add(&f->seen, 1) + 1;
    if (f->nth == 0 || at < f->nth || (at > f->nth && !f->for_good))
        return false;
    atomic_fetch_add(&f->failed, 1);
    return true;
}

#define DUE(call) sm_door_fail_due(self(d), call)
#define UNDER (self(d)->under)
#define ERROR (-self(d)->error)

static int fail_open(const struct sm_door *d, const char *path, int flags, mode_t mode)
{
    return DUE(SM_CALL_OPEN) ? ERROR : UNDER->open(UNDER, path, flags, mode);
}

/* The descriptor is given back all the same, as Linux does. */
static int fail_close(const struct sm_door *d, int fd)
{
    const bool due = DUE(SM_CALL_CLOSE);
    const int r = UNDER->close(UNDER, fd);

    return due ? ERROR : r;
}

static ssize_t fail_read(const struct sm_door *d, int fd, void *buf, size_t n)
{
    return DUE(SM_CALL_READ) ? ERROR : UNDER->read(UNDER, fd, buf, n);
}

static ssize_t fail_write(const struct sm_door *d, int fd, const void *buf, size_t n)
{
    const struct sm_door_fail *f = self(d);

    if (!DUE(SM_CALL_WRITE))
        return UNDER->write(UNDER, fd, buf, n);
    if (f->short_write && n >= 2)
        return UNDER->write(UNDER, fd, buf, n / 2);
    return ERROR;
}

static int fail_fdatasync(const struct sm_door *d, int fd)
{
    return DUE(SM_CALL_FDATASYNC) ? ERROR : UNDER->fdatasync(UNDER, fd);
}

static int fail_fsync(const struct sm_door *d, int fd)
{
    return DUE(SM_CALL_FSYNC) ? ERROR : UNDER->fsync(UNDER, fd);
}

static int fail_flock(const struct sm_door *d, int fd, int how)
{
    return DUE(SM_CALL_FLOCK) ? ERROR : UNDER->flock(UNDER, fd, how);
}

static int fail_fstat(const struct sm_door *d, int fd, struct stat *ret_st)
{
    return DUE(SM_CALL_FSTAT) ? ERROR : UNDER->fstat(UNDER, fd, ret_st);
}

static int fail_stat(const struct sm_door *d, const char *path, struct stat *ret_st)
{
    return DUE(SM_CALL_STAT) ? ERROR : UNDER->stat(UNDER, path, ret_st);
}

static int fail_mkdir(const struct sm_door *d, const char *path, mode_t mode)
{
    return DUE(SM_CALL_MKDIR) ? ERROR : UNDER->mkdir(UNDER, path, mode);
}

static int fail_rename(const struct sm_door *d, const char *from, const char *to)
{
    return DUE(SM_CALL_RENAME) ? ERROR : UNDER->rename(UNDER, from, to);
}

static int fail_unlink(const struct sm_door *d, const char *path)
{
    return DUE(SM_CALL_UNLINK) ? ERROR : UNDER->unlink(UNDER, path);
}

static int fail_list(const struct sm_door *d, const char *path,
                     void (*each)(void *arg, const char *name), void *arg)
{
    return DUE(SM_CALL_LIST) ? ERROR : UNDER->list(UNDER, path, each, arg);
}

static int fail_realpath(const struct sm_door *d, const char *path, char *ret_path, size_t cap)
{
    return DUE(SM_CALL_REALPATH) ? ERROR : UNDER->realpath(UNDER, path, ret_path, cap);
}

static int fail_random(const struct sm_door *d, void *buf, size_t n)
{
    return DUE(SM_CALL_RANDOM) ? ERROR : UNDER->random(UNDER, buf, n);
}

static int fail_tcgetattr(const struct sm_door *d, int fd, struct termios *ret_t)
{
    return DUE(SM_CALL_TCGETATTR) ? ERROR : UNDER->tcgetattr(UNDER, fd, ret_t);
}

static int fail_tcsetattr(const struct sm_door *d, int fd, const struct termios *t)
{
    return DUE(SM_CALL_TCSETATTR) ? ERROR : UNDER->tcsetattr(UNDER, fd, t);
}

static int fail_tcflush(const struct sm_door *d, int fd)
{
    return DUE(SM_CALL_TCFLUSH) ? ERROR : UNDER->tcflush(UNDER, fd);
}

static int fail_ioctl(const struct sm_door *d, int fd, unsigned long request, void *arg)
{
    return DUE(SM_CALL_IOCTL) ? ERROR : UNDER->ioctl(UNDER, fd, request, arg);
}

static int fail_poll(const struct sm_door *d, int fd, short events, short *ret_revents)
{
    return DUE(SM_CALL_POLL) ? ERROR : UNDER->poll(UNDER, fd, events, ret_revents);
}

static int fail_serial_open(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                            int *ret_fd)
{
    return DUE(SM_CALL_SERIAL_OPEN) ? ERROR : UNDER->serial_open(UNDER, device, ret_port, ret_fd);
}

static int fail_serial_close(const struct sm_door *d, struct sp_port *port)
{
    const bool due = DUE(SM_CALL_SERIAL_CLOSE);
    const int r = UNDER->serial_close(UNDER, port);

    return due ? ERROR : r;
}

static int fail_serial_setup(const struct sm_door *d, struct sp_port *port,
                             const struct sm_port_setup *setup)
{
    return DUE(SM_CALL_SERIAL_SETUP) ? ERROR : UNDER->serial_setup(UNDER, port, setup);
}

static int fail_serial_identity(const struct sm_door *d, const char *device, char *ret_text,
                                size_t cap)
{
    return DUE(SM_CALL_SERIAL_IDENTITY) ? ERROR
                                        : UNDER->serial_identity(UNDER, device, ret_text, cap);
}

static int fail_clock(const struct sm_door *d, clockid_t which, struct timespec *ret_ts)
{
    return DUE(SM_CALL_CLOCK) ? ERROR : UNDER->clock(UNDER, which, ret_ts);
}

void sm_door_fail_init(struct sm_door_fail *f, const struct sm_door *under)
{
    memset(f, 0, sizeof *f);
    f->under = under;
    f->error = EIO;
    f->door = (struct sm_door){
        .open = fail_open,
        .close = fail_close,
        .read = fail_read,
        .write = fail_write,
        .fdatasync = fail_fdatasync,
        .fsync = fail_fsync,
        .flock = fail_flock,
        .fstat = fail_fstat,
        .stat = fail_stat,
        .mkdir = fail_mkdir,
        .rename = fail_rename,
        .unlink = fail_unlink,
        .list = fail_list,
        .realpath = fail_realpath,
        .random = fail_random,
        .tcgetattr = fail_tcgetattr,
        .tcsetattr = fail_tcsetattr,
        .tcflush = fail_tcflush,
        .ioctl = fail_ioctl,
        .poll = fail_poll,
        .serial_open = fail_serial_open,
        .serial_close = fail_serial_close,
        .serial_setup = fail_serial_setup,
        .serial_identity = fail_serial_identity,
        .clock = fail_clock,
    };
}

void sm_door_fail_plan(struct sm_door_fail *f, uint32_t calls, unsigned nth, bool for_good,
                       int error, bool short_write)
{
    f->calls = calls;
    f->nth = nth;
    f->for_good = for_good;
    f->error = error;
    f->short_write = short_write;
    atomic_store(&f->seen, 0);
    atomic_store(&f->failed, 0);
    for (size_t i = 0; i < SM_CALL_COUNT; i++)
        atomic_store(&f->count[i], 0);
}

void sm_door_fail_heal(struct sm_door_fail *f)
{
    f->nth = 0;
}

const char *sm_call_name(enum sm_call c)
{
    static const char *const name[SM_CALL_COUNT] = {
        [SM_CALL_OPEN] = "open",
        [SM_CALL_CLOSE] = "close",
        [SM_CALL_READ] = "read",
        [SM_CALL_WRITE] = "write",
        [SM_CALL_FDATASYNC] = "fdatasync",
        [SM_CALL_FSYNC] = "fsync",
        [SM_CALL_FLOCK] = "flock",
        [SM_CALL_FSTAT] = "fstat",
        [SM_CALL_STAT] = "stat",
        [SM_CALL_MKDIR] = "mkdir",
        [SM_CALL_RENAME] = "rename",
        [SM_CALL_UNLINK] = "unlink",
        [SM_CALL_LIST] = "list",
        [SM_CALL_REALPATH] = "realpath",
        [SM_CALL_RANDOM] = "random",
        [SM_CALL_TCGETATTR] = "tcgetattr",
        [SM_CALL_TCSETATTR] = "tcsetattr",
        [SM_CALL_TCFLUSH] = "tcflush",
        [SM_CALL_IOCTL] = "ioctl",
        [SM_CALL_POLL] = "poll",
        [SM_CALL_SERIAL_OPEN] = "serial_open",
        [SM_CALL_SERIAL_CLOSE] = "serial_close",
        [SM_CALL_SERIAL_SETUP] = "serial_setup",
        [SM_CALL_SERIAL_IDENTITY] = "serial_identity",
        [SM_CALL_CLOCK] = "clock",
    };

    return (unsigned)c < SM_CALL_COUNT ? name[c] : "?";
}
