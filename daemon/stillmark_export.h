/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_export.h: the command
 * `stillmark export LOG… [--run N] [--readings|--captures|--curve|--results]`. */
#ifndef SM_STILLMARK_EXPORT_H
#define SM_STILLMARK_EXPORT_H

/* argv[argc] are the words after "export". Exit status: 0 written; 1 a log does not verify, nothing
 * of it is exported; 2 could not be done. */
int sm_stillmark_export(int argc, char **argv);
#endif
