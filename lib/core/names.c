/* SPDX-License-Identifier: GPL-3.0-or-later */
/* names.c: the words of inputs, acts, events and states, as they stand in the bench log. */
#include "core/core.h"

#include <string.h>

static const char *const inputs[SM_INPUT_COUNT] = { "bytes", "act",  "tick", "link",
                                                    "clock", "sent", "roll" };

static const struct {
    const char *name;
    bool built;
} acts[SM_ACT_COUNT] = {
    [SM_ACT_SHEET] = { "sheet", true },
    [SM_ACT_NEXT] = { "next", true },
    [SM_ACT_REDO] = { "redo", false },
    [SM_ACT_SKIP] = { "skip", true },
    [SM_ACT_TAKE] = { "take", false },
    [SM_ACT_VOID] = { "void", false },
    [SM_ACT_NAME] = { "name", false },
    [SM_ACT_NOTE] = { "note", true },
    [SM_ACT_CONFIRM] = { "confirm", false },
    [SM_ACT_INSERT] = { "insert", false },
    [SM_ACT_PAUSE] = { "pause", true },
    [SM_ACT_RESUME] = { "resume", true },
    [SM_ACT_TEMPERATURE] = { "temperature", true },
    [SM_ACT_ANALYST] = { "analyst", true },
    [SM_ACT_AMEND] = { "amend", false },
    [SM_ACT_DROP] = { "drop", false },
    [SM_ACT_ACCEPT] = { "accept", false },
    [SM_ACT_REORDER] = { "reorder", false },
    [SM_ACT_ENTER] = { "enter", false },
    [SM_ACT_SENSOR] = { "sensor", false },
    [SM_ACT_SIGN] = { "sign", false },
    [SM_ACT_END] = { "end", false },
};

static const struct {
    const char *name;
    enum sm_event_class class;
} events[SM_EVENT_COUNT] = {
    [SM_EVENT_CAPTURE] = { "capture", SM_DURABLE },
    [SM_EVENT_CURVE] = { "curve", SM_DURABLE },
    [SM_EVENT_CHECK] = { "check", SM_DURABLE },
    [SM_EVENT_RESULT] = { "result", SM_DURABLE },
    [SM_EVENT_HOLD] = { "hold", SM_DURABLE },
    [SM_EVENT_RELEASE] = { "release", SM_DURABLE },
    [SM_EVENT_QUESTION] = { "question", SM_DURABLE },
    [SM_EVENT_ANSWER] = { "answer", SM_DURABLE },
    [SM_EVENT_MOVED] = { "moved", SM_LOGGED },
    [SM_EVENT_TRANSIT] = { "transit", SM_LOGGED },
    [SM_EVENT_NOT_SETTLED] = { "not-settled", SM_LOGGED },
    [SM_EVENT_OPEN_CIRCUIT] = { "open-circuit", SM_LOGGED },
    [SM_EVENT_SILENT] = { "silent", SM_LOGGED },
    [SM_EVENT_UNREAD] = { "unread", SM_LOGGED },
    [SM_EVENT_ASK] = { "ask", SM_LOGGED },
    [SM_EVENT_CARRIED] = { "carried", SM_LOGGED },
    [SM_EVENT_READING] = { "reading", SM_LIVE },
    [SM_EVENT_SETTLING] = { "settling", SM_LIVE },
};

const char *sm_input_kind_name(enum sm_input_kind k)
{
    return inputs[k];
}

const char *sm_act_name(enum sm_act_kind a)
{
    return acts[a].name;
}

bool sm_act_known(const char *name, enum sm_act_kind *ret_act)
{
    for (int a = 0; a < SM_ACT_COUNT; a++) {
        if (strcmp(name, acts[a].name) == 0) {
            *ret_act = (enum sm_act_kind)a;
            return true;
        }
    }
    return false;
}

bool sm_act_built(enum sm_act_kind a)
{
    return acts[a].built;
}

const char *sm_event_kind_name(enum sm_event_kind k)
{
    return events[k].name;
}

enum sm_event_class sm_event_class(enum sm_event_kind k)
{
    return events[k].class;
}

const char *sm_link_state_name(enum sm_link_state s)
{
    static const char *const names[] = { "up", "lost", "refused" };

    return names[s];
}

const char *sm_clock_what_name(enum sm_clock_what w)
{
    static const char *const names[] = { "jump", "suspend" };

    return names[w];
}

const char *sm_place_name(enum sm_place p)
{
    static const char *const names[] = { "unknown", "still in it", "left" };

    return names[p];
}

const char *sm_bench_state_name(enum sm_bench_state s)
{
    static const char *const names[] = { "no link",  "silent",  "waiting",     "open circuit",
                                         "settling", "settled", "not settled", "resting" };

    return names[s];
}
