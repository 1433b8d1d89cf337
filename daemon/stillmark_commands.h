/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_commands.h: which command the words of `stillmark` mean. */
#ifndef SM_DAEMON_STILLMARK_COMMANDS_H
#define SM_DAEMON_STILLMARK_COMMANDS_H

/* argv as given to main. gsl_set_error_handler_off() has been called. Returns the exit status. */
int sm_stillmark(int argc, char **argv);
#endif
