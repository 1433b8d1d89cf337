/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ask.h: when to put which question to a meter, and whose answer a line is. Pure: a deadline makes
 * a question, the shell sends it and says `sent`. After a time limit nothing is asked until the
 * late answer or one further limit has passed; an answer belongs to the question sent last before
 * its first byte. */
#ifndef SM_READING_ASK_H
#define SM_READING_ASK_H
#include "reading/profile.h"

enum sm_question_kind { SM_ASK_NONE, SM_ASK_IDENTITY, SM_ASK_READING };

enum sm_answer_kind {
    SM_ANSWER_STREAM,   /* the profile asks for no readings: the meter sends by itself */
    SM_ANSWER_IDENTITY, /* the answer to the identity question */
    SM_ANSWER_READING,
    SM_ANSWER_LATE,   /* to a question whose limit had passed: unread, frees the line */
    SM_ANSWER_UNASKED /* nothing was asked before its first byte: unread */
};

struct sm_asker {
    const struct sm_profile *profile;
    bool up;                       /* the link is up */
    enum sm_question_kind waiting; /* for the answer to this; NONE: for none */
    bool unsent;                   /* drained, but `sent` has not come yet */
    bool late;                     /* its limit passed; waiting one further limit */
    bool identity_asked;
    int64_t sent_t_ns, due_t_ns;
    unsigned unanswered; /* in a row */
};

void sm_asker_init(struct sm_asker *a, const struct sm_profile *p);
/* up: the port is open: the identity question (if any) is due at once, then the readings. */
void sm_asker_link(struct sm_asker *a, int64_t t_ns, bool up);
/* The next time at which sm_asker_tick may have something to do; SM_NEVER: none. */
int64_t sm_asker_deadline(const struct sm_asker *a);
/* To be called again until it gives SM_ASK_NONE. ret_timed_out: a limit passed without an answer.
 */
enum sm_question_kind sm_asker_tick(struct sm_asker *a, int64_t t_ns, bool *ret_timed_out);
void sm_asker_sent(struct sm_asker *a, int64_t t_ns);
/* A whole line came: whose is it? An answer's first byte comes after its question was sent: bytes
 * with the very time of `sent` were there before it. A meter that sends by itself may have a
 * reading on the wire when it is asked who it is: of such a profile call this only for a line that
 * is no reading. */
enum sm_answer_kind sm_asker_line(struct sm_asker *a, int64_t t_ns, int64_t first_t_ns);
/* A question is open: sent or about to be, its answer still possible (a file is not changed now).
 */
bool sm_asker_open(const struct sm_asker *a);
#endif
