/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fuzz_parse.c: the parser under any line. The first byte chooses a profile, the rest is the line.
 * Checked: a reading has only finite numbers within what its profile says, with digits and a step;
 * a line read twice reads the same; what is no reading leaves everything untouched and says why.
 * One choice is hostile: the first half of the rest is the pattern for its second half. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "reading/parse.h"
#include "reading/shapes.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define CHECK(what)                                                                                \
    do {                                                                                           \
        if (!(what)) {                                                                             \
            fprintf(stderr, "%s:%d: broken: %s\n", __FILE__, __LINE__, #what);                     \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

static void check_value(const struct sm_channel *c, const struct sm_value *v)
{
    CHECK(v->flag >= SM_FLAG_OK && v->flag <= SM_FLAG_UNUSABLE);
    CHECK(memchr(v->digits, '\0', sizeof v->digits) != NULL);
    CHECK(sm_utf8_span(v->digits, strlen(v->digits)) == strlen(v->digits));
    CHECK(v->digits[0] != '\0');
    CHECK(isfinite(v->step) && v->step >= 0);
    if (v->flag != SM_FLAG_OK)
        return;
    CHECK(isfinite(v->value));
    CHECK(strpbrk(v->digits, "0123456789") != NULL);
    if (c->has_plausible)
        CHECK(v->value >= c->plausible_from && v->value <= c->plausible_to);
}

static void check_line(struct sm_parser *p, const struct sm_profile *profile, const char *line,
                       size_t n)
{
    struct sm_reading r, again;
    char why[SM_REASON_SIZE] = "";
    bool mark = false, present = false;

    memset(&r, 0x5a, sizeof r);
    memset(&again, 0x5a, sizeof again);
    const enum sm_status status = sm_parser_read(p, 5, line, n, &r, &mark, why);
    if (status != SM_OK) {
        CHECK(status == SM_ESYNTAX && why[0] != '\0' && strlen(why) < sizeof why);
        for (size_t i = 0; i < sizeof r; i++) /* untouched, its padding too */
            CHECK(((const unsigned char *)&r)[i] == 0x5a);
        for (const char *s = why; *s != '\0'; s++)
            CHECK((unsigned char)*s >= 0x20 && *s != 0x7f);
        return;
    }
    CHECK(r.t_ns == 5 && r.n == profile->n_channels);
    for (size_t i = 0; i < r.n; i++)
        if (r.channel[i].present) {
            check_value(&profile->channel[i], &r.channel[i]);
            present = true;
        }
    CHECK(present);
    CHECK(sm_parser_read(p, 5, line, n, &again, &mark, why) == SM_OK);
    for (size_t i = 0; i < r.n; i++)
        CHECK(memcmp(r.channel[i].digits, again.channel[i].digits, SM_DIGITS_SIZE) == 0 &&
              r.channel[i].flag == again.channel[i].flag);
}

static void hostile_pattern(const char *bytes, size_t n)
{
    struct sm_profile profile;
    struct sm_parser *p;
    char why[SM_REASON_SIZE] = "", pattern[SM_PATTERN_SIZE];
    const size_t half = n / 2;
    struct sm_text t;

    memset(&profile, 0, sizeof profile);
    sm_text_init(&t, pattern, sizeof pattern);
    sm_text_addn(&t, bytes, half);
    memcpy(profile.pattern, pattern, sizeof pattern);
    profile.split = SM_SPLIT_PATTERN;
    shape_channel(&profile, "v", SM_UNIT_NONE, "", 0, 0);
    if (sm_parser_create(&profile, &p, why) != SM_OK) {
        CHECK(why[0] != '\0');
        return;
    }
    check_line(p, &profile, bytes + half, n - half);
    sm_parser_destroy(p);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    static struct sm_profile profile[SHAPES];
    static struct sm_parser *parser[SHAPES];
    char why[SM_REASON_SIZE];

    if (size < 1)
        return 0;
    const char *line = (const char *)data + 1;
    const size_t which = data[0] % (SHAPES + 1);
    if (which == SHAPES) {
        hostile_pattern(line, size - 1);
        return 0;
    }
    if (parser[which] == NULL) { /* kept: a fuzz target has no end */
        shape(&profile[which], which);
        CHECK(sm_parser_create(&profile[which], &parser[which], why) == SM_OK);
    }
    check_line(parser[which], &profile[which], line, size - 1);
    return 0;
}
