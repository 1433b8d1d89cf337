/* SPDX-License-Identifier: GPL-3.0-or-later */
/* folder.h: the folder LOGS/METER of one meter's bench log: held by one daemon, its files in order,
 * what the next file begins from, and the making of it. Used by one thread at a time. */
#ifndef SM_DAEMON_FOLDER_H
#define SM_DAEMON_FOLDER_H
#include "door.h"
#include "group.h"
#include "record/recover.h"

#define SM_FOLDER_SIZE 512
#define SM_WHY_SIZE 512

struct sm_folder {
    const struct sm_door *door;
    char path[SM_FOLDER_SIZE];
    int lock_fd; /* -1: not held */
    dev_t lock_dev;
    ino_t lock_ino;
};

void sm_folder_init(struct sm_folder *f, const struct sm_door *door, const char *logs,
                    const char *meter);

/* Makes the folder and holds its lock; again and again is fine (a folder that was taken away and
 * put back, or replaced by another, is held anew). One that was held before and is gone is not made
 * again: it may come back, or its disk may be missing.
 *   SM_EBUSY  another daemon has it
 *   SM_EIO    it cannot be made or locked, or is gone: ret_why */
SM_MUST_CHECK enum sm_status sm_folder_hold(struct sm_folder *f, char ret_why[SM_WHY_SIZE]);
void sm_folder_let_go(struct sm_folder *f);

/* Is there any log file in it? (A folder that cannot be read counts as none.) */
bool sm_folder_has_logs(const struct sm_folder *f);

/* What the next file begins from. Heap. */
struct sm_beginning {
    int64_t ordinal; /* of the file to be begun */
    int64_t next_n;  /* its first number */
    struct {
        bool has;
        int64_t ordinal;
        char stamp[SM_HASH_HEX]; /* "" none */
        int64_t after_lines, after_bytes;
    } previous;
    bool has_state; /* an earlier file gave state */
    struct sm_recovered state;
    char damage[SM_WHY_SIZE]; /* what was wrong with earlier files, in words; "" nothing */
};

/* Reads the newest file, and older ones as long as there is no stamped `open`.
 *   SM_EIO     the folder or a file cannot be read: ret_why
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_folder_recover(const struct sm_folder *f,
                                               struct sm_beginning **ret_beginning,
                                               char ret_why[SM_WHY_SIZE]);
void sm_beginning_destroy(struct sm_beginning *b);

/* "000412_2026-12-01T081203Z.jsonl" */
void sm_file_name(char out[SM_FILE_NAME_SIZE], int64_t ordinal, int64_t utc_us);
/* Its ordinal; -1: no such name. */
int64_t sm_file_ordinal(const char *name);

/* Is the file that is open at fd the one that has this name? 0; -ENOENT: it was moved or deleted,
 * or its folder was; another -errno. */
int sm_folder_has_file(const struct sm_folder *f, const char *name, int fd);

/* A new file lies beside its name, "NAME.new", until its first group is on disk: then it is shown
 * under its name. So a file always has a stamped `open`, and a disk that takes nothing is not
 * filled with empty files. Both give -errno. */
int sm_folder_begin_file(const struct sm_folder *f, const char *name); /* the descriptor */
int sm_folder_show_file(const struct sm_folder *f, const char *name);  /* and syncs the folder */
void sm_folder_drop_file(const struct sm_folder *f, const char *name); /* not shown yet */
#endif
