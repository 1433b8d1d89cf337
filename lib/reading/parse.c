/* SPDX-License-Identifier: GPL-3.0-or-later */
/* parse.c: one line to one reading. A line is first checked (checksum), then taken apart into slots
 * by field number or by the pattern's groups, then each channel's slots are read. Whatever is there
 * but is not what the profile says makes the whole line unread: half a line is not trusted. */
#include "reading/parse.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/number.h"
#include "reading/checksum.h"
#include "reading/field.h"
#include "reading/pattern.h"
#include "reading/value.h"

#define STX 0x02

struct groups { /* numbers of a channel's groups; 0: none */
    int value, unit, sign;
};

struct sm_parser {
    const struct sm_profile *profile;
    struct sm_pattern *pattern; /* NULL: split */
    struct groups groups[SM_CHANNELS_MAX];
    int status_group;
    bool is_sign[SM_FIELDS_MAX + 1]; /* this field is a sign set apart */
    uint64_t too_long;
};

struct slots {
    struct sm_pieces channel[SM_CHANNELS_MAX];
    struct sm_span status;
};

/* ---- creation ---- */

static bool group_name(char out[SM_CHANNEL_SIZE + 8], const char *channel, const char *suffix)
{
    struct sm_text t;

    sm_text_init(&t, out, SM_CHANNEL_SIZE + 8);
    sm_text_add(&t, channel);
    sm_text_add(&t, suffix);
    for (size_t i = 0; i < t.len; i++)
        if (out[i] == '-')
            out[i] = '_';
    return !t.cut;
}

/* A group by its name; needed: it must be there. */
static enum sm_status find_group(const struct sm_parser *p, const char *channel, const char *suffix,
                                 bool needed, int *ret_group, char why[SM_REASON_SIZE])
{
    char name[SM_CHANNEL_SIZE + 8];
    struct sm_text t;
    const int group = group_name(name, channel, suffix) ? sm_pattern_group(p->pattern, name) : 0;

    if (group > 0 || (group == 0 && !needed)) {
        *ret_group = group;
        return SM_OK;
    }
    sm_text_init(&t, why, SM_REASON_SIZE);
    sm_text_addf(&t,
                 group < 0 ? "pattern: more than one group is called \"%s\""
                           : "pattern: no group (?<%s>…) for that channel",
                 name);
    return SM_EINVAL;
}

static enum sm_status find_groups(struct sm_parser *p, char why[SM_REASON_SIZE])
{
    enum sm_status status = find_group(p, "status", "", false, &p->status_group, why);

    for (size_t i = 0; status == SM_OK && i < p->profile->n_channels; i++) {
        const char *name = p->profile->channel[i].name;
        struct groups *g = &p->groups[i];

        status = find_group(p, name, "", true, &g->value, why);
        if (status == SM_OK)
            status = find_group(p, name, "_unit", false, &g->unit, why);
        if (status == SM_OK)
            status = find_group(p, name, "_sign", false, &g->sign, why);
    }
    return status;
}

static enum sm_status check_fields(struct sm_parser *p, char why[SM_REASON_SIZE])
{
    struct sm_text t;

    sm_text_init(&t, why, SM_REASON_SIZE);
    for (size_t i = 0; i < p->profile->n_channels; i++) {
        const struct sm_channel *c = &p->profile->channel[i];

        if (c->at < 1 || c->at > SM_FIELDS_MAX || c->unit_at > SM_FIELDS_MAX) {
            sm_text_addf(&t, "channel %s: fields are numbered from 1 to %d", c->name,
                         SM_FIELDS_MAX);
            return SM_EINVAL;
        }
        if (c->sign_at > SM_FIELDS_MAX || c->sign_at == c->at) {
            sm_text_addf(&t, "channel %s: a sign set apart has a field of its own", c->name);
            return SM_EINVAL;
        }
        p->is_sign[c->sign_at] = true;
    }
    if (p->profile->status_at > SM_FIELDS_MAX) {
        sm_text_addf(&t, "status: fields are numbered from 1 to %d", SM_FIELDS_MAX);
        return SM_EINVAL;
    }
    return SM_OK;
}

static enum sm_status check_channels(const struct sm_profile *profile, char why[SM_REASON_SIZE])
{
    struct sm_text t;

    sm_text_init(&t, why, SM_REASON_SIZE);
    if (profile->n_channels < 1 || profile->n_channels > SM_CHANNELS_MAX) {
        sm_text_addf(&t, "a profile has 1 to %d channels", SM_CHANNELS_MAX);
        return SM_EINVAL;
    }
    for (size_t i = 0; i < profile->n_channels; i++) {
        const struct sm_channel *c = &profile->channel[i];

        if (!isfinite(c->scale) || c->scale == 0) {
            sm_text_addf(&t, "channel %s: scale must be a number other than 0", c->name);
            return SM_EINVAL;
        }
    }
    return SM_OK;
}

static enum sm_status make(struct sm_parser *p, char why[SM_REASON_SIZE])
{
    enum sm_status status = check_channels(p->profile, why);

    if (status != SM_OK)
        return status;
    if (p->profile->split != SM_SPLIT_PATTERN)
        return check_fields(p, why);
    status = sm_pattern_create(p->profile->pattern, &p->pattern, why);
    return status == SM_OK ? find_groups(p, why) : status;
}

enum sm_status sm_parser_create(const struct sm_profile *profile, struct sm_parser **ret_parser,
                                char ret_why[SM_REASON_SIZE])
{
    struct sm_parser *p = calloc(1, sizeof *p);
    enum sm_status status;

    if (p == NULL)
        return SM_ENOMEM;
    p->profile = profile;
    status = make(p, ret_why);
    if (status != SM_OK) {
        sm_parser_destroy(p);
        return status;
    }
    *ret_parser = p;
    return SM_OK;
}

void sm_parser_destroy(struct sm_parser *p)
{
    if (p == NULL)
        return;
    sm_pattern_destroy(p->pattern);
    free(p);
}

uint64_t sm_parser_too_long(const struct sm_parser *p)
{
    return p->too_long;
}

/* ---- checksum ---- */

static int hex_digit(char c)
{
    if (c >= '0' && c <= '9')
        return c - '0';
    if (c >= 'a' && c <= 'f')
        return c - 'a' + 10;
    return c >= 'A' && c <= 'F' ? c - 'A' + 10 : -1;
}

/* Takes the checksum off the line's end and compares it. */
static enum sm_status check_sum(const struct sm_checksum_rule *rule, struct sm_span *line,
                                struct sm_text *why)
{
    const size_t digits = sm_checksum_digits(rule->kind), tail = digits + (rule->mark != '\0');
    unsigned said = 0, is;

    if (rule->kind == SM_CHECKSUM_NONE)
        return SM_OK;
    if (line->n < tail || line->n - tail < rule->from) {
        sm_text_addf(why, "too short to hold a %s checksum", sm_checksum_name(rule->kind));
        return SM_ESYNTAX;
    }
    const size_t payload = line->n - tail;
    for (size_t i = line->n - digits; i < line->n; i++) {
        const int d = hex_digit(line->s[i]);

        if (d < 0 || (rule->mark != '\0' && line->s[payload] != rule->mark)) {
            sm_text_addf(why, "expected a %s checksum at the end, got ",
                         sm_checksum_name(rule->kind));
            sm_span_quote(why, (struct sm_span){ line->s + payload, tail });
            return SM_ESYNTAX;
        }
        said = said << 4 | (unsigned)d;
    }
    is = sm_checksum(rule->kind, line->s + rule->from, payload - rule->from);
    if (is != said) {
        sm_text_addf(why, "checksum is %0*X, the line says %0*X", (int)digits, is, (int)digits,
                     said);
        return SM_ESYNTAX;
    }
    line->n = payload;
    return SM_OK;
}

/* ---- taking a line apart ---- */

/* Fields by the profile's numbers: where a line split by spaces leaves out a sign set apart (a
 * meter that prints none for positive numbers), the numbers after it stand. */
static size_t number_fields(const struct sm_parser *p, struct sm_span line,
                            struct sm_span ret_field[SM_FIELDS_MAX + 1])
{
    struct sm_span sent[SM_FIELDS_MAX];
    const size_t n = sm_fields_split(p->profile->split, p->profile->split_char, line, sent);
    size_t k = 0;

    memset(ret_field, 0, (SM_FIELDS_MAX + 1) * sizeof *ret_field);
    for (size_t at = 1; at <= SM_FIELDS_MAX && k < n; at++) {
        const bool left_out =
            p->is_sign[at] && p->profile->split == SM_SPLIT_SPACES && !sm_span_is_sign(sent[k]);
        if (!left_out)
            ret_field[at] = sent[k++];
    }
    return n;
}

static void slots_by_field(const struct sm_parser *p, struct sm_span line, struct slots *ret_slots)
{
    struct sm_span field[SM_FIELDS_MAX + 1];

    number_fields(p, line, field);
    for (size_t i = 0; i < p->profile->n_channels; i++) {
        const struct sm_channel *c = &p->profile->channel[i];

        ret_slots->channel[i] = (struct sm_pieces){
            .value = field[c->at],
            .unit = field[c->unit_at], /* field 0 is never there */
            .sign = field[c->sign_at],
            .unit_wanted = c->unit_at != 0,
        };
    }
    ret_slots->status = field[p->profile->status_at];
}

static struct sm_span group_span(const struct sm_parser *p, int group, struct sm_span line)
{
    return sm_span_trim(sm_pattern_span(p->pattern, group, line));
}

static enum sm_status slots_by_pattern(struct sm_parser *p, struct sm_span line,
                                       struct slots *ret_slots, struct sm_text *why)
{
    const enum sm_status status = sm_pattern_match(p->pattern, line);

    if (status == SM_EFULL) {
        p->too_long++;
        sm_text_add(why, "pattern took too long");
        return SM_ESYNTAX;
    }
    if (status != SM_OK) {
        sm_text_add(why, "the pattern does not match ");
        sm_span_quote(why, line);
        return SM_ESYNTAX;
    }
    for (size_t i = 0; i < p->profile->n_channels; i++) {
        const struct groups *g = &p->groups[i];

        ret_slots->channel[i] = (struct sm_pieces){
            .value = group_span(p, g->value, line),
            .unit = group_span(p, g->unit, line),
            .sign = group_span(p, g->sign, line),
            .unit_wanted = g->unit != 0,
        };
    }
    ret_slots->status = group_span(p, p->status_group, line);
    return SM_OK;
}

/* ---- the whole line ---- */

/* A checksum may cover the blanks at a line's head, not what is left of another line's end. */
static struct sm_span without_ends(struct sm_span line)
{
    while (line.n > 0 && (line.s[0] == '\r' || line.s[0] == '\n')) {
        line.s++;
        line.n--;
    }
    const struct sm_span inner = sm_span_trim(line);
    line.n = (size_t)(inner.s - line.s) + inner.n;
    return line;
}

static struct sm_span without_stx(struct sm_span line)
{
    line = sm_span_trim(line);
    if (line.n > 0 && line.s[0] == STX) {
        line.s++;
        line.n--;
    }
    return sm_span_trim(line);
}

static enum sm_status read_channels(const struct sm_parser *p, const struct slots *slots,
                                    struct sm_reading *r, struct sm_text *why)
{
    const char *word;
    const enum sm_flag said = sm_flag_of_word(p->profile, slots->status, &word);
    bool any = false;

    for (size_t i = 0; i < r->n; i++) {
        struct sm_value *v = &r->channel[i];
        const enum sm_status status = sm_value_read(p->profile, i, &slots->channel[i], v, why);

        if (status != SM_OK)
            return status;
        if (v->present && v->flag == SM_FLAG_OK)
            v->flag = said;
        any = any || v->present;
    }
    if (!any) {
        sm_text_add(why, "no value in it");
        return SM_ESYNTAX;
    }
    return SM_OK;
}

enum sm_status sm_parser_read(struct sm_parser *p, int64_t t_ns, const char *line, size_t n,
                              struct sm_reading *ret_reading, bool *ret_mark,
                              char ret_why[SM_REASON_SIZE])
{
    struct sm_reading r = { .t_ns = t_ns, .n = p->profile->n_channels };
    struct slots slots = { 0 };
    struct sm_span rest = { line, n };
    struct sm_text why;
    enum sm_status status;

    sm_text_init(&why, ret_why, SM_REASON_SIZE);
    if (n > SM_LINE_MAX) {
        sm_text_addf(&why, "longer than %d bytes", SM_LINE_MAX);
        return SM_ESYNTAX;
    }
    rest = without_ends(rest);
    status = check_sum(&p->profile->checksum, &rest, &why);
    if (status != SM_OK)
        return status;
    rest = without_stx(rest);
    if (p->pattern != NULL)
        status = slots_by_pattern(p, rest, &slots, &why);
    else
        slots_by_field(p, rest, &slots);
    if (status == SM_OK)
        status = read_channels(p, &slots, &r, &why);
    if (status != SM_OK)
        return status;
    *ret_reading = r;
    *ret_mark = sm_span_in(slots.status, p->profile->mark) != NULL;
    return SM_OK;
}

static bool as_wanted(const struct sm_value *got, double want)
{
    return got->present && got->flag == SM_FLAG_OK &&
           fabs(got->value - want) <= 1e-9 * fmax(1, fabs(want));
}

enum sm_status sm_parser_check_example(struct sm_parser *p, char ret_why[SM_REASON_SIZE])
{
    const struct sm_example *e = &p->profile->example;
    struct sm_reading r;
    bool mark;
    char why[SM_REASON_SIZE];
    struct sm_text t;

    if (!e->given)
        return SM_OK;
    sm_text_init(&t, ret_why, SM_REASON_SIZE);
    if (sm_parser_read(p, 0, e->line, e->n, &r, &mark, why) != SM_OK) {
        sm_text_addf(&t, "the profile does not read its own example: %s", why);
        return SM_EVALUE;
    }
    for (size_t i = 0; i < r.n; i++) {
        const struct sm_value *v = &r.channel[i];
        char want[SM_NUMBER_SIZE];

        if (!e->has[i] || as_wanted(v, e->want[i]))
            continue;
        sm_number_write(want, e->want[i]);
        sm_text_addf(&t, "%s: the profile reads \"", p->profile->channel[i].name);
        sm_text_add_safe(&t, v->digits, strlen(v->digits));
        sm_text_addf(&t, "\" (%s) in its example, which says %s",
                     v->present ? sm_flag_name(v->flag) : "not there", want);
        return SM_EVALUE;
    }
    ret_why[0] = '\0';
    return SM_OK;
}
