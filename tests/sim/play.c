/* SPDX-License-Identifier: GPL-3.0-or-later */
/* play.c: see play.h. */
#include "sim/play.h"

#include <errno.h>
#include <math.h>
#include <poll.h>
#include <signal.h>
#include <string.h>
#include <time.h>

#include "base/time.h"
#include "sim/pty.h"
#include "sim/sim.h"
#include "sim/write.h"

static const int64_t look_ns = 20 * SM_NS_PER_MS; /* how often it looks whether somebody came */
static const int64_t nap_ns = 200 * SM_NS_PER_MS; /* the longest wait: a signal is seen by then */
static volatile sig_atomic_t told_to_stop;

static void stop(int number)
{
    (void)number;
    told_to_stop = 1;
}

struct player {
    const struct sm_sim_play *how;
    FILE *events;
    struct sm_sim *sim;
    struct sm_sim_pty pty,
        next; /* the plug that is in; the one that goes in when the link is back */
    bool unplugged, scenario_down, replug_down, ended;
    unsigned replugs_left;
    int64_t began_ns, replug_t_ns; /* replug_t_ns: the next pull, or the plug's return */
};

static int64_t clock_ns(void)
{
    struct timespec now;

    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * SM_NS_PER_S + now.tv_nsec;
}

static void tell(const struct player *p, int64_t t_ns, const struct sm_sim_step *step)
{
    if (!p->events)
        return;
    sm_sim_write_event(p->events, t_ns, step);
    fflush(p->events);
}

static enum sm_status plug_in(struct player *p)
{
    p->unplugged = false;
    p->pty = p->next;
    p->next.fd = -1;
    if (p->how->link)
        return sm_sim_pty_link(&p->pty, p->how->link);
    printf("%s\n", p->pty.path);
    fflush(stdout);
    return SM_OK;
}

/* The next terminal is made before this one goes, so that its name is another. */
static enum sm_status pull_out(struct player *p)
{
    const enum sm_status status = sm_sim_pty_open(&p->next);

    if (status != SM_OK)
        return status;
    if (p->how->link)
        sm_sim_pty_unlink(&p->pty, p->how->link);
    sm_sim_pty_close(&p->pty);
    p->unplugged = true;
    return SM_OK;
}

/* Both the scenario and --replug may hold the plug out. */
static enum sm_status plug_as_it_should(struct player *p)
{
    const bool out = p->scenario_down || p->replug_down;

    if (out == p->unplugged)
        return SM_OK;
    return out ? pull_out(p) : plug_in(p);
}

static void replug(struct player *p, int64_t t_ns)
{
    if (p->replug_down) {
        p->replug_down = false;
        p->replugs_left--;
        p->replug_t_ns =
            p->replugs_left > 0 ? t_ns + (int64_t)llround(p->how->every_s * 1e9) : SM_NEVER;
    } else {
        p->replug_down = true;
        p->replug_t_ns = t_ns + (int64_t)llround(p->how->away_s * 1e9);
    }
}

/* Does one thing that the simulator has due. */
static void sim_step(struct player *p)
{
    char buf[4096];
    int64_t t_ns;
    size_t n;

    switch (sm_sim_next(p->sim, &t_ns, buf, sizeof buf, &n)) {
    case SM_SIM_BYTES:
        sm_sim_pty_send(&p->pty, buf, n);
        break;
    case SM_SIM_DOWN:
        p->scenario_down = true;
        tell(p, t_ns, sm_sim_step_now(p->sim));
        break;
    case SM_SIM_UP:
        p->scenario_down = false;
        break;
    case SM_SIM_STEP:
        tell(p, t_ns, sm_sim_step_now(p->sim));
        break;
    case SM_SIM_END:
        p->ended = true;
        tell(p, t_ns, NULL);
        break;
    case SM_SIM_QUIET:
        break;
    }
}

/* Waits until the simulator or the replugging has something, or the meter is asked. */
static void wait_a_little(const struct player *p, int64_t until_t_ns)
{
    int64_t left_ns = until_t_ns - (clock_ns() - p->began_ns);
    const bool heard = !p->unplugged && sm_sim_pty_heard(&p->pty);
    struct pollfd f = { p->pty.fd, POLLIN, 0 };

    if (left_ns > nap_ns)
        left_ns = nap_ns;
    if (!heard && left_ns > look_ns)
        left_ns = look_ns;
    if (left_ns <= 0)
        return;
    const struct timespec nap = { 0, (long)left_ns };
    ppoll(heard ? &f : NULL, heard ? 1 : 0, &nap, NULL);
}

static void listen_to_questions(struct player *p)
{
    char buf[256];
    const size_t n = p->unplugged ? 0 : sm_sim_pty_receive(&p->pty, buf, sizeof buf);

    if (n > 0)
        sm_sim_ask(p->sim, clock_ns() - p->began_ns, buf, n);
}

static bool finished(const struct player *p)
{
    return told_to_stop || (p->ended && p->replugs_left == 0 && !p->how->stay);
}

static enum sm_status run(struct player *p)
{
    while (p->how->wait && !told_to_stop && !sm_sim_pty_heard(&p->pty)) {
        const struct timespec nap = { 0, (long)look_ns };
        nanosleep(&nap, NULL);
    }
    p->began_ns = clock_ns();
    if (p->events)
        sm_sim_write_event_head(p->events);
    while (!finished(p)) {
        const int64_t sim_t_ns = p->ended ? SM_NEVER : sm_sim_due(p->sim);
        const int64_t next_t_ns = sim_t_ns < p->replug_t_ns ? sim_t_ns : p->replug_t_ns;
        wait_a_little(p, next_t_ns);
        const int64_t t_ns = clock_ns() - p->began_ns;
        if (!p->ended)
            listen_to_questions(p);
        if (p->replug_t_ns <= t_ns)
            replug(p, t_ns);
        else if (!p->ended && sm_sim_due(p->sim) <= t_ns)
            sim_step(p);
        const enum sm_status status = plug_as_it_should(p);
        if (status != SM_OK)
            return status;
    }
    return SM_OK;
}

static void catch_signals(void)
{
    struct sigaction act;

    memset(&act, 0, sizeof act);
    act.sa_handler = stop;
    sigemptyset(&act.sa_mask);
    sigaction(SIGINT, &act, NULL);
    sigaction(SIGTERM, &act, NULL);
    act.sa_handler = SIG_IGN;
    sigaction(SIGPIPE, &act, NULL);
}

enum sm_status sm_sim_play(const struct sm_scenario *sc, const struct sm_sim_play *how,
                           FILE *events)
{
    struct player p = { .how = how, .events = events, .replug_t_ns = SM_NEVER };

    p.pty.fd = p.next.fd = -1;
    p.replugs_left = how->replugs;
    if (how->replugs > 0)
        p.replug_t_ns = (int64_t)llround(how->every_s * 1e9);
    catch_signals();
    enum sm_status status = sm_sim_create(sc, &p.sim);
    if (status != SM_OK)
        return status;
    status = sm_sim_pty_open(&p.next);
    if (status == SM_OK)
        status = plug_in(&p);
    if (status == SM_OK)
        status = run(&p);
    const int why = errno;
    if (how->link && p.pty.fd >= 0)
        sm_sim_pty_unlink(&p.pty, how->link);
    sm_sim_pty_close(&p.pty);
    sm_sim_pty_close(&p.next);
    sm_sim_destroy(p.sim);
    errno = why;
    return status;
}
