/* SPDX-License-Identifier: GPL-3.0-or-later */
/* trace.h: settle decisions over a plain recording of time and value: the same signal, fed without
 * a meter, a sheet or marks. Pure. */
#ifndef SM_SIGNAL_TRACE_H
#define SM_SIGNAL_TRACE_H
#include <stdbool.h>

#include "base/status.h"
#include "signal/rule.h"

#define SM_TRACE_TIME_MOST_S 9e9 /* either side of 0: so much fits, to the microsecond */

struct sm_trace_row { /* one capture */
    double moved_s, captured_s;
    double value, expanded_uncertainty;
    unsigned readings;
};

struct sm_trace; /* opaque */

/*   SM_EINVAL  a parameter outside its range, or a rule that is not built
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_trace_create(const struct sm_rule *rule,
                                             struct sm_trace **ret_trace);
void sm_trace_destroy(struct sm_trace *t);

/* One reading. step: what its digits imply, 0 unknown; since a table drops zeros at the end of a
 * number, the smallest step so far counts. ret_row is written when it says ret_captured.
 *   SM_EVALUE  time or value is not finite, or the time is further than SM_TRACE_TIME_MOST_S from 0
 *   SM_EORDER  earlier than the reading before */
SM_MUST_CHECK enum sm_status sm_trace_feed(struct sm_trace *t, double time_s, double value,
                                           double step, bool *ret_captured,
                                           struct sm_trace_row *ret_row);
#endif
