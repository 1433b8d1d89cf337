/* SPDX-License-Identifier: GPL-3.0-or-later */
/* reading.h: what was read out of one line of a meter: a value per channel. */
#ifndef SM_READING_READING_H
#define SM_READING_READING_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/text.h"

#define SM_CHANNELS_MAX 8
#define SM_CHANNEL_SIZE 33 /* a channel's name [a-z0-9-]{1,32} and its NUL */
#define SM_DIGITS_SIZE 32

enum sm_flag {
    SM_FLAG_OK,
    SM_FLAG_OVER,    /* the meter says: above its range */
    SM_FLAG_UNDER,   /* below its range */
    SM_FLAG_OPEN,    /* open circuit, probe in air (a word for it, or outside `plausible`) */
    SM_FLAG_UNUSABLE /* the meter says: do not use */
};
const char *sm_flag_name(enum sm_flag f); /* "ok", "over", … */

struct sm_value {
    bool present; /* this line carried the channel */
    enum sm_flag flag;
    double value; /* in the channel's unit; NaN where the line has no number (a word);
                   * to be used only where flag is OK */
    double step;  /* display step implied by the digits; 0 unknown */
    char digits[SM_DIGITS_SIZE]; /* the meter's own number or word, as sent, a sign set apart in
                                    front */
};

struct sm_reading {
    int64_t t_ns;
    size_t n; /* the profile's channels */
    struct sm_value channel[SM_CHANNELS_MAX];
};
#endif
