/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stay.c: one stay in one place. */
#include "signal/stay.h"

#include <limits.h>

void sm_stay_again(struct sm_stay *s, int64_t t_ns, int64_t bin_ns)
{
    s->anchor_t_ns = s->dwell_t_ns = s->swift_t_ns = t_ns;
    s->n = 0;
    sm_bins_begin(&s->bins, t_ns, bin_ns);
    sm_window_begin(&s->window);
}

void sm_stay_begin(struct sm_stay *s, int64_t t_ns, int64_t bin_ns)
{
    s->moved_t_ns = s->way_from_t_ns = t_ns;
    s->by = SM_MOVED_START;
    s->going = (struct sm_going){ t_ns, 0, 0 };
    s->way_open = false;
    s->way_how = SM_TRANSIT_DEPARTURES;
    s->lifts = 0;
    s->lift_t_ns = 0;
    s->lift_level = 0;
    s->captured = s->given_up = false;
    s->value = s->u95 = 0;
    sm_stay_again(s, t_ns, bin_ns);
}

void sm_stay_add(struct sm_stay *s, const struct sm_signal_reading *r, int64_t over_ns)
{
    if (s->n == 0)
        s->first_t_ns = r->t_ns;
    if (s->n < 3)
        s->first[s->n] = *r;
    if (s->n < UINT_MAX)
        s->n++;
    (void)sm_bins_add(&s->bins, r->t_ns, r->value);
    sm_window_add(&s->window, r, over_ns);
}
