/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

void check_close(const char *what, double got, double want, double tol)
{
    if (!(fabs(got - want) <= tol)) /* written so that NaN fails */
        fail_msg("%s: got %.17g, want %.17g +- %.2g", what, got, want, tol);
}

void check_digits(const char *what, double got, double want, double digits)
{
    const double off = fabs(got - want);
    const double have = off > 0 ? -log10(off / fabs(want)) : 17.0;

    if (!(have >= digits))
        fail_msg("%s: got %.17g, want %.17g: %.1f digits agree, need %.1f", what, got, want, have,
                 digits);
}

char *check_read_file(const char *path_from_source_dir, size_t *ret_n)
{
    char path[1024];
    FILE *f;
    char *text = NULL;
    long size = -1;

    snprintf(path, sizeof path, "%s/%s", SM_SOURCE_DIR, path_from_source_dir);
    f = fopen(path, "rb");
    if (f == NULL || fseek(f, 0, SEEK_END) != 0 || (size = ftell(f)) < 0 ||
        fseek(f, 0, SEEK_SET) != 0)
        fail_msg("cannot read %s", path);
    text = malloc((size_t)size + 1);
    if (text == NULL || fread(text, 1, (size_t)size, f) != (size_t)size)
        fail_msg("cannot read %s", path);
    text[size] = '\0';
    fclose(f);
    if (ret_n != NULL)
        *ret_n = (size_t)size;
    return text;
}
