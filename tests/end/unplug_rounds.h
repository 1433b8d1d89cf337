/* SPDX-License-Identifier: GPL-3.0-or-later */
/* unplug_rounds.h: the plug pulled and put back so many times, and what must hold of it. */
#ifndef SM_TESTS_UNPLUG_ROUNDS_H
#define SM_TESTS_UNPLUG_ROUNDS_H

/* Fails the test where the daemon is not back within 5 s, says nothing or too much of it in the
 * log, or grows. */
void unplug_rounds(unsigned rounds);
#endif
