/* SPDX-License-Identifier: GPL-3.0-or-later */
/* profile.h: how to get readings out of a meter's lines. Filled by lib/setup from conf/profiles/.
 */
#ifndef SM_READING_PROFILE_H
#define SM_READING_PROFILE_H
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/unit.h"
#include "reading/reading.h"

#define SM_LINE_MAX 1024 /* bytes of a line; longer is "overlong" */
#define SM_WORDS_MAX 8   /* words of one meaning */
#define SM_WORD_SIZE 33
#define SM_PATTERN_SIZE 512
#define SM_QUESTION_SIZE 128
#define SM_TERMINATOR_SIZE 9
#define SM_FIELDS_MAX 64 /* fields of a line that are looked at */

enum sm_eol { SM_EOL_AUTO, SM_EOL_CR, SM_EOL_LF, SM_EOL_CRLF, SM_EOL_ETX, SM_EOL_GAP, SM_EOL_TEXT };

struct sm_framing {
    enum sm_eol eol;               /* AUTO: CR, LF, CRLF and LFCR each end one line */
    char text[SM_TERMINATOR_SIZE]; /* TEXT: 1 to 8 bytes */
    size_t text_n;
    int64_t gap_ns;  /* GAP: this long without a byte ends a line */
    bool strip_bit7; /* 7E1 meters read as 8N1 */
};

enum sm_checksum {
    SM_CHECKSUM_NONE,
    SM_CHECKSUM_SUM8,         /* sum of the bytes modulo 256 */
    SM_CHECKSUM_XOR8,         /* exclusive or of the bytes */
    SM_CHECKSUM_CRC16_MODBUS, /* CRC-16/MODBUS: poly 0x8005 reflected, init 0xFFFF */
    SM_CHECKSUM_CRC16_CCITT,  /* CRC-16/IBM-3740: poly 0x1021, init 0xFFFF */
    SM_CHECKSUM_CRC16_XMODEM  /* CRC-16/XMODEM: poly 0x1021, init 0 */
};

/* Hex digits at the end of the line, after `mark` (one byte, '*' say; 0: directly the last digits);
 * covers the bytes from `from` (0 = first) to before the mark. */
struct sm_checksum_rule {
    enum sm_checksum kind;
    char mark;
    size_t from;
};

struct sm_question {
    char text[SM_QUESTION_SIZE]; /* any bytes */
    size_t n;                    /* 0: none */
    int64_t every_ns;            /* how often (not for the identity question) */
    int64_t within_ns;           /* an answer later than this is late */
};

struct sm_channel {
    char name[SM_CHANNEL_SIZE]; /* also the group's name in a pattern */
    enum sm_unit unit;
    char written[SM_WORD_SIZE]; /* the unit as the meter writes it; "" = as sm_unit_name */
    unsigned at, unit_at,
        sign_at; /* field number from 1 (split); 0 = not there. A sign set apart that
                  * a line split by spaces leaves out moves no later number */
    bool
        raw; /* a raw signal (mV, A, µS at t), not already calibrated or compensated in the meter */
    bool has_plausible;
    double plausible_from, plausible_to; /* outside: flag OPEN */
    double scale;                        /* multiplies the number as sent; 1 by default */
};

enum sm_split { SM_SPLIT_SPACES, SM_SPLIT_CHAR, SM_SPLIT_PATTERN };

struct sm_example {
    bool given;
    char line[SM_LINE_MAX];
    size_t n;
    bool has[SM_CHANNELS_MAX];
    double want[SM_CHANNELS_MAX]; /* in the channel's unit */
};

struct sm_profile {
    char name[SM_NAME_SIZE];
    struct sm_framing framing;
    struct sm_question ask;      /* n == 0: the meter sends by itself */
    struct sm_question identity; /* asked once when the port is opened; n == 0: none */
    enum sm_split split;
    char split_char;               /* SPLIT_CHAR */
    char pattern[SM_PATTERN_SIZE]; /* SPLIT_PATTERN: PCRE2, for the whole line (blanks at its ends
                                    * are cut off first); a group "NAME-unit" is written NAME_unit,
                                    * "NAME-sign" NAME_sign ('-' in names becomes '_'), "status" */
    unsigned status_at;            /* a field that holds a status word; 0 none */
    bool decimal_comma;            /* "12,4" is 12.4 */
    size_t n_channels;
    struct sm_channel channel[SM_CHANNELS_MAX];
    char over[SM_WORDS_MAX]
             [SM_WORD_SIZE]; /* in place of a number, or as the status word; "" = end */
    char under[SM_WORDS_MAX][SM_WORD_SIZE];
    char open[SM_WORDS_MAX][SM_WORD_SIZE];
    char unusable[SM_WORDS_MAX][SM_WORD_SIZE];
    char mark[SM_WORDS_MAX][SM_WORD_SIZE]; /* the meter's own "store" key, as the status word */
    struct sm_checksum_rule checksum;
    struct sm_example example;
};

/* Index of a channel, or -1. */
int sm_profile_channel(const struct sm_profile *p, const char *name);
#endif
