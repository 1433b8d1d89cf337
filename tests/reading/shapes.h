/* SPDX-License-Identifier: GPL-3.0-or-later */
/* shapes.h: the profiles of conf/profiles/ made in C, for tests that stand above lib/setup. */
#ifndef SM_TESTS_SHAPES_H
#define SM_TESTS_SHAPES_H
#include <string.h>

#include "base/text.h"
#include "reading/profile.h"

#define SHAPES 6

static inline struct sm_channel *shape_channel(struct sm_profile *p, const char *name,
                                               enum sm_unit unit, const char *written, unsigned at,
                                               unsigned unit_at)
{
    struct sm_channel *c = &p->channel[p->n_channels++];

    sm_text_copy(c->name, sizeof c->name, name);
    sm_text_copy(c->written, sizeof c->written, written);
    c->unit = unit;
    c->at = at;
    c->unit_at = unit_at;
    c->scale = 1;
    return c;
}

static inline void shape_raw(struct sm_channel *c, double from, double to, double scale)
{
    c->raw = true;
    c->has_plausible = true;
    c->plausible_from = from;
    c->plausible_to = to;
    c->scale = scale;
}

static inline void shape_example(struct sm_profile *p, const char *line, double first,
                                 double second)
{
    p->example.given = true;
    p->example.n = strlen(line);
    sm_text_copy(p->example.line, sizeof p->example.line, line);
    p->example.has[0] = true;
    p->example.want[0] = first;
    p->example.has[1] = p->n_channels > 1;
    p->example.want[1] = second;
}

static inline void shape_question(struct sm_question *q, const char *text, int every_ms,
                                  int within_ms)
{
    sm_text_copy(q->text, sizeof q->text, text);
    q->n = strlen(text);
    q->every_ns = every_ms * INT64_C(1000000);
    q->within_ns = within_ms * INT64_C(1000000);
}

static inline void shape_r_mv(struct sm_profile *p)
{
    shape_raw(shape_channel(p, "potential", SM_UNIT_MV, "", 1, 2), -1500, 1500, 1);
    shape_channel(p, "probe", SM_UNIT_CELSIUS, "C", 3, 4);
    shape_question(&p->ask, "R\r", 1000, 600);
    strcpy(p->over[0], "OVR");
    strcpy(p->under[0], "UDR");
    strcpy(p->open[0], "----");
    strcpy(p->unusable[0], "WAIT");
    shape_example(p, "-0012.4 mV  24.8 C", -12.4, 24.8);
}

static inline void shape_plain_mv(struct sm_profile *p)
{
    p->framing.eol = SM_EOL_CRLF;
    shape_raw(shape_channel(p, "potential", SM_UNIT_MV, "", 1, 2), -1500, 1500, 1);
    shape_channel(p, "probe", SM_UNIT_CELSIUS, "C", 3, 4);
    strcpy(p->over[0], "+++++");
    strcpy(p->under[0], "-----");
    strcpy(p->open[0], "open");
    shape_example(p, "-0012.4 mV  24.8 C", -12.4, 24.8);
}

static inline void shape_semi_comma(struct sm_profile *p)
{
    p->framing.eol = SM_EOL_LF;
    p->split = SM_SPLIT_CHAR;
    p->split_char = ';';
    p->decimal_comma = true;
    p->status_at = 6;
    shape_raw(shape_channel(p, "conductivity", SM_UNIT_US_CM, "", 2, 3), 0.5, 200000, 1);
    shape_channel(p, "probe", SM_UNIT_CELSIUS, "", 4, 5);
    strcpy(p->over[0], "HI");
    strcpy(p->unusable[0], "wt");
    strcpy(p->unusable[1], "err");
    strcpy(p->mark[0], "sto");
    shape_example(p, "0017;1412,6;uS/cm;24,8;°C;st", 1412.6, 24.8);
}

static inline void shape_star_sum(struct sm_profile *p)
{
    p->framing.eol = SM_EOL_CR;
    p->split = SM_SPLIT_PATTERN;
    sm_text_copy(p->pattern, sizeof p->pattern,
                 "a=(?<absorbance>[-+.0-9]+|HIGH) (?<absorbance_unit>\\S+)"
                 "(?: t=(?<cuvette>[-.0-9]+) (?<cuvette_unit>\\S+))? q=(?<status>\\w+)");
    p->checksum = (struct sm_checksum_rule){ SM_CHECKSUM_XOR8, '*', 0 };
    shape_raw(shape_channel(p, "absorbance", SM_UNIT_A, "", 0, 0), -0.5, 4, 1);
    shape_channel(p, "cuvette", SM_UNIT_CELSIUS, "C", 0, 0);
    strcpy(p->over[0], "HIGH");
    strcpy(p->open[0], "empty");
    strcpy(p->unusable[0], "lamp");
    strcpy(p->mark[0], "key");
    shape_example(p, "a=0.4312 A t=23.9 C q=ok*53", 0.4312, 23.9);
}

static inline void shape_pause_hex(struct sm_profile *p)
{
    p->framing.eol = SM_EOL_GAP;
    p->framing.gap_ns = INT64_C(50000000);
    p->status_at = 1;
    p->checksum = (struct sm_checksum_rule){ SM_CHECKSUM_CRC16_MODBUS, '#', 0 };
    struct sm_channel *c = shape_channel(p, "potential", SM_UNIT_MV, "V", 3, 4);
    shape_raw(c, -2000, 2000, 1000);
    c->sign_at = 2;
    shape_channel(p, "probe", SM_UNIT_CELSIUS, "", 5, 0);
    strcpy(p->over[0], "OL");
    strcpy(p->open[0], "S3");
    strcpy(p->unusable[0], "S7");
    strcpy(p->unusable[1], "S9");
    shape_example(p, "S0 - 1.2345E-2 V 24.8#94C7", -12.345, 24.8);
}

static inline void shape_scpi_volt(struct sm_profile *p)
{
    p->framing.eol = SM_EOL_LF;
    shape_question(&p->ask, "MEAS:VOLT:DC?\n", 500, 2000);
    shape_question(&p->identity, "*IDN?\n", 0, 2000);
    shape_raw(shape_channel(p, "potential", SM_UNIT_MV, "", 1, 0), -2000, 2000, 1000);
    strcpy(p->over[0], "9.90000000E+37");
    strcpy(p->over[1], "+9.90000000E+37");
    strcpy(p->under[0], "-9.90000000E+37");
    shape_example(p, "-1.23450000E-02", -12.345, 0);
}

/* The i-th shape, 0 to SHAPES - 1. */
static inline void shape(struct sm_profile *p, size_t i)
{
    static void (*const make[SHAPES])(struct sm_profile *) = { shape_r_mv,       shape_plain_mv,
                                                               shape_semi_comma, shape_star_sum,
                                                               shape_pause_hex,  shape_scpi_volt };
    static const char *const name[SHAPES] = { "r-mv",     "plain-mv",  "semi-comma",
                                              "star-sum", "pause-hex", "scpi-volt" };

    memset(p, 0, sizeof *p);
    sm_text_copy(p->name, sizeof p->name, name[i]);
    make[i](p);
}
#endif
