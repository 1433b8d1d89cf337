/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_profile.h: the command `stillmark profile FILE --try LINES`: what a profile reads out
 * of a file of lines, for someone with a new meter. */
#ifndef SM_STILLMARK_PROFILE_H
#define SM_STILLMARK_PROFILE_H

/* argv[argc] are the words after "profile". Exit status: 0 every line gave a reading; 1 at least
 * one did not; 2 could not be done. */
int sm_stillmark_profile(int argc, char **argv);
#endif
