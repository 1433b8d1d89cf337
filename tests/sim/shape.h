/* SPDX-License-Identifier: GPL-3.0-or-later */
/* shape.h: how a simulated meter writes a reading, and what it answers to. No maker's format: all
 * are invented.
 *
 * A template is text with directives, each `%[flags][width][.decimals]letter`:
 *   v  the value
 *   a  its magnitude
 *   s  its sign alone, + or -; with flag `-` only a minus, and a blank after it
 *   e  the value with an exponent; m  its magnitude with one
 *   w  the status word: the shape's "ok", or another
 *   t  temperature, °C
 *   n  running number
 *   %  a percent sign
 *   X  exclusive or, S  sum: two hex digits; M  CRC-16/MODBUS: four. Over all bytes of the line so
 *      far except the last (the mark); with flag `-` the last one too
 * Flags: `+` sign always, `0` leading zeros, `,` decimal comma, `k` in thousands (mV as V). A
 * five-figure value with a comma and one decimal is "%+0,7.1v".
 * A word that the meter shows (open circuit, wait) goes where w is, else in place of the value,
 * right-aligned in its width. */
#ifndef SM_SIM_SHAPE_H
#define SM_SIM_SHAPE_H
#include <stdbool.h>
#include <stddef.h>

#define SM_SIM_SHAPE_TEXT 160 /* bytes of a template or question, and its NUL */
#define SM_SIM_SHAPE_LINE 512 /* bytes that hold any line a shape writes */

struct sm_sim_shape_text {
    char bytes[SM_SIM_SHAPE_TEXT]; /* any bytes; NUL-terminated too */
    size_t n;
};

struct sm_sim_shape {
    struct sm_sim_shape_text line; /* template */
    struct sm_sim_shape_text ok;   /* the status word when all is well */
    struct sm_sim_shape_text
        ask; /* what a reading is asked with; n == 0: the meter sends by itself */
    struct sm_sim_shape_text identity, identity_answer; /* n == 0: none */
};

struct sm_sim_shown { /* what the display shows */
    double value;
    const char *word; /* in place of the value; NULL: none */
    double celsius;
    unsigned long number;
};

/* One of the shapes known by name (as in conf/profiles); false: no such name. */
bool sm_sim_shape_known(const char *name, struct sm_sim_shape *ret_shape);

/* NULL where the template can be used, else what is expected in its place. */
const char *sm_sim_shape_wrong(const struct sm_sim_shape_text *line);

/* The decimals of the first value that the template shows; -1: it has an exponent. */
int sm_sim_shape_decimals(const struct sm_sim_shape_text *line);

/* Writes a line by a template that sm_sim_shape_wrong has passed; returns its length. */
size_t sm_sim_shape_write(const struct sm_sim_shape *shape, const struct sm_sim_shown *shown,
                          char out[SM_SIM_SHAPE_LINE]);
#endif
