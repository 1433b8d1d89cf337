/* SPDX-License-Identifier: GPL-3.0-or-later */
/* status.h: how a call ended, and who must act. */
#ifndef SM_BASE_STATUS_H
#define SM_BASE_STATUS_H

#define SM_MUST_CHECK __attribute__((warn_unused_result))

enum sm_status {
    SM_OK = 0,
    SM_EINVAL = -1,   /* an argument is outside its stated range: whoever called or set up */
    SM_EVALUE = -2,   /* the data: a value that cannot be used (not a number, infinite) */
    SM_EORDER = -3,   /* the data: out of order */
    SM_ESHORT = -4,   /* not yet, or not enough */
    SM_EFULL = -5,    /* a stated ceiling is reached */
    SM_ESYNTAX = -6,  /* the text does not have the form asked for */
    SM_EBUSY = -7,    /* an earlier step is not finished (feed before drained, port in use) */
    SM_ENOMEM = -8,   /* no memory */
    SM_EIO = -9,      /* the world outside: a port, a file, a socket */
    SM_EUNKNOWN = -10 /* a name that nothing answers to */
};

/* "out of range", "no memory" …: never NULL. */
const char *sm_status_text(enum sm_status s);
#endif
