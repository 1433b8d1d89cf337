/* SPDX-License-Identifier: GPL-3.0-or-later */
/* reading.c: names of what a value can be. */
#include "reading/reading.h"

const char *sm_flag_name(enum sm_flag f)
{
    static const char *const name[] = { "ok", "over", "under", "open", "unusable" };

    return (size_t)f < sizeof name / sizeof *name ? name[f] : "?";
}
