/* SPDX-License-Identifier: GPL-3.0-or-later */
/* writer.c: the thread, its queue of jobs, and the queue of what is done. The queues are shared
 * under one lock; the file and the folder belong to the thread. */
#include "writer.h"

#include <errno.h>
#include <pthread.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/eventfd.h>
#include <unistd.h>

struct job { /* to do, then done */
    struct job *next;
    struct sm_done done;
};

struct queue {
    struct job *first, **last;
};

struct sm_writer {
    pthread_t thread;
    pthread_mutex_t lock;
    pthread_cond_t wake;
    int event_fd;
    struct queue todo, done; /* under lock */
    uint64_t from_epoch;     /* under lock */
    bool ending;             /* under lock */
    /* the thread's own */
    struct sm_folder *folder;
    int fd;                       /* -1: no file open */
    char file[SM_FILE_NAME_SIZE]; /* its name */
    char name[SM_FILE_NAME_SIZE]; /* the same while it is not shown yet; "" shown */
    uint64_t bad_epoch;           /* this one has failed */
    char bad_why[SM_WHY_SIZE];
};

static void queue_init(struct queue *q)
{
    q->first = NULL;
    q->last = &q->first;
}

static void put(struct queue *q, struct job *j)
{
    j->next = NULL;
    *q->last = j;
    q->last = &j->next;
}

static struct job *take(struct queue *q)
{
    struct job *j = q->first;

    if (j == NULL)
        return NULL;
    q->first = j->next;
    if (q->first == NULL)
        q->last = &q->first;
    return j;
}

static void leave_file(struct sm_writer *w)
{
    if (w->fd >= 0)
        (void)w->folder->door->close(w->folder->door, w->fd);
    w->fd = -1;
    if (w->name[0] != '\0')
        sm_folder_drop_file(w->folder, w->name);
    w->name[0] = '\0';
}

/* Never a second attempt on the same descriptor: after a failed sync the kernel may call pages
 * clean that never reached the disk. 0 or -errno; *ret_what names the step. */
static int write_group(struct sm_writer *w, const struct sm_group *g, const char **ret_what)
{
    const struct sm_door *door = w->folder->door;
    ssize_t r;

    if (g->begins[0] != '\0') {
        leave_file(w);
        *ret_what = "a new file cannot be made";
        w->fd = sm_folder_begin_file(w->folder, g->begins);
        if (w->fd < 0)
            return w->fd;
        snprintf(w->name, sizeof w->name, "%s", g->begins);
        snprintf(w->file, sizeof w->file, "%s", g->begins);
    }
    *ret_what = "writing failed";
    if (w->fd < 0)
        return -EBADF;
    if (g->begins[0] == '\0') {
        *ret_what = "the file is not in its folder any more";
        r = sm_folder_has_file(w->folder, w->file, w->fd);
        if (r < 0)
            return (int)r;
        *ret_what = "writing failed";
    }
    r = door->write(door, w->fd, g->text, g->n);
    if (r >= 0 && (size_t)r != g->n) {
        *ret_what = "only a part could be written";
        r = -ENOSPC;
    }
    if (r < 0)
        return (int)r;
    *ret_what = "syncing to disk failed";
    r = door->fdatasync(door, w->fd);
    if (r < 0)
        return (int)r;
    if (w->name[0] != '\0') {
        *ret_what = "the new file cannot be named";
        r = sm_folder_show_file(w->folder, w->name);
        if (r < 0)
            return (int)r;
        w->name[0] = '\0';
    }
    if (g->ends)
        leave_file(w);
    return 0;
}

static void do_group(struct sm_writer *w, struct sm_done *d, bool dropped)
{
    const char *what = "";
    int r;

    if (dropped) {
        snprintf(d->why, sizeof d->why, "given up before it was written");
        return;
    }
    if (d->epoch == w->bad_epoch) {
        snprintf(d->why, sizeof d->why, "%s", w->bad_why);
        return;
    }
    r = write_group(w, d->group, &what);
    d->good = r >= 0;
    if (d->good)
        return;
    snprintf(d->why, sizeof d->why, "%s: %s", what, sm_door_text(r));
    w->bad_epoch = d->epoch;
    memcpy(w->bad_why, d->why, sizeof w->bad_why);
    leave_file(w);
}

static void do_recover(struct sm_writer *w, struct sm_done *d)
{
    enum sm_status s;

    leave_file(w);
    s = sm_folder_hold(w->folder, d->why);
    if (s == SM_OK)
        s = sm_folder_recover(w->folder, &d->beginning, d->why);
    d->good = s == SM_OK;
}

static void tell(const struct sm_writer *w)
{
    const uint64_t one = 1;
    ssize_t r;

    do
        r = write(w->event_fd, &one, sizeof one);
    while (r < 0 && errno == EINTR); /* EAGAIN: it is readable as it is */
}

static void *run(void *arg)
{
    struct sm_writer *w = arg;

    pthread_mutex_lock(&w->lock);
    for (;;) {
        struct job *j = take(&w->todo);
        if (j == NULL && w->ending)
            break;
        if (j == NULL) {
            pthread_cond_wait(&w->wake, &w->lock);
            continue;
        }
        const bool dropped = j->done.epoch < w->from_epoch;
        pthread_mutex_unlock(&w->lock);
        if (j->done.kind == SM_DONE_GROUP)
            do_group(w, &j->done, dropped);
        else
            do_recover(w, &j->done);
        pthread_mutex_lock(&w->lock);
        put(&w->done, j);
        tell(w);
    }
    pthread_mutex_unlock(&w->lock);
    leave_file(w);
    return NULL;
}

/* Signals are for the main thread. */
static int start_thread(struct sm_writer *w)
{
    sigset_t all, before;
    int r;

    sigfillset(&all);
    pthread_sigmask(SIG_SETMASK, &all, &before);
    r = pthread_create(&w->thread, NULL, run, w);
    pthread_sigmask(SIG_SETMASK, &before, NULL);
    return r;
}

enum sm_status sm_writer_create(struct sm_folder *folder, struct sm_writer **ret)
{
    struct sm_writer *w = calloc(1, sizeof *w);

    if (w == NULL)
        return SM_ENOMEM;
    w->folder = folder;
    w->fd = -1;
    w->bad_epoch = UINT64_MAX;
    queue_init(&w->todo);
    queue_init(&w->done);
    pthread_mutex_init(&w->lock, NULL);
    pthread_cond_init(&w->wake, NULL);
    w->event_fd = eventfd(0, EFD_CLOEXEC | EFD_NONBLOCK);
    if (w->event_fd < 0 || start_thread(w) != 0) {
        if (w->event_fd >= 0)
            close(w->event_fd);
        pthread_cond_destroy(&w->wake);
        pthread_mutex_destroy(&w->lock);
        free(w);
        return SM_EIO;
    }
    *ret = w;
    return SM_OK;
}

int sm_writer_fd(const struct sm_writer *w)
{
    return w->event_fd;
}

static void give(struct sm_writer *w, struct job *j)
{
    pthread_mutex_lock(&w->lock);
    put(&w->todo, j);
    pthread_cond_signal(&w->wake);
    pthread_mutex_unlock(&w->lock);
}

enum sm_status sm_writer_recover(struct sm_writer *w, uint64_t epoch)
{
    struct job *j = calloc(1, sizeof *j);

    if (j == NULL)
        return SM_ENOMEM;
    j->done.kind = SM_DONE_RECOVER;
    j->done.epoch = epoch;
    give(w, j);
    return SM_OK;
}

enum sm_status sm_writer_group(struct sm_writer *w, struct sm_group *g)
{
    struct job *j = calloc(1, sizeof *j);

    if (j == NULL)
        return SM_ENOMEM;
    j->done.kind = SM_DONE_GROUP;
    j->done.epoch = g->epoch;
    j->done.group = g;
    give(w, j);
    return SM_OK;
}

void sm_writer_abandon(struct sm_writer *w, uint64_t before_epoch)
{
    pthread_mutex_lock(&w->lock);
    w->from_epoch = before_epoch;
    pthread_mutex_unlock(&w->lock);
}

bool sm_writer_next(struct sm_writer *w, struct sm_done *ret_done)
{
    uint64_t count;
    struct job *j;

    pthread_mutex_lock(&w->lock);
    if (read(w->event_fd, &count, sizeof count) < 0 && errno != EAGAIN && errno != EINTR)
        abort(); /* our own descriptor */
    j = take(&w->done);
    pthread_mutex_unlock(&w->lock);
    if (j == NULL)
        return false;
    *ret_done = j->done;
    free(j);
    return true;
}

void sm_writer_destroy(struct sm_writer *w)
{
    struct sm_done d;

    if (w == NULL)
        return;
    pthread_mutex_lock(&w->lock);
    w->ending = true;
    pthread_cond_signal(&w->wake);
    pthread_mutex_unlock(&w->lock);
    pthread_join(w->thread, NULL);
    while (sm_writer_next(w, &d)) {
        sm_group_destroy(d.group);
        sm_beginning_destroy(d.beginning);
    }
    close(w->event_fd);
    pthread_cond_destroy(&w->wake);
    pthread_mutex_destroy(&w->lock);
    free(w);
}
