/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_verify.h: the command `stillmark verify LOG… [--key FILE] [--json]`. */
#ifndef SM_STILLMARK_VERIFY_H
#define SM_STILLMARK_VERIFY_H

/* argv[argc] are the words after "verify". Exit status: 0 all verifies; 1 something does not; 2
 * could not be done. */
int sm_stillmark_verify(int argc, char **argv);
#endif
