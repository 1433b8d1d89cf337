/* SPDX-License-Identifier: GPL-3.0-or-later */
/* value.c: a channel's pieces of a line to a value with flag, step and the meter's digits. */
#include "reading/value.h"

#include <math.h>
#include <string.h>

#include "base/number.h"

static enum sm_status expected(const struct sm_profile *p, size_t i, unsigned at, const char *what,
                               struct sm_span got, struct sm_text *why)
{
    if (p->split == SM_SPLIT_PATTERN)
        sm_text_addf(why, "%s: ", p->channel[i].name);
    else
        sm_text_addf(why, "field %u: ", at);
    sm_text_addf(why, "expected %s, got ", what);
    if (got.n == 0)
        sm_text_add(why, "nothing");
    else
        sm_span_quote(why, got);
    return SM_ESYNTAX;
}

enum sm_flag sm_flag_of_word(const struct sm_profile *p, struct sm_span s, const char **ret_word)
{
    if ((*ret_word = sm_span_in(s, p->over)) != NULL)
        return SM_FLAG_OVER;
    if ((*ret_word = sm_span_in(s, p->under)) != NULL)
        return SM_FLAG_UNDER;
    if ((*ret_word = sm_span_in(s, p->open)) != NULL)
        return SM_FLAG_OPEN;
    *ret_word = sm_span_in(s, p->unusable);
    return *ret_word != NULL ? SM_FLAG_UNUSABLE : SM_FLAG_OK;
}

/* Sign and number in one piece: a sign set apart, in its own field or by blanks, goes in front. */
static bool join_sign(struct sm_span sign, struct sm_span number, char ret_digits[SM_DIGITS_SIZE])
{
    size_t k = 0;

    if (sign.n > 0) {
        ret_digits[k++] = sign.s[0];
    } else if (number.n > 1 && (number.s[0] == '+' || number.s[0] == '-')) {
        ret_digits[k++] = number.s[0];
        number.s++;
        number.n--;
        number = sm_span_trim(number);
    }
    if (number.n == 0 || number.n + k >= SM_DIGITS_SIZE || number.s[0] == '+' ||
        number.s[0] == '-' || memchr(number.s, '\0', number.n) != NULL)
        return false;
    memcpy(ret_digits + k, number.s, number.n);
    ret_digits[k + number.n] = '\0';
    return true;
}

/* The number as sent into base/number's form. False: the wrong decimal sign. */
static bool with_point(const struct sm_profile *p, const char *digits,
                       char ret_plain[SM_DIGITS_SIZE])
{
    size_t i = 0;

    for (; digits[i] != '\0'; i++) {
        if (p->decimal_comma && digits[i] == '.')
            return false;
        ret_plain[i] = digits[i];
        if (p->decimal_comma && digits[i] == ',')
            ret_plain[i] = '.';
    }
    ret_plain[i] = '\0';
    return true;
}

static bool unit_is(const struct sm_channel *c, struct sm_span unit)
{
    enum sm_unit u;

    if (c->written[0] != '\0')
        return sm_span_is(unit, c->written);
    if (sm_unit_parse(unit.n > 0 ? unit.s : "", unit.n, &u) == SM_OK)
        return u == c->unit;
    return sm_span_is(unit, sm_unit_name(c->unit));
}

static enum sm_status read_number(const struct sm_profile *p, size_t i,
                                  const struct sm_pieces *piece, struct sm_value *v,
                                  struct sm_text *why)
{
    const struct sm_channel *c = &p->channel[i];
    const struct sm_span number = piece->value, sign = piece->sign;
    char plain[SM_DIGITS_SIZE];
    enum sm_status status;
    double sent;

    if (sign.n > 0 && !sm_span_is_sign(sign))
        return expected(p, i, c->sign_at, "+ or -", sign, why);
    if (!join_sign(sign, number, v->digits))
        return expected(p, i, c->at, "a number", number, why);
    if (!with_point(p, v->digits, plain))
        return expected(p, i, c->at, "a number with a decimal comma", number, why);
    status = sm_number_parse(plain, strlen(plain), &sent);
    if (status == SM_EVALUE || (status == SM_OK && !isfinite(sent * c->scale)))
        return expected(p, i, c->at, "a number that is not too large", number, why);
    if (status != SM_OK)
        return expected(p, i, c->at, "a number", number, why);
    v->value = sent * c->scale;
    v->step = sm_number_step(plain, strlen(plain)) * fabs(c->scale);
    if (!isfinite(v->step)) /* "0e400" */
        v->step = 0;
    if (c->has_plausible && !(v->value >= c->plausible_from && v->value <= c->plausible_to))
        v->flag = SM_FLAG_OPEN;
    return SM_OK;
}

enum sm_status sm_value_read(const struct sm_profile *p, size_t i, const struct sm_pieces *piece,
                             struct sm_value *v, struct sm_text *why)
{
    const struct sm_channel *c = &p->channel[i];
    enum sm_status status;
    const char *word;

    if (piece->value.n == 0)
        return SM_OK;
    v->present = true;
    v->flag = sm_flag_of_word(p, piece->value, &word);
    if (word != NULL) { /* beside a word some meters leave the unit out */
        sm_text_copy(v->digits, sizeof v->digits, word);
        v->value = (double)NAN;
        return SM_OK;
    }
    status = read_number(p, i, piece, v, why);
    if (status == SM_OK && piece->unit_wanted && !unit_is(c, piece->unit)) {
        char want[SM_WORD_SIZE + 8];
        struct sm_text t;

        sm_text_init(&t, want, sizeof want);
        sm_text_addf(&t, "unit %s", c->written[0] != '\0' ? c->written : sm_unit_name(c->unit));
        status = expected(p, i, c->unit_at, want, piece->unit, why);
    }
    return status;
}
