/* SPDX-License-Identifier: GPL-3.0-or-later */
/* names.c: the words of the signal's seam. */
#include <assert.h>

#include "signal/signal.h"

const char *sm_moved_by_name(enum sm_mark_by by)
{
    static const char *const name[] = {
        [SM_MOVED_START] = "start", [SM_MOVED_TRANSIT] = "transit", [SM_MOVED_MARK] = "mark",
        [SM_MOVED_VALUE] = "value", [SM_MOVED_LINE] = "line",
    };

    assert((unsigned)by < sizeof name / sizeof name[0]);
    return name[by];
}

const char *sm_transit_how_name(enum sm_transit_how how)
{
    static const char *const name[] = {
        [SM_TRANSIT_OPEN] = "open circuit",
        [SM_TRANSIT_WORD] = "word",
        [SM_TRANSIT_PLAUSIBLE] = "implausible",
        [SM_TRANSIT_DEPARTURES] = "two departures",
    };

    assert((unsigned)how < sizeof name / sizeof name[0]);
    return name[how];
}

const char *sm_part_name(enum sm_part p)
{
    static const char *const name[SM_PART_COUNT] = {
        [SM_PART_NOISE] = "noise",           [SM_PART_TO_COME] = "to_come", [SM_PART_STEP] = "step",
        [SM_PART_LONG_NOISE] = "long_noise", [SM_PART_DRIFT] = "drift",
    };

    assert((unsigned)p < SM_PART_COUNT);
    return name[p];
}
