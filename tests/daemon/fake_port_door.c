/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fake_port_door.c: see fake_port_door.h. */
#include "fake_port_door.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <stdio.h>
#include <string.h>
#include <sys/ioctl.h>

/* Linux's answer to "all settings, the rate as a number": where that number lies in it. */
#define KERNEL_TERMIOS_SIZE 44
#define KERNEL_TERMIOS_OSPEED 40
#define GET_KERNEL_TERMIOS _IOC(_IOC_READ, 'T', 0x2a, KERNEL_TERMIOS_SIZE)

static struct fake_port_door *self(const struct sm_door *d)
{
    return (struct fake_port_door *)(uintptr_t)d;
}

static struct fake_device *find(struct fake_port_door *f, const char *path)
{
    for (size_t i = 0; i < FAKE_DEVICES; i++)
        if (f->device[i].path[0] != '\0' && strcmp(f->device[i].path, path) == 0)
            return &f->device[i];
    return NULL;
}

static int take_fd(struct fake_port_door *f, const char *what, struct fake_device *dev)
{
    for (int i = 0; i < FAKE_FDS; i++) {
        if (f->fd[i].what != NULL)
            continue;
        f->fd[i].what = what;
        f->fd[i].dev = dev;
        f->fd[i].holds = f->fd[i].serial = false;
        f->opens++;
        return FAKE_FIRST_FD + i;
    }
    return -EMFILE;
}

/* The device behind an open descriptor; a fault otherwise. */
static struct fake_device *device_of(struct fake_port_door *f, int fd)
{
    const int i = fd - FAKE_FIRST_FD;

    if (i < 0 || i >= FAKE_FDS || f->fd[i].what == NULL || f->fd[i].dev == NULL) {
        f->fault = "a descriptor that is not an open port was used";
        return NULL;
    }
    return f->fd[i].dev;
}

static int fake_open(const struct sm_door *d, const char *path, int flags, mode_t mode)
{
    struct fake_port_door *f = self(d);
    struct fake_device *dev = find(f, path);

    (void)mode;
    if (f->lock_file[0] != '\0' && strcmp(path, f->lock_file) == 0)
        return take_fd(f, "lock file", NULL);
    if (dev == NULL)
        return -ENOENT;
    if (dev->open_error != 0)
        return -dev->open_error;
    if ((flags & (O_NOCTTY | O_NONBLOCK)) != (O_NOCTTY | O_NONBLOCK))
        f->fault = "a port was opened so that it could become the controlling terminal or hang";
    return take_fd(f, "port", dev);
}

static int fake_close(const struct sm_door *d, int fd)
{
    struct fake_port_door *f = self(d);
    const int i = fd - FAKE_FIRST_FD;

    if (i < 0 || i >= FAKE_FDS || f->fd[i].what == NULL || f->fd[i].serial) {
        f->fault = "a descriptor was closed that was not open, or is libserialport's";
        return -EBADF;
    }
    f->fd[i].what = NULL;
    f->closes++;
    return 0;
}

static ssize_t fake_read(const struct sm_door *d, int fd, void *buf, size_t n)
{
    struct fake_port_door *f = self(d);
    const int i = fd - FAKE_FIRST_FD;
    struct fake_device *dev;

    if (i >= 0 && i < FAKE_FDS && f->fd[i].what != NULL && f->fd[i].dev == NULL) {
        const size_t have = strlen(f->lock_text);
        memcpy(buf, f->lock_text, have < n ? have : n);
        return (ssize_t)(have < n ? have : n);
    }
    dev = device_of(f, fd);
    if (dev == NULL)
        return -EBADF;
    if (dev->n_input == 0)
        return dev->ends ? 0 : dev->when_empty != 0 ? dev->when_empty : -EAGAIN;
    if (n > dev->n_input)
        n = dev->n_input;
    if (dev->at_cut < dev->n_cut && n > dev->cut[dev->at_cut])
        n = dev->cut[dev->at_cut];
    dev->at_cut++;
    memcpy(buf, dev->input, n);
    dev->input += n;
    dev->n_input -= n;
    return (ssize_t)n;
}

static ssize_t fake_write(const struct sm_door *d, int fd, const void *buf, size_t n)
{
    struct fake_device *dev = device_of(self(d), fd);

    if (dev == NULL)
        return -EBADF;
    if (dev->write_error != 0)
        return -dev->write_error;
    if (dev->write_room != 0 && n > dev->write_room)
        n = dev->write_room;
    if (n > sizeof dev->written - dev->n_written)
        n = sizeof dev->written - dev->n_written;
    memcpy(dev->written + dev->n_written, buf, n);
    dev->n_written += n;
    return (ssize_t)n;
}

static int fake_flock(const struct sm_door *d, int fd, int how)
{
    struct fake_port_door *f = self(d);
    struct fake_device *dev = device_of(f, fd);

    (void)how;
    if (dev == NULL)
        return -EBADF;
    for (int i = 0; i < FAKE_FDS; i++)
        if (f->fd[i].what != NULL && f->fd[i].dev == dev && f->fd[i].holds)
            return -EWOULDBLOCK;
    if (dev->locked)
        return -EWOULDBLOCK;
    f->fd[fd - FAKE_FIRST_FD].holds = true;
    return 0;
}

static int fake_stat(const struct sm_door *d, const char *path, struct stat *ret_st)
{
    struct fake_port_door *f = self(d);
    const struct fake_device *dev = find(f, path);
    char process[32];

    snprintf(process, sizeof process, "/proc/%ld", f->running);
    if (dev != NULL)
        *ret_st = dev->st;
    return dev != NULL || strcmp(path, process) == 0 ? 0 : -ENOENT;
}

static int fake_realpath(const struct sm_door *d, const char *path, char *ret_path, size_t cap)
{
    struct fake_port_door *f = self(d);

    if (f->link_from[0] != '\0' && strcmp(path, f->link_from) == 0)
        path = f->link_to;
    if (find(f, path) == NULL)
        return -ENOENT;
    if (strlen(path) >= cap)
        return -ENAMETOOLONG;
    memcpy(ret_path, path, strlen(path) + 1);
    return 0;
}

static int fake_tcgetattr(const struct sm_door *d, int fd, struct termios *ret_t)
{
    const struct fake_device *dev = device_of(self(d), fd);

    if (dev == NULL || dev->no_terminal)
        return dev == NULL ? -EBADF : -ENOTTY;
    *ret_t = dev->t;
    return 0;
}

static int fake_tcsetattr(const struct sm_door *d, int fd, const struct termios *t)
{
    struct fake_device *dev = device_of(self(d), fd);
    struct termios now;

    if (dev == NULL)
        return -EBADF;
    now = *t;
    now.c_iflag = (t->c_iflag & ~dev->stuck_iflag) | (dev->t.c_iflag & dev->stuck_iflag);
    now.c_cflag = (t->c_cflag & ~dev->stuck_cflag) | (dev->t.c_cflag & dev->stuck_cflag);
    if (dev->stuck_baud) {
        cfsetispeed(&now, cfgetispeed(&dev->t));
        cfsetospeed(&now, cfgetospeed(&dev->t));
    }
    dev->t = now;
    return dev->complains && (now.c_iflag != t->c_iflag || now.c_cflag != t->c_cflag) ? -EINVAL : 0;
}

static int fake_tcflush(const struct sm_door *d, int fd)
{
    struct fake_device *dev = device_of(self(d), fd);

    if (dev == NULL)
        return -EBADF;
    dev->flushed++;
    return 0;
}

static int fake_ioctl(const struct sm_door *d, int fd, unsigned long request, void *arg)
{
    struct fake_port_door *f = self(d);
    struct fake_device *dev = device_of(f, fd);

    if (dev == NULL)
        return -EBADF;
    if (request == GET_KERNEL_TERMIOS && dev->tells_baud) {
        memcpy((char *)arg + KERNEL_TERMIOS_OSPEED, &dev->baud, sizeof dev->baud);
        return 0;
    }
    if (request == TIOCGEXCL) {
        *(int *)arg = dev->exclusive;
        return 0;
    }
    if (request == TIOCEXCL || request == TIOCNXCL)
        return 0;
    if (!dev->has_lines)
        return -ENOTTY;
    if (request == TIOCMGET)
        *(int *)arg = dev->lines;
    else if (request == TIOCMBIS && !dev->stuck_lines)
        dev->lines |= *(int *)arg;
    else if (request == TIOCMBIC && !dev->stuck_lines)
        dev->lines &= ~*(int *)arg;
    else if (request != TIOCMBIS && request != TIOCMBIC)
        return -ENOTTY;
    return 0;
}

static int fake_poll(const struct sm_door *d, int fd, short events, short *ret_revents)
{
    const struct fake_device *dev = device_of(self(d), fd);

    if (dev == NULL)
        return -EBADF;
    *ret_revents = dev->n_input > 0 ? events : dev->revents_empty;
    return *ret_revents != 0;
}

static int fake_serial_open(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                            int *ret_fd)
{
    struct fake_port_door *f = self(d);
    struct fake_device *dev = find(f, device);
    int fd;

    if (dev == NULL)
        return -ENOENT;
    if (dev->serial_open_error != 0)
        return -dev->serial_open_error;
    fd = take_fd(f, "serial port", dev);
    if (fd < 0)
        return fd;
    f->fd[fd - FAKE_FIRST_FD].serial = true;
    dev->lines |= TIOCM_DTR | TIOCM_RTS; /* it raises both */
    *ret_port = (struct sp_port *)(void *)&f->fd[fd - FAKE_FIRST_FD];
    *ret_fd = fd;
    return 0;
}

/* Which descriptor a handle stands for; -1 with a fault when none. */
static int serial_fd(struct fake_port_door *f, const struct sp_port *port)
{
    for (int i = 0; i < FAKE_FDS; i++)
        if ((const void *)port == (const void *)&f->fd[i] && f->fd[i].what != NULL &&
            f->fd[i].serial)
            return i;
    f->fault = "a handle that is not an open serial port was used";
    return -1;
}

static int fake_serial_close(const struct sm_door *d, struct sp_port *port)
{
    struct fake_port_door *f = self(d);
    const int i = serial_fd(f, port);

    if (i < 0)
        return -EBADF;
    f->fd[i].what = NULL;
    f->closes++;
    return 0;
}

/* With libserialport's known gaps: parity errors ignored and not marked, RTS/CTS not really set. */
static int fake_serial_setup(const struct sm_door *d, struct sp_port *port,
                             const struct sm_port_setup *setup)
{
    struct fake_port_door *f = self(d);
    const int i = serial_fd(f, port);
    struct fake_device *dev;

    if (i < 0)
        return -EBADF;
    dev = f->fd[i].dev;
    if (dev->serial_setup_error != 0)
        return -dev->serial_setup_error;
    if (!dev->stuck_baud)
        dev->baud = setup->baud;
    dev->t.c_iflag |= IGNPAR;
    dev->t.c_cc[VMIN] = 0;
    if (dev->stuck_lines)
        return 0;
    dev->lines = (setup->dtr ? TIOCM_DTR : 0) | (setup->rts ? TIOCM_RTS : 0);
    return 0;
}

static int fake_serial_identity(const struct sm_door *d, const char *device, char *ret_text,
                                size_t cap)
{
    const struct fake_device *dev = find(self(d), device);

    if (dev == NULL || dev->no_identity)
        return -ENOENT;
    snprintf(ret_text, cap, "%s", dev->identity);
    return 0;
}

void fake_port_door_init(struct fake_port_door *f)
{
    memset(f, 0, sizeof *f);
    f->door.open = fake_open;
    f->door.close = fake_close;
    f->door.read = fake_read;
    f->door.write = fake_write;
    f->door.flock = fake_flock;
    f->door.stat = fake_stat;
    f->door.realpath = fake_realpath;
    f->door.tcgetattr = fake_tcgetattr;
    f->door.tcsetattr = fake_tcsetattr;
    f->door.tcflush = fake_tcflush;
    f->door.ioctl = fake_ioctl;
    f->door.poll = fake_poll;
    f->door.serial_open = fake_serial_open;
    f->door.serial_close = fake_serial_close;
    f->door.serial_setup = fake_serial_setup;
    f->door.serial_identity = fake_serial_identity;
}

struct fake_device *fake_plug(struct fake_port_door *f, const char *path, const char *identity)
{
    for (size_t i = 0; i < FAKE_DEVICES; i++) {
        struct fake_device *dev = &f->device[i];
        if (dev->path[0] != '\0')
            continue;
        memset(dev, 0, sizeof *dev);
        snprintf(dev->path, sizeof dev->path, "%s", path);
        snprintf(dev->identity, sizeof dev->identity, "%s", identity);
        dev->tells_baud = dev->has_lines = strncmp(path, "/dev/tty", 8) == 0;
        return dev;
    }
    f->fault = "too many adapters";
    return &f->device[0];
}

void fake_unplug(struct fake_port_door *f, const char *path)
{
    struct fake_device *dev = find(f, path);

    if (dev != NULL)
        dev->path[0] = '\0';
}

unsigned fake_open_now(const struct fake_port_door *f)
{
    unsigned n = 0;

    for (size_t i = 0; i < FAKE_FDS; i++)
        n += f->fd[i].what != NULL;
    return n;
}
