/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ask.c: questions and whose answer a line is. At most one question is open; it is open from when
 * it is drained until its answer comes or twice its limit has passed since it was sent. */
#include "reading/ask.h"

#include "base/time.h"

static int64_t later(int64_t t_ns, int64_t by_ns)
{
    return t_ns > SM_NEVER - by_ns ? SM_NEVER : t_ns + by_ns;
}

static const struct sm_question *question(const struct sm_asker *a)
{
    return a->waiting == SM_ASK_IDENTITY ? &a->profile->identity : &a->profile->ask;
}

/* When the limit of the open question, or the further one, passes. */
static int64_t limit_t_ns(const struct sm_asker *a)
{
    const int64_t within_ns = question(a)->within_ns, first = later(a->sent_t_ns, within_ns);

    return a->late ? later(first, within_ns) : first;
}

/* What is to be asked next; NONE: nothing ever. */
static enum sm_question_kind next_kind(const struct sm_asker *a)
{
    if (!a->identity_asked && a->profile->identity.n > 0)
        return SM_ASK_IDENTITY;
    return a->profile->ask.n > 0 ? SM_ASK_READING : SM_ASK_NONE;
}

static void close_question(struct sm_asker *a)
{
    a->waiting = SM_ASK_NONE;
    a->late = false;
}

void sm_asker_init(struct sm_asker *a, const struct sm_profile *p)
{
    *a = (struct sm_asker){ .profile = p };
}

void sm_asker_link(struct sm_asker *a, int64_t t_ns, bool up)
{
    sm_asker_init(a, a->profile);
    a->up = up;
    a->due_t_ns = t_ns;
}

int64_t sm_asker_deadline(const struct sm_asker *a)
{
    if (!a->up || a->unsent)
        return SM_NEVER;
    if (a->waiting != SM_ASK_NONE)
        return limit_t_ns(a);
    return next_kind(a) != SM_ASK_NONE ? a->due_t_ns : SM_NEVER;
}

enum sm_question_kind sm_asker_tick(struct sm_asker *a, int64_t t_ns, bool *ret_timed_out)
{
    *ret_timed_out = false;
    if (!a->up || a->unsent)
        return SM_ASK_NONE;
    if (a->waiting != SM_ASK_NONE && !a->late && t_ns >= limit_t_ns(a)) {
        a->late = true;
        a->unanswered++;
        *ret_timed_out = true;
    }
    if (a->waiting != SM_ASK_NONE && a->late && t_ns >= limit_t_ns(a))
        close_question(a);
    if (a->waiting != SM_ASK_NONE || t_ns < a->due_t_ns)
        return SM_ASK_NONE;
    a->waiting = next_kind(a);
    if (a->waiting == SM_ASK_IDENTITY)
        a->identity_asked = true;
    a->unsent = a->waiting != SM_ASK_NONE;
    return a->waiting;
}

void sm_asker_sent(struct sm_asker *a, int64_t t_ns)
{
    if (!a->unsent)
        return;
    a->unsent = false;
    a->sent_t_ns = t_ns;
    /* after the identity question the first reading waits for nothing but the answer */
    a->due_t_ns = a->waiting == SM_ASK_READING ? later(t_ns, a->profile->ask.every_ns) : t_ns;
}

enum sm_answer_kind sm_asker_line(struct sm_asker *a, int64_t t_ns, int64_t first_t_ns)
{
    const enum sm_question_kind kind = a->waiting;
    const bool ours = kind != SM_ASK_NONE && !a->unsent && first_t_ns > a->sent_t_ns;

    if (!ours)
        return a->profile->ask.n == 0 ? SM_ANSWER_STREAM : SM_ANSWER_UNASKED;
    if (!a->late && t_ns >= limit_t_ns(a)) {
        a->late = true;
        a->unanswered++;
    }
    const bool late = a->late;
    close_question(a);
    if (late)
        return SM_ANSWER_LATE;
    a->unanswered = 0;
    return kind == SM_ASK_IDENTITY ? SM_ANSWER_IDENTITY : SM_ANSWER_READING;
}

bool sm_asker_open(const struct sm_asker *a)
{
    return a->waiting != SM_ASK_NONE;
}
