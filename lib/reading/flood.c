/* SPDX-License-Identifier: GPL-3.0-or-later */
/* flood.c: ten unread lines a minute in full, the others as a count. */
#include "reading/flood.h"

#include "base/time.h"

void sm_flood_init(struct sm_flood *f)
{
    *f = (struct sm_flood){ 0 };
}

static int64_t end_of_minute(const struct sm_flood *f)
{
    if (f->begun_t_ns > SM_NEVER - SM_FLOOD_WINDOW_NS)
        return SM_NEVER;
    return f->begun_t_ns + SM_FLOOD_WINDOW_NS;
}

bool sm_flood_line(struct sm_flood *f, int64_t t_ns)
{
    if (!f->begun || t_ns >= end_of_minute(f)) {
        f->begun = true;
        f->begun_t_ns = t_ns;
        f->lines = 0;
    }
    if (f->lines < SM_FLOOD_LINES) {
        f->lines++;
        return true;
    }
    if (f->passed_over == 0)
        f->due_t_ns = end_of_minute(f);
    f->passed_over++;
    return false;
}

int64_t sm_flood_deadline(const struct sm_flood *f)
{
    return f->passed_over > 0 ? f->due_t_ns : SM_NEVER;
}

bool sm_flood_tick(struct sm_flood *f, int64_t t_ns, uint64_t *ret_count)
{
    return f->passed_over > 0 && t_ns >= f->due_t_ns && sm_flood_end(f, ret_count);
}

bool sm_flood_end(struct sm_flood *f, uint64_t *ret_count)
{
    if (f->passed_over == 0)
        return false;
    *ret_count = f->passed_over;
    f->passed_over = 0;
    return true;
}
