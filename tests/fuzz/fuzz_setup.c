/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fuzz_setup.c: any bytes as a setup file. The first byte says which: s setup, m meter, p profile,
 * t method, b standards, c table, h sheet; the other files of the setup are sound. What comes out
 * must be usable or blamed; a setup that loads must load alike from the texts it kept. */
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "setup/logged.h"
#include "setup/setup.h"

#define SETUP "c/stillmark.yaml"

static const struct {
    char letter;
    const char *name, *text;
} files[] = {
    { 's', SETUP, "logs: l\nstate: s\nmeters: [ m ]\nstandards: [ b ]\n" },
    { 'm', "c/meters/m.yaml", "port: /dev/p\nprofile: p\nmethod: t\nsensor: e\n" },
    { 'p', "c/profiles/p.yaml",
      "channels:\n  potential: { at: 1, unit-at: 2, unit: mV, is: raw }\n"
      "  probe: { at: 3, unit: °C }\nexample: { line: \"1 mV 20\", potential: 1 mV }\n" },
    { 't', "c/methods/t.yaml",
      "measures: pH\nsignal: potential\ntemperature: probe\n"
      "model: nernst\nrule: spread\nover: 20 s\n" },
    { 'b', "c/standards/b.yaml",
      "table: t.csv\nstandards:\n  - { name: B, column: x, lot: l }\n"
      "  - { name: C, values: { 20 °C: 7 pH }, lot: k }\n" },
    { 'c', "c/standards/t.csv", "# source: none\n# unit: pH\nt_C,x\n20,4\n25,4\n" },
};

static const char sheet_text[] =
    "method: t\nitems: [ { standard: B }, { check: C }, { sample: a } ]\n";

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define CHECK(what)                                                                                \
    do {                                                                                           \
        if (!(what)) {                                                                             \
            fprintf(stderr, "%s:%d: broken: %s\n", __FILE__, __LINE__, #what);                     \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

static struct sm_setup *load(struct sm_logged *log, struct sm_blames *blames)
{
    struct sm_setup *s = NULL;
    struct sm_source source;
    enum sm_status st;

    sm_logged_source(log, &source);
    st = sm_setup_load(&source, SETUP, &s, blames);
    CHECK((st == SM_OK) == (s != NULL) && (s != NULL) == (blames->n == 0));
    return s;
}

static void load_again(const struct sm_setup *s)
{
    struct sm_logged *log = calloc(1, sizeof *log);
    struct sm_blame list[4];
    struct sm_blames blames;
    struct sm_setup *t;

    if (log == NULL)
        return;
    for (size_t i = 0; i < s->n_files; i++)
        CHECK(sm_logged_add(log, s->files[i].name, s->files[i].text, s->files[i].n) == SM_OK);
    sm_blames_init(&blames, list, 4);
    t = load(log, &blames);
    CHECK(t != NULL && t->n_methods == s->n_methods);
    CHECK(memcmp(t->method, s->method, sizeof s->method) == 0);
    CHECK(memcmp(&t->standards, &s->standards, sizeof s->standards) == 0);
    CHECK(memcmp(t->profile, s->profile, sizeof s->profile) == 0);
    sm_setup_destroy(t);
    sm_logged_finish(log);
    free(log);
}

static void try_sheet(const struct sm_setup *s, const char *text, size_t n,
                      struct sm_blames *blames)
{
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);

    if (sheet == NULL)
        return;
    if (sm_sheet_load(s, "h.yaml", text, n, sheet, blames) == SM_OK) {
        CHECK(sheet->n >= 1 && sheet->n <= SM_ITEMS_MAX);
        CHECK(sheet->method >= 0 && (size_t)sheet->method < s->n_methods);
        for (size_t i = 0; i < sheet->n; i++)
            CHECK(sheet->item[i].kind != SM_ITEM_NONE);
    } else {
        CHECK(blames->n > 0);
    }
    free(sheet);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    const char letter = size > 0 ? (char)data[0] : 's';
    const size_t n = size > 0 ? size - 1 : 0;
    char *text = malloc(n > 0 ? n : 1); /* no byte more, so that a read past it shows */
    struct sm_logged *log = calloc(1, sizeof *log);
    struct sm_blame list[8];
    struct sm_blames blames;
    struct sm_setup *s;

    if (text == NULL || log == NULL || size > 64 * 1024)
        goto out;
    if (n > 0)
        memcpy(text, data + 1, n);
    for (size_t i = 0; i < sizeof files / sizeof files[0]; i++) {
        const bool here = files[i].letter == letter;
        CHECK(sm_logged_add(log, files[i].name, here ? text : files[i].text,
                            here ? n : strlen(files[i].text)) == SM_OK);
    }
    sm_blames_init(&blames, list, 8);
    s = load(log, &blames);
    if (s != NULL) {
        sm_blames_init(&blames, list, 8);
        if (letter == 'h')
            try_sheet(s, text, n, &blames);
        else
            try_sheet(s, sheet_text, strlen(sheet_text), &blames);
        load_again(s);
    }
    for (size_t i = 0; i < blames.n; i++) {
        char line[2048];
        sm_blame_write(&blames.list[i], line, sizeof line);
    }
    sm_setup_destroy(s);
    sm_logged_finish(log);
out:
    free(log);
    free(text);
    return 0;
}
