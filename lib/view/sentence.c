/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sentence.c: states told to a person. */
#include "view/sentence.h"

#include <string.h>

#include "view/phrase.h"

static void safe(struct sm_text *t, const char *name)
{
    sm_text_add_safe(t, name, strlen(name));
}

static void whereabouts(struct sm_text *t, const struct sm_whereabouts *w)
{
    sm_phrase_item(t, sm_item_kind_name(w->kind), w->name, strlen(w->name));
}

static void state_sentence(const struct sm_core_status *s, int64_t for_ns, struct sm_text *t)
{
    switch (s->state) {
    case SM_STATE_NO_LINK:
        sm_text_add(t, "No link to the meter: check its cable and power.");
        break;
    case SM_STATE_SILENT:
        sm_text_add(t, "The meter has said nothing for ");
        sm_phrase_duration(t, for_ns);
        sm_text_add(t, ": check that it is on and sending.");
        break;
    case SM_STATE_WAITING:
        sm_text_add(t, "Waiting for readings.");
        break;
    case SM_STATE_OPEN:
        sm_text_add(t, "The probe is in air.");
        break;
    case SM_STATE_SETTLING:
    case SM_STATE_NOT_SETTLED:
        sm_text_add(t, s->state == SM_STATE_SETTLING ? "Settling" : "Not settled");
        if (s->now.has) {
            sm_text_add(t, " in ");
            whereabouts(t, &s->now);
        }
        sm_text_add(t, " for ");
        sm_phrase_duration(t, for_ns);
        sm_text_add(t, s->state == SM_STATE_SETTLING
                           ? "."
                           : ": no value is taken. Measure it again, or skip it with a reason.");
        break;
    case SM_STATE_SETTLED:
        sm_text_add(t, "Settled: ");
        safe(t, s->last.name);
        sm_text_add(t, " ");
        sm_phrase_with_u95(t, s->last.value, s->last.u95, sm_unit_name(s->signal_unit));
        sm_text_add(t, ". The probe may be moved.");
        break;
    case SM_STATE_RESTING:
        sm_text_add(t, "Resting for ");
        sm_phrase_duration(t, for_ns);
        sm_text_add(t, ": nothing is captured until resumed.");
        break;
    }
}

static void sheet_sentence(const struct sm_core_status *s, struct sm_text *t)
{
    if (!s->has_sheet) {
        sm_text_add(t, " No bench sheet: what settles is captured and numbered.");
        return;
    }
    if (s->sheet_done)
        sm_text_addf(t, " The sheet is done, %zu of %zu items measured.", s->measured, s->items);
    else if (s->next.has) {
        sm_text_add(t, " Next: ");
        whereabouts(t, &s->next);
        sm_text_addf(t, " (%zu of %zu measured).", s->measured, s->items);
    }
}

void sm_sentence(const struct sm_core_status *s, int64_t now_t_ns, struct sm_text *t)
{
    state_sentence(s, now_t_ns - s->since_t_ns, t);
    sheet_sentence(s, t);
    if (s->curve_refused)
        sm_text_add(t, " The calibration curve was refused: pour fresh standards and hand the "
                       "sheet over again.");
    if (s->questions > 0)
        sm_text_add(t,
                    " It is not certain which beaker the probe is in: press next when it is in the "
                    "next item.");
    if (s->held > 0)
        sm_text_addf(t, " %zu result%s held.", s->held, s->held == 1 ? " is" : "s are");
    if (s->provisional > 0)
        sm_text_addf(t, " %zu result%s for a check.", s->provisional,
                     s->provisional == 1 ? " waits" : "s wait");
}
