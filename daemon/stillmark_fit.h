/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_fit.h: the command `stillmark fit`: a calibration curve out of a CSV file. */
#ifndef SM_DAEMON_STILLMARK_FIT_H
#define SM_DAEMON_STILLMARK_FIT_H

/* argv[argc] are the words after "fit". Writes to standard output; what is wrong as one line to
 * standard error. gsl_set_error_handler_off() has been called. Returns the exit status: 0 done,
 * 2 could not be done. */
int sm_stillmark_fit(int argc, char **argv);
#endif
