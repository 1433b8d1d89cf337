/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fake_port_door.h: a door of ports that do not exist: adapters that are plugged in under any name,
 * held by others, stubborn about their settings, hung up in mid-line. It keeps count of what is
 * open, and notes any use of a descriptor that is not. */
#ifndef SM_TEST_FAKE_PORT_DOOR_H
#define SM_TEST_FAKE_PORT_DOOR_H
#include <stdbool.h>

#include "door.h"

#define FAKE_DEVICES 4
#define FAKE_FDS 16
#define FAKE_FIRST_FD 1000

struct fake_device {
    char path[64];     /* "/dev/ttyUSB0"; "" none */
    char identity[64]; /* of the adapter now behind it; "" none known */
    bool no_identity;  /* asking for it fails */
    int open_error;    /* 0: opens */
    struct stat st;
    /* held by somebody else */
    bool locked, exclusive;
    /* settings */
    struct termios t;
    tcflag_t stuck_iflag, stuck_cflag; /* these bits do not change */
    bool complains; /* setting fails with EINVAL when a stuck bit was to change, as the C library
                     * does for a pseudo-terminal's */
    unsigned baud;  /* 0: not set yet */
    bool stuck_baud;
    bool tells_baud; /* knows Linux's own termios */
    bool has_lines;  /* RTS, DTR */
    int lines;       /* TIOCM_… */
    bool stuck_lines;
    int serial_open_error, serial_setup_error; /* libserialport's; 0 fine */
    bool no_terminal;                          /* tcgetattr fails with ENOTTY */
    /* what comes down the line */
    const unsigned char *input;
    size_t n_input;
    const size_t *cut; /* bytes per read, one after the other; NULL: as many as asked for */
    size_t n_cut, at_cut;
    int when_empty;      /* read gives this: -EAGAIN (0 as well when not set), 0 by `ends` */
    bool ends;           /* read gives 0 when empty */
    short revents_empty; /* poll then */
    /* what goes up */
    int write_error;   /* 0: takes */
    size_t write_room; /* of one write; 0: any */
    char written[256];
    size_t n_written;
    unsigned flushed;
};

struct fake_port_door {
    struct sm_door door; /* hand this one down; first */
    struct fake_device device[FAKE_DEVICES];
    char link_from[64], link_to[64]; /* one symbolic link */
    char lock_file[64], lock_text[32];
    long running; /* the one process of /proc */
    /* what is open */
    struct {
        const char *what; /* NULL: closed */
        struct fake_device *dev;
        bool holds, serial;
    } fd[FAKE_FDS];
    unsigned opens, closes;
    const char *fault; /* what was wrong in how the door was used; NULL nothing */
};

void fake_port_door_init(struct fake_port_door *f);
/* An adapter of common kind, there and idle. */
struct fake_device *fake_plug(struct fake_port_door *f, const char *path, const char *identity);
void fake_unplug(struct fake_port_door *f, const char *path);
/* Descriptors that are open now. */
unsigned fake_open_now(const struct fake_port_door *f);
#endif
