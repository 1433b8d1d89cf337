/* SPDX-License-Identifier: GPL-3.0-or-later */
/* in_memory.h: a small whole setup in memory, so that a test can spoil one thing in it. Invented.
 */
#ifndef SM_TEST_IN_MEMORY_H
#define SM_TEST_IN_MEMORY_H
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "setup/logged.h"
#include "setup/setup.h"

static const struct {
    const char *name, *text;
} good_files[] = {
    { "conf/stillmark.yaml", "logs: ../logs\n"
                             "state: ../state\n"
                             "people: [ { who: bench-a }, { who: bench-b, review: yes } ]\n"
                             "meters: [ m1 ]\n"
                             "standards: [ buffers ]\n" },
    { "conf/meters/m1.yaml", "port: /dev/serial/by-id/usb-1\n"
                             "line: { baud: 9600, bits: 8, parity: none }\n"
                             "silence: 10 s\n"
                             "profile: mv\n"
                             "method: ph\n"
                             "sensor: el-1\n" },
    { "conf/profiles/mv.yaml",
      "eol: crlf\n"
      "split: spaces\n"
      "channels:\n"
      "  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
      "  probe: { at: 3, unit-at: 4, unit: °C, written: C }\n"
      "words: { over: [ OVR ], open: [ \"----\" ] }\n"
      "example: { line: \"-0012.4 mV  24.8 C\", potential: -12.4 mV, probe: 24.8 °C }\n" },
    { "conf/methods/ph.yaml", "measures: pH\n"
                              "signal: potential\n"
                              "temperature: probe\n"
                              "model: nernst\n"
                              "rule: spread\n"
                              "over: 20 s\n"
                              "tolerance: { standards: 0.01 pH, samples: 0.02 pH }\n"
                              "dwell: 30 s\n"
                              "longest-wait: { standards: 5 min, samples: 15 min }\n"
                              "levels: 5\n"
                              "slope: { from: 90 %, to: 105 % }\n"
                              "residual-sd: 1.2 mV\n"
                              "check: { within: 0.1 pH, every: 10, at-end: yes }\n" },
    { "conf/methods/line.yaml", "measures: mg/L\n"
                                "signal: absorbance\n"
                                "temperature: assumed 20 °C\n"
                                "model: line\n"
                                "rule: spread\n"
                                "over: 5 s\n"
                                "tolerance: 0.002 A\n"
                                "dwell: 5 s\n"
                                "longest-wait: 2 min\n"
                                "check-after-curve: { within: 0.1 mg/L }\n"
                                "check: { within: 0.1 mg/L }\n" },
    { "conf/standards/buffers.yaml",
      "table: tables/t.csv\n"
      "standards:\n"
      "  - { name: B4, column: phthalate, lot: F-208, expires: 2027-03-31, opened: 2026-11-20 }\n"
      "  - { name: B10, values: { 25 °C: 10.02 pH, 20 °C: 10.07 pH }, lot: K-291, U: 0.02 pH }\n"
      "  - { name: C7, values: { 20 °C: 7.02 pH }, lot: V-077 }\n"
      "  - { name: N1, value: 1.00 mg/L, lot: N-1, U: 2 % }\n" },
    { "conf/standards/tables/t.csv", "# source: invented for a test\n"
                                     "# unit: pH\n"
                                     "t_C,phthalate\n"
                                     "20,4.00\n"
                                     "25,4.01\n" },
};

static const char good_sheet[] =
    "method: ph\n"
    "sensor: el-1\n"
    "items:\n"
    "  - { standard: B4 }\n"
    "  - { standard: B10 }\n"
    "  - { check: C7 }\n"
    "  - { sample: final, place: clear well, sampled: 2026-12-01T07:05:00Z, by: bench-a, "
    "band: { from: 7.8 pH, to: 8.4 pH } }\n"
    "  - { duplicate: final }\n"
    "  - { check: C7 }\n";

#define BLAMES 40

struct bench {
    struct sm_logged files;
    struct sm_source source;
    struct sm_blame list[BLAMES];
    struct sm_blames blames;
};

/* text with `old` replaced by `new`; old "": all of it is replaced; old NULL: as it is. To be
 * freed. */
static char *spoil(const char *text, const char *old, const char *new)
{
    const char *at = old == NULL ? NULL : strstr(text, old);
    const size_t before = at == NULL ? 0 : (size_t)(at - text);
    const size_t cap = strlen(text) + (new != NULL ? strlen(new) : 0) + 1;
    char *out = malloc(cap);

    assert_non_null(out);
    if (old == NULL)
        snprintf(out, cap, "%s", text);
    else if (old[0] == '\0')
        snprintf(out, cap, "%s", new);
    else if (at == NULL)
        fail_msg("\"%s\" is not in the good file", old);
    else
        snprintf(out, cap, "%.*s%s%s", (int)before, text, new, at + strlen(old));
    return out;
}

/* The good setup with one thing spoilt in one file (NULL: nothing). To be ended. */
static struct bench *bench_begin(const char *file, const char *old, const char *new)
{
    struct bench *b = calloc(1, sizeof *b);

    assert_non_null(b);
    for (size_t i = 0; i < COUNT(good_files); i++) {
        const bool here = file != NULL && strcmp(file, good_files[i].name) == 0;
        char *text = spoil(good_files[i].text, here ? old : NULL, new);

        assert_int_equal(sm_logged_add(&b->files, good_files[i].name, text, strlen(text)), SM_OK);
        free(text);
    }
    sm_logged_source(&b->files, &b->source);
    sm_blames_init(&b->blames, b->list, BLAMES);
    return b;
}

static void bench_end(struct bench *b)
{
    sm_logged_finish(&b->files);
    free(b);
}

static void print_blames(const struct sm_blames *b)
{
    char line[1024];

    for (size_t i = 0; i < b->n; i++) {
        sm_blame_write(&b->list[i], line, sizeof line);
        print_message("    blamed: %s\n", line);
    }
}
#endif
