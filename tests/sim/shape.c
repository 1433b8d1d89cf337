/* SPDX-License-Identifier: GPL-3.0-or-later */
/* shape.c: see shape.h. */
#include "sim/shape.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const struct {
    const char *name, *line, *ok, *ask, *identity, *identity_answer;
} known[] = {
    { "plain-mv", "%+07.1v mV  %.1t C\r\n", "", "", "", "" },
    { "r-mv", "%+07.1v mV  %.1t C\r\n", "", "R\r", "I\r", "invented meter 0007\r\n" },
    { "semi-comma",
      "%04n;%,.1v;uS/cm;%,.1t;\xC2\xB0"
      "C;%w\n",
      "st", "", "", "" },
    { "star-sum", "a=%.4v A t=%.1t C q=%w*%X\r", "ok", "", "", "" },
    { "pause-hex", "%w %-s%k.4m V %.1t#%M", "S0", "", "", "" },
    { "scpi-volt", "%k.8e\n", "", "MEAS:VOLT:DC?\n", "*IDN?\n", "INVENTED,VOLTMETER,0007,1.0\n" },
};

static struct sm_sim_shape_text text_of(const char *s)
{
    struct sm_sim_shape_text t = { "", strlen(s) };

    memcpy(t.bytes, s, t.n + 1);
    return t;
}

bool sm_sim_shape_known(const char *name, struct sm_sim_shape *ret_shape)
{
    for (size_t i = 0; i < sizeof known / sizeof known[0]; i++) {
        if (strcmp(name, known[i].name) == 0) {
            *ret_shape = (struct sm_sim_shape){
                .line = text_of(known[i].line),
                .ok = text_of(known[i].ok),
                .ask = text_of(known[i].ask),
                .identity = text_of(known[i].identity),
                .identity_answer = text_of(known[i].identity_answer),
            };
            return true;
        }
    }
    return false;
}

struct directive {
    bool plus, zero, comma, dash, thousands;
    int width, decimals;
    char letter;
};

/* Reads the directive behind the '%' at line->bytes[at]; returns where it ends. */
static size_t directive_read(const struct sm_sim_shape_text *line, size_t at, struct directive *ret)
{
    struct directive d = { 0 };
    const char *s = line->bytes;

    for (at++; s[at] != '\0' && strchr("+0,-k", s[at]); at++) {
        d.plus = d.plus || s[at] == '+';
        d.zero = d.zero || s[at] == '0';
        d.comma = d.comma || s[at] == ',';
        d.dash = d.dash || s[at] == '-';
        d.thousands = d.thousands || s[at] == 'k';
    }
    for (; s[at] >= '0' && s[at] <= '9' && d.width < 100; at++)
        d.width = 10 * d.width + (s[at] - '0');
    if (s[at] == '.')
        for (at++; s[at] >= '0' && s[at] <= '9' && d.decimals < 100; at++)
            d.decimals = 10 * d.decimals + (s[at] - '0');
    d.letter = s[at];
    *ret = d;
    return s[at] == '\0' ? at : at + 1;
}

static bool is_value(const struct directive *d)
{
    return d->letter == 'v' || d->letter == 'a' || d->letter == 'e' || d->letter == 'm';
}

const char *sm_sim_shape_wrong(const struct sm_sim_shape_text *line)
{
    bool value = false;
    int directives = 0;

    if (line->n == 0)
        return "a line that is not empty";
    if (strlen(line->bytes) != line->n)
        return "a line without NUL";
    for (size_t at = 0; at < line->n;) {
        struct directive d;
        if (line->bytes[at] != '%') {
            at++;
            continue;
        }
        at = directive_read(line, at, &d);
        if (d.letter == '\0' || !strchr("vaemstnwXSM%", d.letter))
            return "one of v a e m s t n w X S M % after '%', flags, then width, then decimals";
        if (d.width > 20 || d.decimals > 9)
            return "a width of at most 20, decimals of at most 9";
        value = value || is_value(&d);
        directives++;
    }
    if (directives > 8)
        return "at most 8 directives";
    return value ? NULL : "a value in the line (%v, %a, %e or %m)";
}

int sm_sim_shape_decimals(const struct sm_sim_shape_text *line)
{
    for (size_t at = 0; at < line->n;) {
        struct directive d = { 0 };
        if (line->bytes[at] == '%')
            at = directive_read(line, at, &d);
        else
            at++;
        if (d.letter == 'v' || d.letter == 'a')
            return d.decimals + (d.thousands ? 3 : 0);
        if (is_value(&d))
            return -1;
    }
    return 0;
}

struct out {
    char *buf;
    size_t n;
};

static void put(struct out *o, const char *s, size_t n)
{
    for (size_t i = 0; i < n && o->n < SM_SIM_SHAPE_LINE - 1; i++)
        o->buf[o->n++] = s[i];
    o->buf[o->n] = '\0';
}

static void put_number(struct out *o, const struct directive *d, double v)
{
    char s[96];

    if (d->letter == 'a' || d->letter == 'm')
        v = fabs(v);
    if (d->thousands)
        v /= 1000;
    if (!(fabs(v) <= 1e12)) /* no display is that wide; it keeps the text short */
        v = copysign(1e12, v);
    if (d->letter == 'e' || d->letter == 'm')
        snprintf(s, sizeof s, "%*.*E", d->width, d->decimals, v);
    else if (d->plus && d->zero)
        snprintf(s, sizeof s, "%+0*.*f", d->width, d->decimals, v);
    else if (d->plus)
        snprintf(s, sizeof s, "%+*.*f", d->width, d->decimals, v);
    else if (d->zero)
        snprintf(s, sizeof s, "%0*.*f", d->width, d->decimals, v);
    else
        snprintf(s, sizeof s, "%*.*f", d->width, d->decimals, v);
    char *point = strchr(s, '.');
    if (d->comma && point)
        *point = ',';
    put(o, s, strlen(s));
}

static void put_word(struct out *o, const struct directive *d, const char *word)
{
    for (size_t n = strlen(word); n < (size_t)d->width; n++)
        put(o, " ", 1);
    put(o, word, strlen(word));
}

/* CRC-16/MODBUS: polynomial 0x8005 reflected, start 0xFFFF. */
static unsigned crc16_modbus(const char *s, size_t n)
{
    unsigned crc = 0xFFFF;

    for (size_t i = 0; i < n; i++) {
        crc ^= (unsigned char)s[i];
        for (int bit = 0; bit < 8; bit++)
            crc = crc & 1 ? (crc >> 1) ^ 0xA001 : crc >> 1;
    }
    return crc;
}

static void put_checksum(struct out *o, const struct directive *d)
{
    const size_t n = d->dash || o->n == 0 ? o->n : o->n - 1;
    unsigned sum = 0;
    char s[8];

    for (size_t i = 0; i < n; i++) {
        const unsigned char b = (unsigned char)o->buf[i];
        sum = d->letter == 'X' ? sum ^ b : (sum + b) & 0xFF;
    }
    if (d->letter == 'M')
        snprintf(s, sizeof s, "%04X", crc16_modbus(o->buf, n));
    else
        snprintf(s, sizeof s, "%02X", sum & 0xFF);
    put(o, s, strlen(s));
}

static void put_sign(struct out *o, const struct directive *d, const struct sm_sim_shown *shown)
{
    const bool minus = signbit(shown->value);

    if (d->dash)
        put(o, "- ", minus ? 2 : 0);
    else
        put(o, minus ? "-" : "+", 1);
}

static void put_running(struct out *o, const struct directive *d, unsigned long number)
{
    char s[64];

    if (d->zero)
        snprintf(s, sizeof s, "%0*lu", d->width, number);
    else
        snprintf(s, sizeof s, "%*lu", d->width, number);
    put(o, s, strlen(s));
}

/* in_place: a word takes the value's place. */
static void put_directive(struct out *o, const struct directive *d,
                          const struct sm_sim_shape *shape, const struct sm_sim_shown *shown,
                          bool in_place)
{
    switch (d->letter) {
    case 's':
        put_sign(o, d, shown);
        break;
    case 't':
        put_number(o, d, shown->celsius);
        break;
    case 'n':
        put_running(o, d, shown->number);
        break;
    case 'w':
        put_word(o, d, shown->word ? shown->word : shape->ok.bytes);
        break;
    case '%':
        put(o, "%", 1);
        break;
    case 'X':
    case 'S':
    case 'M':
        put_checksum(o, d);
        break;
    default:
        if (shown->word && in_place)
            put_word(o, d, shown->word);
        else
            put_number(o, d, shown->value);
        break;
    }
}

static bool has_status(const struct sm_sim_shape_text *line)
{
    for (size_t at = 0; at < line->n;) {
        struct directive d = { 0 };
        if (line->bytes[at] == '%')
            at = directive_read(line, at, &d);
        else
            at++;
        if (d.letter == 'w')
            return true;
    }
    return false;
}

size_t sm_sim_shape_write(const struct sm_sim_shape *shape, const struct sm_sim_shown *shown,
                          char out[SM_SIM_SHAPE_LINE])
{
    const struct sm_sim_shape_text *line = &shape->line;
    const bool in_place = !has_status(line);
    struct out o = { out, 0 };

    out[0] = '\0';
    for (size_t at = 0; at < line->n;) {
        struct directive d;
        if (line->bytes[at] != '%') {
            put(&o, line->bytes + at++, 1);
            continue;
        }
        at = directive_read(line, at, &d);
        put_directive(&o, &d, shape, shown, in_place);
    }
    return o.n;
}
