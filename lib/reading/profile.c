/* SPDX-License-Identifier: GPL-3.0-or-later */
/* profile.c: finding a channel of a profile. */
#include "reading/profile.h"

#include <string.h>

int sm_profile_channel(const struct sm_profile *p, const char *name)
{
    for (size_t i = 0; i < p->n_channels; i++)
        if (strcmp(p->channel[i].name, name) == 0)
            return (int)i;
    return -1;
}
