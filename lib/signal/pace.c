/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pace.c: the time constants of the front end, taken from the dwell. */
#include "signal/pace.h"

#include <assert.h>

#include "base/time.h"

#define FOUND_AT_NS (22 * SM_NS_PER_S) /* the dwell at which the constants were found */
#define LEAST_NS SM_NS_PER_MS          /* widths are divided by */

static int64_t least(int64_t a, int64_t b)
{
    return a < b ? a : b;
}

static int64_t most(int64_t a, int64_t b)
{
    return a > b ? a : b;
}

/* at_ns at the dwell where it was found, the same share of a shorter one. */
static int64_t share(int64_t at_ns, int64_t dwell_ns)
{
    const int64_t dwell_ms = least(dwell_ns, FOUND_AT_NS) / SM_NS_PER_MS;

    return at_ns / (FOUND_AT_NS / SM_NS_PER_MS) * dwell_ms;
}

struct sm_pace sm_pace_of(int64_t dwell_ns)
{
    struct sm_pace p;

    assert(dwell_ns >= 0);
    p.dwell_ns = dwell_ns;
    p.odd_ns = share(1 * SM_NS_PER_S, dwell_ns);
    p.grow_ns = most(share(5 * SM_NS_PER_S, dwell_ns), LEAST_NS);
    p.block_ns = most(least(SM_NS_PER_S, dwell_ns / 6), LEAST_NS);
    p.bin_ns = most(share(SM_NS_PER_S / 2, dwell_ns), LEAST_NS);
    p.worth_ns = share(6 * SM_NS_PER_S, dwell_ns);
    p.lift_ns = least(10 * SM_NS_PER_S, dwell_ns / 2);
    p.calm_ns = least(2 * SM_NS_PER_S, dwell_ns / 4);
    p.away_ns = share(3 * SM_NS_PER_S, dwell_ns);
    return p;
}
