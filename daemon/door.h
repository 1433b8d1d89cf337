/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door.h: the one small table through which every system call of ports, log and clock goes, so that
 * a test can stand behind it (door_fail.h). It is handed down, never global.
 *
 * Each function returns what its system call returns, or -errno; errno itself is not looked at. A
 * call that was interrupted by a signal is made again behind the door. */
#ifndef SM_DAEMON_DOOR_H
#define SM_DAEMON_DOOR_H
#include <stddef.h>
#include <stdint.h>
#include <sys/stat.h>
#include <sys/types.h>
#include <termios.h>
#include <time.h>

#include "setup/setup.h"

struct sp_port; /* libserialport's */

struct sm_door {
    /* files and folders; open is always close-on-exec */
    int (*open)(const struct sm_door *d, const char *path, int flags, mode_t mode);
    int (*close)(const struct sm_door *d, int fd);
    ssize_t (*read)(const struct sm_door *d, int fd, void *buf, size_t n);
    ssize_t (*write)(const struct sm_door *d, int fd, const void *buf, size_t n);
    int (*fdatasync)(const struct sm_door *d, int fd);
    int (*fsync)(const struct sm_door *d, int fd);
    int (*flock)(const struct sm_door *d, int fd, int how);
    int (*fstat)(const struct sm_door *d, int fd, struct stat *ret_st);
    int (*stat)(const struct sm_door *d, const char *path, struct stat *ret_st);
    int (*mkdir)(const struct sm_door *d, const char *path, mode_t mode);
    int (*rename)(const struct sm_door *d, const char *from, const char *to);
    int (*unlink)(const struct sm_door *d, const char *path);
    /* Every name in the folder, "." and ".." apart, in no order. */
    int (*list)(const struct sm_door *d, const char *path,
                void (*each)(void *arg, const char *name), void *arg);
    /* As realpath(3), into ret_path[cap]; -ENAMETOOLONG where it does not fit. */
    int (*realpath)(const struct sm_door *d, const char *path, char *ret_path, size_t cap);
    int (*random)(const struct sm_door *d, void *buf, size_t n); /* all n bytes; 0 */

    /* ports */
    int (*tcgetattr)(const struct sm_door *d, int fd, struct termios *ret_t);
    int (*tcsetattr)(const struct sm_door *d, int fd, const struct termios *t); /* TCSANOW */
    int (*tcflush)(const struct sm_door *d, int fd);                            /* TCIOFLUSH */
    int (*ioctl)(const struct sm_door *d, int fd, unsigned long request, void *arg);
    int (*poll)(const struct sm_door *d, int fd, short events, short *ret_revents); /* no waiting */
    /* libserialport: opens for reading and writing (device already resolved); its handle and its
     * descriptor. serial_close gives both back. */
    int (*serial_open)(const struct sm_door *d, const char *device, struct sp_port **ret_port,
                       int *ret_fd);
    int (*serial_close)(const struct sm_door *d, struct sp_port *port);
    /* Baud, bits, parity, stop bits, flow control, RTS and DTR as the setup says. */
    int (*serial_setup)(const struct sm_door *d, struct sp_port *port,
                        const struct sm_port_setup *setup);
    /* What adapter is behind a device: "usb 0403:6001 serial A1B2" …; "" where nothing is known. */
    int (*serial_identity)(const struct sm_door *d, const char *device, char *ret_text, size_t cap);

    /* clock: CLOCK_REALTIME, CLOCK_BOOTTIME, CLOCK_MONOTONIC */
    int (*clock)(const struct sm_door *d, clockid_t which, struct timespec *ret_ts);
};

/* The real one. */
const struct sm_door *sm_door_system(void);

/* "No space left on device" … for what a door gave (negative). */
const char *sm_door_text(int result);
#endif
