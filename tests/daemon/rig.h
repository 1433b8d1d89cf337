/* SPDX-License-Identifier: GPL-3.0-or-later */
/* rig.h: one meter of the daemon on a pseudo-terminal, under a clock that the test moves, with all
 * that it tells kept. The setup is invented. */
#ifndef SM_TEST_RIG_H
#define SM_TEST_RIG_H
#include "scratch.h"

#include "base/time.h"
#include "door_fail.h"
#include "hub.h"
#include "meter.h"
#include "record/chain.h"

#define RIG_UTC_US INT64_C(1796112723000000) /* 2026-12-01T08:12:03Z */

struct rig {
    struct scratch scratch;
    struct sm_setup *setup;
    struct sm_signer *signer;
    struct sm_door_fail door;
    struct sm_meter *meter;
    struct sm_hub *hub; /* told as well; NULL none */
    struct sm_now now;
    int master;  /* the meter's end of the line; -1: unplugged */
    int watched; /* what is to be watched; -1 none */
    char folder[128];
    /* what was told */
    char *told; /* lines shown, one after the other */
    size_t told_n;
    char *live;
    size_t live_n;
    int64_t answered; /* the act answered last */
    char answer[1024];
    unsigned lost;
    char lost_why[512];
};

/* asks: the profile asks "R\r" every second; else the meter sends by itself. */
void rig_make(struct rig *r, bool asks);
void rig_remove(struct rig *r);

void rig_start(struct rig *r); /* the meter is created and begun, and the log open if it can be */
bool rig_try_start(struct rig *r); /* false: it could not be created, and a sentence said why */
void rig_stop(struct rig *r);      /* closed and destroyed, whatever is under way */
void rig_kill(struct rig *r);      /* destroyed without closing, as kill -9 would */

void rig_pass(struct rig *r,
              int64_t ns); /* time passes; the meter is woken where it asked for it */
void rig_send(struct rig *r, const char *text); /* the meter sends; all is read */
void rig_settle(struct rig *r);                 /* until the writer has done all it was given */
int64_t rig_act(struct rig *r, const char *name, const char *id, const char *text); /* 0: refused */
void rig_unplug(struct rig *r);
void rig_plug(struct rig *r);

unsigned rig_count(const char *text, const char *what); /* how often */
/* Every file verifies, each begins with what the one before ended with; how many files. */
size_t rig_verify(const struct rig *r);
/* All files' text, one after the other; the caller frees it. */
char *rig_log(const struct rig *r);
/* Every line that was shown and is durable is in the log, whole and under a stamp. */
void rig_nothing_announced_is_lost(const struct rig *r, const char *what);
#endif
