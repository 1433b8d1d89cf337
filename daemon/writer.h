/* SPDX-License-Identifier: GPL-3.0-or-later */
/* writer.h: one thread per meter that does all the slow work on its log: reading what to begin
 * from, writing groups whole and syncing them. Jobs are done in the order they were given; what
 * became of each is fetched when the descriptor is readable. A slow or dead disk stalls nothing but
 * this meter's log. */
#ifndef SM_DAEMON_WRITER_H
#define SM_DAEMON_WRITER_H
#include "folder.h"
#include "group.h"

struct sm_writer;

enum sm_done_kind { SM_DONE_RECOVER, SM_DONE_GROUP };

struct sm_done {
    enum sm_done_kind kind;
    uint64_t epoch;
    bool good;
    struct sm_group *group;         /* GROUP: given back, yours */
    struct sm_beginning *beginning; /* RECOVER and good: yours */
    char why[SM_WHY_SIZE];          /* not good: what failed */
};

/* The folder is lent, and used by this thread alone from now on.
 *   SM_ENOMEM, SM_EIO (no thread, no descriptor) */
SM_MUST_CHECK enum sm_status sm_writer_create(struct sm_folder *folder, struct sm_writer **ret);

/* Readable when something is done. */
int sm_writer_fd(const struct sm_writer *w);

/* Leaves the open file as it is and finds what the next one begins from. SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_writer_recover(struct sm_writer *w, uint64_t epoch);

/* Takes the group over (not on SM_ENOMEM). Once one of an epoch has failed, the later ones of that
 * epoch fail too. */
SM_MUST_CHECK enum sm_status sm_writer_group(struct sm_writer *w, struct sm_group *g);

/* Groups of earlier epochs are not written any more (the one being written is not stopped). */
void sm_writer_abandon(struct sm_writer *w, uint64_t before_epoch);

/* What was done next; false: nothing more. Call until false. */
bool sm_writer_next(struct sm_writer *w, struct sm_done *ret_done);

/* Ends the thread when it has done all it was given, and frees all. NULL is fine. */
void sm_writer_destroy(struct sm_writer *w);
#endif
