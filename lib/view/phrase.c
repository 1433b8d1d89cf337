/* SPDX-License-Identifier: GPL-3.0-or-later */
/* phrase.c: items, durations and values as a person says them. */
#include "view/phrase.h"

#include <math.h>
#include <string.h>

#include "base/number.h"
#include "base/time.h"

#define DECIMALS_MOST 6
#define PLAIN_MOST 1e9 /* what is larger is written with an exponent */

void sm_phrase_item(struct sm_text *t, const char *kind, const char *title, size_t title_n)
{
    static const char *const said[] = { "standard", "check", "blank", "sample" };

    for (size_t i = 0; i < sizeof said / sizeof said[0]; i++)
        if (strcmp(kind, said[i]) == 0)
            sm_text_addf(t, "%s ", said[i]);
    sm_text_add_safe(t, title, title_n);
}

void sm_phrase_duration(struct sm_text *t, int64_t ns)
{
    const long long s = ns > 0 ? (long long)(ns / SM_NS_PER_S) : 0;

    if (s < 120)
        sm_text_addf(t, "%lld s", s);
    else if (s < 7200)
        sm_text_addf(t, "%lld min", s / 60);
    else
        sm_text_addf(t, "%lld h %lld min", s / 3600, s % 3600 / 60);
}

static void add_number(struct sm_text *t, int decimals, double v)
{
    char digits[SM_NUMBER_SIZE];

    if (!isfinite(v))
        sm_text_add(t, "unknown");
    else if (fabs(v) < PLAIN_MOST)
        sm_text_addf(t, "%.*f", decimals, v);
    else
        sm_text_addn(t, digits, sm_number_write(digits, v));
}

static void add_unit(struct sm_text *t, const char *unit)
{
    if (unit[0] == '\0')
        return;
    sm_text_add(t, " ");
    sm_text_add_safe(t, unit, strlen(unit));
}

void sm_phrase_value(struct sm_text *t, double value, const char *unit)
{
    add_number(t, 3, value);
    add_unit(t, unit);
}

/* Decimals that show an uncertainty to two figures. */
static int decimals_for(double u95)
{
    if (!(u95 > 0) || !isfinite(u95))
        return 3;
    const double d = 1 - floor(log10(u95));

    return d < 0 ? 0 : d > DECIMALS_MOST ? DECIMALS_MOST : (int)d;
}

void sm_phrase_with_u95(struct sm_text *t, double value, double u95, const char *unit)
{
    const int decimals = decimals_for(u95);

    add_number(t, decimals, value);
    sm_text_add(t, " ± ");
    add_number(t, decimals, u95);
    add_unit(t, unit);
}
