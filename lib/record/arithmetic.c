/* SPDX-License-Identifier: GPL-3.0-or-later */
/* arithmetic.c: libm picks its variants by processor, so the last digit of exp or log is a property
 * of the machine. Two machines whose hashes agree are taken to compute alike. */
#include "record/arithmetic.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_version.h>
#include <math.h>
#include <string.h>

#include "record/chain.h"

#define ARGUMENTS 1000

/* The i-th of 1,000 fixed arguments in (0, 1): a low-discrepancy sequence (multiples of the golden
 * ratio's fraction, modulo 1), so that neighbours in value are no neighbours in order. */
static double argument(unsigned i)
{
    const double x = 0.61803398874989485 * (i + 1);

    return x - floor(x);
}

/* What the functions of the curve and of the signal give at x in (0, 1). */
static void add_values(struct sm_text *t, double x)
{
    const double v[] = { exp(20 * x - 10),
                         log(1000 * x),
                         pow(10 * x, 3 * x - 1.5),
                         erfc(6 * x - 1),
                         gsl_cdf_tdist_Pinv(x, 1 + floor(30 * x)),
                         gsl_cdf_fdist_Pinv(x, 1, 2 + floor(20 * x)) };

    for (size_t i = 0; i < sizeof v / sizeof v[0]; i++)
        sm_text_addf(t, "%.17g\n", v[i]);
}

void sm_arithmetic(char ret_hex[17])
{
    struct sm_hasher *h;
    char hex[SM_HASH_HEX];

    memset(ret_hex, '0', 16);
    ret_hex[16] = '\0';
    if (sm_hasher_create(&h) != SM_OK) /* agrees with nothing: replay then compares by tolerance */
        return;
    sm_hasher_add(h, gsl_version, strlen(gsl_version)); /* of the library that is running */
    for (unsigned i = 0; i < ARGUMENTS; i++) {
        char buf[256];
        struct sm_text t;

        sm_text_init(&t, buf, sizeof buf);
        add_values(&t, argument(i));
        sm_hasher_add(h, t.buf, t.len);
    }
    sm_hasher_take(h, hex);
    sm_hasher_destroy(h);
    memcpy(ret_hex, hex, 16);
}
