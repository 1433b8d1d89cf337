/* SPDX-License-Identifier: GPL-3.0-or-later */
/* outside.c: see outside.h. */
#include "outside.h"

#include <dirent.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

#include "base/time.h"
#include "record/head.h"

static unsigned descriptors_of(pid_t pid)
{
    char path[64];
    unsigned n = 0;
    DIR *d;

    snprintf(path, sizeof path, "/proc/%ld/fd", (long)pid);
    d = opendir(path);
    assert_non_null(d);
    while (readdir(d) != NULL)
        n++;
    closedir(d);
    return n;
}

struct outside outside_look(pid_t pid)
{
    struct outside o = { descriptors_of(pid), 0, 0 };
    char path[64], text[1024];
    unsigned long user, kernel;
    const char *after_name;
    FILE *f;
    size_t n;

    snprintf(path, sizeof path, "/proc/%ld/status", (long)pid);
    f = fopen(path, "r");
    assert_non_null(f);
    while (fgets(text, sizeof text, f) != NULL)
        if (strncmp(text, "VmRSS:", 6) == 0)
            o.resident_kb = strtol(text + 6, NULL, 10);
    fclose(f);
    snprintf(path, sizeof path, "/proc/%ld/stat", (long)pid);
    f = fopen(path, "r");
    assert_non_null(f);
    n = fread(text, 1, sizeof text - 1, f);
    text[n] = '\0';
    fclose(f);
    after_name = strrchr(text, ')'); /* fields 14 and 15 are utime and stime: proc(5) */
    assert_non_null(after_name);
    assert_int_equal(
        sscanf(after_name, ") %*c %*d %*d %*d %*d %*d %*u %*u %*u %*u %*u %lu %lu", &user, &kernel),
        2);
    o.cpu_s = (double)(user + kernel) / (double)sysconf(_SC_CLK_TCK);
    assert_true(o.resident_kb > 0);
    return o;
}

static void link_of(const struct live *l, size_t meter, char path[96])
{
    snprintf(path, 96, "%s/line%zu", l->path, meter + 1);
}

void outside_unplug(struct live *l, size_t meter)
{
    char path[96];

    link_of(l, meter, path);
    sm_sim_pty_unlink(&l->pty[meter], path);
    sm_sim_pty_close(&l->pty[meter]);
}

void outside_plug(struct live *l, size_t meter)
{
    char path[96];

    link_of(l, meter, path);
    assert_int_equal(sm_sim_pty_open(&l->pty[meter]), SM_OK);
    assert_int_equal(sm_sim_pty_link(&l->pty[meter], path), SM_OK);
}

/* A program over all files of a log must give 0. */
static void run_well(const struct live *l, const char *const first[], const struct log_check *c,
                     const char *what)
{
    static char said[1 << 16];
    const char **argv = calloc(c->n_files + 3, sizeof *argv);
    size_t n = 0;
    int status;

    assert_non_null(argv);
    while (first[n] != NULL) {
        argv[n] = first[n];
        n++;
    }
    for (size_t i = 0; i < c->n_files; i++)
        argv[n + i] = c->path[i];
    status = live_run(l, argv, said, sizeof said);
    if (status != 0)
        fail_msg("%s: %s over %zu files gave %d:\n%s", what, first[0], c->n_files, status, said);
    free(argv);
}

void outside_stop_and_check(struct live *l, size_t meter, struct log_check *ret_log,
                            const char *what)
{
    static const char *const verify[] = { "stillmark", "verify", NULL }, *const replay[] = {
        "stillmark-replay", NULL
    };

    if (live_stop(l) != 0)
        fail_msg("%s: the daemon could not end well", what);
    live_disconnect(l);
    for (size_t i = 0; i <= l->n_meters; i++) { /* the one asked for comes last */
        const size_t m = i < l->n_meters ? i : meter;
        char folder[128], who[96];
        if (i == meter)
            continue;
        snprintf(who, sizeof who, "%s: m%zu", what, m + 1);
        live_folder(l, m, folder, sizeof folder);
        log_check_load(ret_log, folder, who);
        if (!ret_log->last.closed)
            fail_msg("%s: the log is not closed", who);
        run_well(l, verify, ret_log, who);
        run_well(l, replay, ret_log, who);
        if (i < l->n_meters)
            log_check_free(ret_log);
    }
}

size_t outside_count(const struct log_check *c, const char *kind, const char *text)
{
    struct sm_head h;
    size_t found = 0;

    for (size_t i = 0; i < c->n_lines; i++) {
        const struct log_check_line *l = &c->line[i];
        if (sm_head_read(l->text, l->len - 1, &h) && sm_head_is(&h, kind) &&
            memmem(l->text, l->len, text, strlen(text)) != NULL)
            found++;
    }
    return found;
}

int64_t outside_utc_us(const struct log_check_line *line)
{
    const char *const at = memmem(line->text, line->len, "\"utc\":\"", 7);
    const char *const end =
        at != NULL ? memchr(at + 7, '"', line->len - (size_t)(at + 7 - line->text)) : NULL;
    int64_t utc_us;

    assert_non_null(end);
    assert_int_equal(sm_utc_parse(at + 7, (size_t)(end - at - 7), &utc_us), SM_OK);
    return utc_us;
}

int64_t outside_now_us(void)
{
    struct timespec ts;

    clock_gettime(CLOCK_REALTIME, &ts);
    return (int64_t)ts.tv_sec * 1000000 + ts.tv_nsec / 1000;
}
