/* SPDX-License-Identifier: GPL-3.0-or-later */
/* door_fail.h: a door for tests that counts the calls and fails chosen ones, once or for good. Safe
 * from several threads as long as the plan is changed by one of them. */
#ifndef SM_DAEMON_DOOR_FAIL_H
#define SM_DAEMON_DOOR_FAIL_H
#include <stdatomic.h>
#include <stdbool.h>

#include "door.h"

enum sm_call {
    SM_CALL_OPEN,
    SM_CALL_CLOSE,
    SM_CALL_READ,
    SM_CALL_WRITE,
    SM_CALL_FDATASYNC,
    SM_CALL_FSYNC,
    SM_CALL_FLOCK,
    SM_CALL_FSTAT,
    SM_CALL_STAT,
    SM_CALL_MKDIR,
    SM_CALL_RENAME,
    SM_CALL_UNLINK,
    SM_CALL_LIST,
    SM_CALL_REALPATH,
    SM_CALL_RANDOM,
    SM_CALL_TCGETATTR,
    SM_CALL_TCSETATTR,
    SM_CALL_TCFLUSH,
    SM_CALL_IOCTL,
    SM_CALL_POLL,
    SM_CALL_SERIAL_OPEN,
    SM_CALL_SERIAL_CLOSE,
    SM_CALL_SERIAL_SETUP,
    SM_CALL_SERIAL_IDENTITY,
    SM_CALL_CLOCK,
    SM_CALL_COUNT
};
const char *sm_call_name(enum sm_call c);

#define SM_CALLS(c) (UINT32_C(1) << (c))
#define SM_CALLS_LOG                                                                               \
    (SM_CALLS(SM_CALL_OPEN) | SM_CALLS(SM_CALL_READ) | SM_CALLS(SM_CALL_WRITE) |                   \
     SM_CALLS(SM_CALL_FDATASYNC) | SM_CALLS(SM_CALL_FSYNC) | SM_CALLS(SM_CALL_FLOCK) |             \
     SM_CALLS(SM_CALL_FSTAT) | SM_CALLS(SM_CALL_STAT) | SM_CALLS(SM_CALL_MKDIR) |                  \
     SM_CALLS(SM_CALL_RENAME) | SM_CALLS(SM_CALL_UNLINK) | SM_CALLS(SM_CALL_LIST) |                \
     SM_CALLS(SM_CALL_CLOSE))
#define SM_CALLS_ANY (~UINT32_C(0))

struct sm_door_fail {
    struct sm_door door; /* hand this one down; first, so that its functions find the rest */
    const struct sm_door *under;
    /* the plan */
    uint32_t calls;   /* which kinds are counted for it: SM_CALLS(SM_CALL_WRITE) | … */
    unsigned nth;     /* this one of them fails, from 1; 0: none */
    bool for_good;    /* and every later one of these kinds */
    int error;        /* errno to give: EIO, ENOSPC … */
    bool short_write; /* a failing write first writes half of its bytes and says so */
    /* what happened */
    atomic_uint seen;   /* calls of these kinds since the plan was made */
    atomic_uint failed; /* of them made to fail */
    atomic_uint count[SM_CALL_COUNT];
};

/* A door over `under` that fails nothing yet. */
void sm_door_fail_init(struct sm_door_fail *f, const struct sm_door *under);
/* A new plan; counts begin anew. */
void sm_door_fail_plan(struct sm_door_fail *f, uint32_t calls, unsigned nth, bool for_good,
                       int error, bool short_write);
/* Fails nothing any more. */
void sm_door_fail_heal(struct sm_door_fail *f);
/* For a door of one's own over a failing one (a test that overrides single functions). */
bool sm_door_fail_due(struct sm_door_fail *f, enum sm_call c);
#endif
