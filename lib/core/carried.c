/* SPDX-License-Identifier: GPL-3.0-or-later */
/* carried.c: what outlives an immersion, and what an interruption does to it. */
#include "core/carried.h"

#include <assert.h>
#include <string.h>

void sm_carried_init(struct sm_carried *c)
{
    memset(c, 0, sizeof *c);
}

void sm_carried_interrupt(struct sm_carried *c)
{
    c->last.place = SM_AT_UNKNOWN;
    c->run.open = false;
    if (c->run.has && c->run.next < c->run.n_items)
        c->run.left = true; /* it may have been in it, or be in it now: only a mark tells */
}

/* Ages stop growing long before they could overflow. */
static void add_age(int64_t *age_ns, int64_t ns)
{
    *age_ns = *age_ns > INT64_MAX - ns ? INT64_MAX : *age_ns + ns;
}

void sm_carried_age(struct sm_carried *c, int64_t ns)
{
    assert(ns >= 0);
    if (c->curve.has)
        add_age(&c->curve.age_ns, ns);
    if (c->rest.has)
        add_age(&c->rest.age_ns, ns);
    if (c->temperature.has)
        add_age(&c->temperature.age_ns, ns);
}
