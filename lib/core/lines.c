/* SPDX-License-Identifier: GPL-3.0-or-later */
/* lines.c: from the link and its lines to readings for the signal. */
#include "core/inside.h"

#include <string.h>

/* A line that gave no reading: kept, counted and visible; in full only ten a minute. */
static void unread(struct sm_core *c, const struct sm_line *line, const char *why)
{
    struct sm_event_unread *u;

    c->unread++;
    if (!sm_flood_line(&c->flood, c->in.t_ns))
        return;
    u = &sm_core_push(c, SM_EVENT_UNREAD)->u.unread;
    u->kind = line->kind;
    u->n = line->n;
    u->length = line->length;
    memcpy(u->line, line->bytes, line->n);
    sm_text_copy(u->why, sizeof u->why, why);
}

/* Why a line that is not whole cannot be read; NULL: it is whole. */
static const char *not_whole(enum sm_line_kind kind)
{
    switch (kind) {
    case SM_LINE_WHOLE:
        return NULL;
    case SM_LINE_FIRST:
        return "the end of a line that began before the port was opened";
    case SM_LINE_OVERLONG:
        return "longer than any line may be: check baud rate and terminator";
    case SM_LINE_BAD:
        return "a byte came with a parity or framing error: check baud rate, parity and bits";
    case SM_LINE_BREAK:
        return "a break on the line";
    case SM_LINE_CUT:
        return "the link ended in the middle of the line";
    }
    return "not whole";
}

static void identity(struct sm_core *c, const struct sm_line *line)
{
    struct sm_text t;

    sm_text_init(&t, c->now->meter.identity, sizeof c->now->meter.identity);
    sm_text_add_safe(&t, line->bytes, line->n);
}

/* A mark from the meter's own key: the probe is now in the next item. */
static void meter_mark(struct sm_core *c, const struct sm_reading *r)
{
    struct sm_signal_input mark = { .kind = SM_SIGNAL_MARK,
                                    .t_ns = c->in.t_ns,
                                    .class = SM_CLASS_SAMPLE };

    c->mark_of = 0;
    c->held_reading = *r;
    c->stage = SM_STAGE_READING;
    (void)!sm_signal_feed(c->signal, &mark);
}

/* Why a whole line gave no reading although the meter was asked, or because it was not; NULL: it
 * may be read. *ret_identity: it is the answer to the identity question. */
static const char *not_ours(struct sm_core *c, const struct sm_line *line, bool *ret_identity)
{
    switch (sm_asker_line(&c->asker, c->in.t_ns, line->first_t_ns)) {
    case SM_ANSWER_IDENTITY:
        *ret_identity = true;
        return NULL;
    case SM_ANSWER_LATE:
        return "the answer came after its time limit";
    case SM_ANSWER_UNASKED:
        return "nothing was asked before it";
    case SM_ANSWER_STREAM:
    case SM_ANSWER_READING:
        break;
    }
    return NULL;
}

void sm_core_line(struct sm_core *c, const struct sm_line *line)
{
    const char *why_not = not_whole(line->kind), *not_taken = NULL;
    const bool asks = c->setup->profile->ask.n > 0;
    struct sm_reading r;
    char why[SM_REASON_SIZE];
    bool mark = false, is_identity = false;

    if (why_not == NULL &&
        sm_parser_read(c->parser, line->t_ns, line->bytes, line->n, &r, &mark, why) != SM_OK)
        why_not = why;
    /* A meter that sends by itself may send a reading before it answers who it is. */
    if (line->kind != SM_LINE_CUT && line->kind != SM_LINE_FIRST && (asks || why_not != NULL))
        not_taken = not_ours(c, line, &is_identity);
    if (is_identity && line->kind == SM_LINE_WHOLE) {
        identity(c, line);
        return;
    }
    if (not_taken != NULL)
        why_not = not_taken;
    if (why_not != NULL)
        unread(c, line, why_not);
    else if (mark)
        meter_mark(c, &r);
    else
        sm_core_reading(c, &r);
}

static bool is_air(const struct sm_core *c, const struct sm_value *v)
{
    const struct sm_rule *r = &c->method->rule;

    if (v->flag != SM_FLAG_OK)
        return v->flag != SM_FLAG_UNUSABLE || c->in_air;
    return r->has_plausible && (v->value < r->plausible_from || v->value > r->plausible_to);
}

void sm_core_reading(struct sm_core *c, const struct sm_reading *r)
{
    struct sm_signal_input in;
    const struct sm_value *v = &r->channel[c->signal_at];
    size_t o = 0;

    c->silent = false;
    c->last_reading_t_ns = c->in.t_ns;
    sm_core_push(c, SM_EVENT_READING)->u.reading = *r;
    for (size_t i = 0; i < r->n; i++) {
        if (r->channel[i].present && r->channel[i].flag == SM_FLAG_OK) {
            c->latest[i].has = true;
            c->latest[i].value = r->channel[i].value;
            c->latest[i].t_ns = c->in.t_ns;
        }
    }
    if (!v->present)
        return;
    memset(&in, 0, sizeof in);
    in.kind = SM_SIGNAL_READING;
    in.t_ns = c->in.t_ns;
    in.reading.t_ns = c->in.t_ns;
    in.reading.value = v->value;
    in.reading.step = v->step;
    in.reading.flag = v->flag;
    c->in_air = is_air(c, v);
    for (size_t i = 0; i < r->n; i++) {
        if ((int)i == c->signal_at)
            continue;
        in.reading.other[o].present = c->latest[i].has;
        in.reading.other[o].value = c->latest[i].value;
        in.reading.other[o].age_ns = c->in.t_ns - c->latest[i].t_ns;
        o++;
    }
    (void)!sm_signal_feed(c->signal, &in); /* drained, in order and finite: it cannot fail */
}

void sm_core_ask(struct sm_core *c, enum sm_question_kind kind)
{
    const struct sm_profile *p = c->setup->profile;
    const struct sm_question *q = kind == SM_ASK_IDENTITY ? &p->identity : &p->ask;
    struct sm_event_ask *a = &sm_core_push(c, SM_EVENT_ASK)->u.ask;

    memcpy(a->text, q->text, q->n);
    a->n = q->n;
    a->identity = kind == SM_ASK_IDENTITY;
}

void sm_core_check_silence(struct sm_core *c)
{
    const int64_t since = c->last_reading_t_ns == SM_NEVER ? c->link_t_ns : c->last_reading_t_ns;

    if (!c->link_up || c->silent || c->setup->silence_ns <= 0 ||
        c->in.t_ns - since < c->setup->silence_ns || c->stage == SM_STAGE_READING)
        return; /* READING: one has just come with a mark, it waits */
    c->silent = true;
    sm_core_push(c, SM_EVENT_SILENT)->u.silent.last_line_t_ns = c->last_reading_t_ns;
    sm_core_signal_end(c, "the meter fell silent");
    sm_core_lost_track(c);
}

static void link_up(struct sm_core *c, const struct sm_link *link)
{
    const bool asks = c->setup->profile->ask.n > 0;

    c->link_up = true;
    c->silent = false;
    c->link_t_ns = c->in.t_ns;
    c->last_reading_t_ns = SM_NEVER;
    sm_framer_init(&c->framer, &c->setup->profile->framing, !asks && !link->continues);
    sm_asker_link(&c->asker, c->in.t_ns, true);
    if (link->settings[0] != '\0')
        sm_text_copy(c->now->meter.settings, sizeof c->now->meter.settings, link->settings);
    if (link->identity[0] != '\0' && strcmp(link->identity, c->now->meter.adapter) != 0) {
        sm_text_copy(c->now->meter.adapter, sizeof c->now->meter.adapter, link->identity);
        c->dirty = true; /* after a restart, too, another one is noticed */
    }
}

void sm_core_link(struct sm_core *c, const struct sm_link *link)
{
    struct sm_line line;

    if (link->state == SM_LINK_UP) {
        link_up(c, link);
        return;
    }
    if (link->state == SM_LINK_REFUSED || !c->link_up)
        return;
    c->link_up = false;
    if (sm_framer_end(&c->framer, c->in.t_ns, &line))
        sm_core_line(c, &line);
    sm_asker_link(&c->asker, c->in.t_ns, false);
    memset(c->latest, 0, sizeof c->latest);
    sm_core_signal_end(c, "the link to the meter was lost");
    sm_core_lost_track(c);
    c->dirty = true;
}
