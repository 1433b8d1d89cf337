/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Each case spoils one thing in a good setup; the blame must be this one, word for word, and alone.
 */
#include "in_memory.h"

struct spoilt {
    const char *file, *old, *new, *want;
};

/* The place of a blame holds what the blame says it got, so that no expected place is merely copied
 * from the program. */
static void check_place(const char *text, const struct sm_blame *blame)
{
    const char *got = strstr(blame->text, "got \""), *at = text;
    char token[64];
    size_t n;

    if (got == NULL || strchr(got, '\\') != NULL || strstr(got, "…") != NULL)
        return;
    got += strlen("got \"");
    n = strlen(got);
    if (strstr(got, "\"; did you mean") != NULL)
        n = (size_t)(strstr(got, "\"; did you mean") - got) + 1;
    snprintf(token, sizeof token, "%.*s", (int)(n - 1), got);
    for (unsigned line = 1; line < blame->line; line++)
        at = strchr(at, '\n') + 1;
    for (unsigned column = 1; column < blame->column; column++)
        at += sm_utf8_next(at, strlen(at), NULL);
    at += *at == '"' || *at == '\'';
    if (strncmp(at, token, strlen(token)) != 0)
        fail_msg("%s:%u:%u: expected \"%s\" there, the file has \"%.20s\"", blame->file,
                 blame->line, blame->column, token, at);
}

static void expect(const struct bench *b, const struct spoilt *c, const char *text)
{
    char line[1024] = "no blame at all";

    if (b->blames.n > 0)
        sm_blame_write(&b->blames.list[0], line, sizeof line);
    if (b->blames.n == 1 && strcmp(line, c->want) == 0) {
        check_place(text, &b->blames.list[0]);
        return;
    }
    print_blames(&b->blames);
    fail_msg("\"%s\" for \"%s\": %zu blames\n  got  %s\n  want %s", c->new, c->old, b->blames.n,
             line, c->want);
}

/* The text of the file that was blamed: the spoilt one, or the one that refers to it. */
static const char *text_of(const struct bench *b, const char *fallback)
{
    const char *name = b->blames.n > 0 ? b->list[0].file : fallback;

    for (size_t i = 0; i < b->files.n; i++)
        if (strcmp(b->files.file[i].name, name) == 0)
            return b->files.file[i].text;
    return "";
}

static void check_setup(const struct spoilt *cases, size_t n)
{
    for (size_t i = 0; i < n; i++) {
        struct bench *b = bench_begin(cases[i].file, cases[i].old, cases[i].new);
        struct sm_setup *s = NULL;
        const enum sm_status st = sm_setup_load(&b->source, "conf/stillmark.yaml", &s, &b->blames);

        assert_true(st == SM_ESYNTAX || b->blames.n == 0);
        assert_null(st == SM_OK ? NULL : s);
        sm_setup_destroy(s);
        expect(b, &cases[i], text_of(b, cases[i].file));
        bench_end(b);
    }
}

#define SETUP "conf/stillmark.yaml"
#define METER "conf/meters/m1.yaml"
#define PROFILE "conf/profiles/mv.yaml"
#define PH "conf/methods/ph.yaml"
#define LINE "conf/methods/line.yaml"
#define BUFFERS "conf/standards/buffers.yaml"

static void a_good_setup_has_no_blame(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_setup *s = NULL;

    (void)state;
    if (sm_setup_load(&b->source, SETUP, &s, &b->blames) != SM_OK) {
        print_blames(&b->blames);
        fail_msg("%zu blames", b->blames.n);
    }
    sm_setup_destroy(s);
    bench_end(b);
}

static void a_bad_setup_file_is_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { SETUP, "logs: ../logs\n", "",
          "conf/stillmark.yaml:1:1: logs: missing: expected the folder of the bench logs" },
        { SETUP, "../logs", "[ a ]",
          "conf/stillmark.yaml:1:7: logs: expected a folder (one line, 1 to 255 bytes), got a "
          "list" },
        { SETUP, "../logs", "\"a\\0b\"",
          "conf/stillmark.yaml:1:7: logs: expected a folder (one line, 1 to 255 bytes), got "
          "\"a\\x00b\"" },
        { SETUP, "[ m1 ]", "m1",
          "conf/stillmark.yaml:4:9: meters: expected a list of meters, got \"m1\"" },
        { SETUP, "[ m1 ]", "[ ]",
          "conf/stillmark.yaml:4:9: meters: expected 1 to 32 meters, got 0" },
        { SETUP, "[ m1 ]", "[ m1, m1 ]",
          "conf/stillmark.yaml:4:15: meters[2]: the same meter twice, got \"m1\"" },
        { SETUP, "[ m1 ]", "[ m1, M2 ]",
          "conf/stillmark.yaml:4:15: meters[2]: expected a meter's name (1 to 32 of a-z, 0-9 and "
          "-), got \"M2\"" },
        { SETUP, "[ m1 ]", "[ m1, ../x ]",
          "conf/stillmark.yaml:4:15: meters[2]: expected a meter's name (1 to 32 of a-z, 0-9 and "
          "-), got \"../x\"" },
        { SETUP, "[ m1 ]", "[ m1, m2 ]",
          "conf/stillmark.yaml:4:15: meters[2]: cannot read conf/meters/m2.yaml: the log carries "
          "no file of this name" },
        { SETUP, "[ buffers ]", "[ ../buffers ]",
          "conf/stillmark.yaml:5:14: standards[1]: expected the name of a file of standards (a "
          "file's name without folder and .yaml), got \"../buffers\"" },
        { SETUP, "review: yes", "review: ja",
          "conf/stillmark.yaml:3:53: people[2].review: expected yes or no, got \"ja\"" },
        { SETUP, "bench-b", "bench-a",
          "conf/stillmark.yaml:3:36: people[2].who: a second person of the name \"bench-a\"" },
        { SETUP, "bench-b", "\"\\u202Ex\"",
          "conf/stillmark.yaml:3:36: people[2].who: expected a short name (1 to 64 printable "
          "characters), got \"\\xe2\\x80\\xaex\"" },
        { SETUP, "logs:",
          "socket: "
          "0123456789012345678901234567890123456789012345678901234567890123456789012345678901234567"
          "890123456789012\nlogs:",
          "conf/stillmark.yaml:1:9: socket: the path is too long: at most 107 bytes with the "
          "setup's folder" },
    };

    (void)state;
    check_setup(cases, COUNT(cases));
}

static void a_bad_meter_file_is_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { METER, "/dev/serial", "ttyS0",
          "conf/meters/m1.yaml:1:7: port: expected a path from the root, such as "
          "/dev/serial/by-id/…, got \"ttyS0/by-id/usb-1\"" },
        { METER, "9600", "96oo",
          "conf/meters/m1.yaml:2:15: line.baud: expected a whole number between 50 and 4000000, "
          "got \"96oo\"" },
        { METER, "9600", "9600.0",
          "conf/meters/m1.yaml:2:15: line.baud: expected a whole number between 50 and 4000000, "
          "got \"9600.0\"" },
        { METER, "9600", "99999999999999999999",
          "conf/meters/m1.yaml:2:15: line.baud: expected a whole number between 50 and 4000000, "
          "got \"99999999999999999999\"" },
        { METER, "bits: 8", "bits: 9",
          "conf/meters/m1.yaml:2:27: line.bits: expected a whole number between 5 and 8, got "
          "\"9\"" },
        { METER, "parity: none", "parity: evn",
          "conf/meters/m1.yaml:2:38: line.parity: expected none, even, odd, mark or space, got "
          "\"evn\"; did you mean \"even\"?" },
        { METER, "parity: none", "flow: dtr-dsr",
          "conf/meters/m1.yaml:2:36: line.flow: expected none, rts-cts or xon-xoff, got "
          "\"dtr-dsr\"" },
        { METER, "baud:", "buad:",
          "conf/meters/m1.yaml:2:9: line.buad: no such key; did you mean \"baud\"?" },
        { METER, "bits: 8", "wombat: 8",
          "conf/meters/m1.yaml:2:21: line.wombat: no such key; there are: baud, bits, parity, "
          "stop, flow, dtr, rts" },
        { METER, "10 s", "10",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"10\"" },
        { METER, "10 s", "10 mV",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"10 mV\"" },
        { METER, "10 s", "1e400 s",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"1e400 "
          "s\"" },
        { METER, "10 s", "nan s",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"nan s\"" },
        { METER, "10 s", "",
          "conf/meters/m1.yaml:3:9: silence: expected a time between 1 s and 1 h, got nothing" },
        { METER, "sensor: el-1", "sensor: ''",
          "conf/meters/m1.yaml:6:9: sensor: expected a sensor's name (1 to 64 printable "
          "characters), got nothing" },
        { METER, "profile: mv", "profile: mw",
          "conf/meters/m1.yaml:4:10: profile: cannot read conf/profiles/mw.yaml: the log carries "
          "no file of this name" },
        { METER, "silence: 10 s", "silence: 999 ms",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"999 "
          "ms\"" },
        { METER, "silence: 10 s", "silence: 61 min",
          "conf/meters/m1.yaml:3:10: silence: expected a time between 1 s and 1 h, got \"61 "
          "min\"" },
        { METER, "profile: mv", "profile: .mv",
          "conf/meters/m1.yaml:4:10: profile: expected a profile's name (a file's name without "
          "folder and .yaml), got \".mv\"" },
        { METER, "port: /dev/serial/by-id/usb-1", "port: /dev/\xff",
          "conf/meters/m1.yaml:1:12: expected text in UTF-8, got the byte 0xFF" },
        { METER, "profile: mv", "profile: ../../x",
          "conf/meters/m1.yaml:4:10: profile: expected a profile's name (a file's name without "
          "folder and .yaml), got \"../../x\"" },
        { METER, "method: ph", "method: phh",
          "conf/meters/m1.yaml:5:9: method: expected a method of the folder methods beside the "
          "setup (did you mean \"ph\"?), got \"phh\"" },
        { METER, "method: ph", "method: line",
          "conf/meters/m1.yaml:5:9: method: signal of method line: profile mv has no channel "
          "\"absorbance\"; it has potential, probe" },
        { METER, "silence: 10 s\n", "other-adapter: yes\n",
          "conf/meters/m1.yaml:3:16: other-adapter: expected refuse or allow, got \"yes\"" },
        { METER, "port: /dev/serial/by-id/usb-1\n", "",
          "conf/meters/m1.yaml:1:1: port: missing: expected a device such as /dev/serial/by-id/…" },
        { METER, "", "", "conf/meters/m1.yaml: the file is empty: expected keys" },
    };

    (void)state;
    check_setup(cases, COUNT(cases));
}

static void a_bad_profile_is_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { PROFILE, "crlf", "crfl",
          "conf/profiles/mv.yaml:1:6: eol: expected auto, cr, lf, crlf, etx, gap 50 ms (up to 60 "
          "s) or text \"…\" (1 to 8 bytes), got \"crfl\"" },
        { PROFILE, "crlf", "gap 50",
          "conf/profiles/mv.yaml:1:6: eol: expected auto, cr, lf, crlf, etx, gap 50 ms (up to 60 "
          "s) or text \"…\" (1 to 8 bytes), got \"gap 50\"" },
        { PROFILE, "crlf", "text \"\"",
          "conf/profiles/mv.yaml:1:6: eol: expected auto, cr, lf, crlf, etx, gap 50 ms (up to 60 "
          "s) or text \"…\" (1 to 8 bytes), got \"text \"\"\"" },
        { PROFILE, "crlf", "text \"123456789\"",
          "conf/profiles/mv.yaml:1:6: eol: expected auto, cr, lf, crlf, etx, gap 50 ms (up to 60 "
          "s) or text \"…\" (1 to 8 bytes), got \"text \"123456789\"\"" },
        { PROFILE, "spaces", "\"5\"",
          "conf/profiles/mv.yaml:2:8: split: expected spaces, tab or one character such as \";\" "
          "(no digit, sign or point), got \"5\"" },
        { PROFILE, "at: 1,", "",
          "conf/profiles/mv.yaml:4:14: channels.potential.at: missing: expected the field that "
          "holds the number, 1 for the first" },
        { PROFILE, "at: 1,", "at: 0,",
          "conf/profiles/mv.yaml:4:20: channels.potential.at: expected a whole number between 1 "
          "and 64, got \"0\"" },
        { PROFILE, "unit: mV", "unit: mw",
          "conf/profiles/mv.yaml:4:41: channels.potential.unit: expected a unit such as mV, pH, "
          "°C, A, µS/cm, mg/L or none, got \"mw\"" },
        { PROFILE, "is: raw", "is: rw",
          "conf/profiles/mv.yaml:4:49: channels.potential.is: expected raw or calibrated, got "
          "\"rw\"; did you mean \"raw\"?" },
        { PROFILE, "is: raw", "scale: 0",
          "conf/profiles/mv.yaml:4:52: channels.potential.scale: expected a number other than 0, "
          "got \"0\"" },
        { PROFILE, "is: raw", "is: raw, plausible: { from: 3 mV, to: 2 mV }",
          "conf/profiles/mv.yaml:4:65: channels.potential.plausible: from must be less than to" },
        { PROFILE, "is: raw", "is: calibrated",
          "conf/meters/m1.yaml:5:9: method: potential of profile mv is calibrated in the meter "
          "(is: calibrated): a curve needs a raw signal" },
        { PROFILE, "probe: { at: 3, unit-at: 4, unit: °C, written: C }",
          "probe: { at: 3, unit: mV }",
          "conf/profiles/mv.yaml:7:68: example.probe: expected a value in mV, got \"24.8 °C\"" },
        { PROFILE, "[ OVR ]", "[ ]",
          "conf/profiles/mv.yaml:6:16: words.over: expected 1 to 8 words, got 0" },
        { PROFILE, "OVR", "abcdefghijklmnopqrstuvwxyz0123456789",
          "conf/profiles/mv.yaml:6:18: words.over[1]: expected a word (one line, 1 to 32 bytes), "
          "got \"abcdefghijklmnopqrstuvwxyz0123456789\"" },
        { PROFILE, "probe: 24.8", "prbe: 24.8",
          "conf/profiles/mv.yaml:7:67: example.prbe: no such channel; did you mean \"probe\"?" },
        { PROFILE, "eol: crlf", "eol: crlf\nask: { text: \"R\\r\", every: 20 s, within: 1 s }",
          "conf/meters/m1.yaml:3:10: silence: must be longer than the profile's ask.every, else "
          "the meter is always silent" },
        { PROFILE, "eol: crlf", "eol: crlf\nask: { text: \"€\", every: 2 s, within: 1 s }",
          "conf/profiles/mv.yaml:2:14: ask.text: expected the question to send (1 to 128 bytes, "
          "characters up to \\xff), got \"€\"" },
        { PROFILE, "eol: crlf", "eol: crlf\nask: { text: R, within: 1 s }",
          "conf/profiles/mv.yaml:2:6: ask.every: missing: expected how often to ask, 1 s say" },
        { PROFILE, "eol: crlf", "eol: crlf\nidentity: { text: R, within: 1 s, every: 1 s }",
          "conf/profiles/mv.yaml:2:35: identity.every: no such key; there are: text, within" },
        { PROFILE, "eol: crlf", "eol: crlf\nchecksum: { kind: crc }",
          "conf/profiles/mv.yaml:2:19: checksum.kind: expected sum8, xor8, crc16-modbus, "
          "crc16-ccitt or crc16-xmodem, got \"crc\"" },
    };

    (void)state;
    check_setup(cases, COUNT(cases));
}

static void a_profile_that_misreads_its_example_is_blamed_there(void **state)
{
    static const struct {
        const char *old, *new;
        unsigned line, column;
        const char *says;
    } cases[] = {
        { "potential: -12.4 mV", "potential: -12.5 mV", 7, 18,
          "example.line: potential: the profile reads" },
        { "24.8 C\"", "24.8 F\"", 7, 18, "does not read its own example" },
        { "split: spaces\n", "", 0, 0, NULL }, /* the default: no blame */
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct bench *b = bench_begin(PROFILE, cases[i].old, cases[i].new);
        struct sm_setup *s = NULL;
        const enum sm_status st = sm_setup_load(&b->source, SETUP, &s, &b->blames);

        sm_setup_destroy(s);
        print_blames(&b->blames);
        assert_int_equal(st, cases[i].says == NULL ? SM_OK : SM_ESYNTAX);
        assert_int_equal(b->blames.n, cases[i].says == NULL ? 0 : 1);
        if (cases[i].says != NULL) {
            assert_int_equal(b->list[0].line, cases[i].line);
            assert_int_equal(b->list[0].column, cases[i].column);
            assert_non_null(strstr(b->list[0].text, cases[i].says));
        }
        bench_end(b);
    }
}

static void a_bad_method_is_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { PH, "measures: pH", "measures: bananas",
          "conf/methods/ph.yaml:1:11: measures: expected the unit of the results: pH, mg/L, µg/L, "
          "µS/cm, mS/cm, A, mV or %, got \"bananas\"" },
        { PH, "model: nernst", "model: nerst",
          "conf/methods/ph.yaml:4:8: model: expected line, proportional, quadratic, log-line, "
          "log-offset, nernst or as-read, got \"nerst\"; did you mean \"nernst\"?" },
        { PH, "signal: potential", "signal: potentail",
          "conf/meters/m1.yaml:5:9: method: signal of method ph: profile mv has no channel "
          "\"potentail\"; it has potential, probe" },
        { PH, "temperature: probe", "temperature: potential",
          "conf/meters/m1.yaml:5:9: method: temperature of method ph: potential of profile mv is "
          "not in °C" },
        { PH, "temperature: probe", "temperature: bath",
          "conf/meters/m1.yaml:5:9: method: temperature of method ph: profile mv has no channel "
          "\"bath\"; it has potential, probe" },
        { PH, "temperature: probe", "temperature: assumed 20",
          "conf/methods/ph.yaml:3:14: temperature: expected a channel's name, typed, or assumed 20 "
          "°C (0 °C to 100 °C), got \"assumed 20\"" },
        { PH, "over: 20 s\n", "",
          "conf/methods/ph.yaml:1:1: over: missing: expected the span that is judged, 20 s say" },
        { PH, "over: 20 s", "over: 20 min",
          "conf/methods/ph.yaml:6:7: over: longer than the longest wait" },
        { PH, "over: 20 s", "over: 20 s\nreadings: 3",
          "conf/methods/ph.yaml:7:11: readings: rule spread does not use it" },
        { PH, "0.01 pH", "0.01",
          "conf/methods/ph.yaml:7:25: tolerance.standards: expected a pH or a potential, 0.02 pH "
          "or 0.6 mV say, got \"0.01\"" },
        { PH, "0.01 pH", "0 pH",
          "conf/methods/ph.yaml:7:25: tolerance.standards: expected a pH value between 0.001 pH "
          "and 3 pH, got \"0 pH\"" },
        { PH, "standards: 0.01 pH, ", "",
          "conf/methods/ph.yaml:7:12: tolerance.standards: missing: expected a value" },
        { PH, "30 s", "6 min",
          "conf/methods/ph.yaml:9:15: longest-wait: the longest wait must be longer than the "
          "dwell" },
        { PH, "levels: 5", "levels: 2",
          "conf/methods/ph.yaml:10:9: levels: expected a whole number between 3 and 20, got "
          "\"2\"" },
        { PH, "levels: 5", "levels: 5 mV",
          "conf/methods/ph.yaml:10:9: levels: expected a whole number between 3 and 20, got \"5 "
          "mV\"" },
        { PH, "from: 90 %", "from: \"9.2\"",
          "conf/methods/ph.yaml:11:16: slope.from: expected a percentage between 50 % and 120 %, "
          "got \"9.2\"" },
        { PH, "from: 90 %", "from: 106 %",
          "conf/methods/ph.yaml:11:8: slope: expected from, warn-from, warn-to, to in rising "
          "order" },
        { PH, "levels: 5", "r-squared: 0.99 %",
          "conf/methods/ph.yaml:10:12: r-squared: expected a number between 0 and 1, got \"0.99 "
          "%\"" },
        { PH, "levels: 5", "r-squared: -0.1",
          "conf/methods/ph.yaml:10:12: r-squared: expected a number between 0 and 1, got "
          "\"-0.1\"" },
        { PH, "levels: 5", "r-squared: 1.1",
          "conf/methods/ph.yaml:10:12: r-squared: expected a number between 0 and 1, got \"1.1\"" },
        { PH, "1.2 mV", "1.2 pH",
          "conf/methods/ph.yaml:12:14: residual-sd: expected a potential between 0.001 mV and 2000 "
          "mV, got \"1.2 pH\"" },
        { PH, "every: 10", "every: 0",
          "conf/methods/ph.yaml:13:33: check.every: expected a whole number between 1 and 100, got "
          "\"0\"" },
        { PH, "within: 0.1 pH,", "within: 0.1 pH, warn: 0.2 pH,",
          "conf/methods/ph.yaml:13:32: check.warn: must not be more than within" },
        { PH, "levels: 5", "marks: maybe",
          "conf/methods/ph.yaml:10:8: marks: expected ask, required or none, got \"maybe\"" },
        { PH, "levels: 5", "cautions: [ { at: loading, text: Look out. } ]",
          "conf/methods/ph.yaml:10:34: cautions[1].text: expected a text that ends \"Follow your "
          "local rules and safety data sheets.\"" },
        { PH, "levels: 5", "drift-allowed: 0.1 mV",
          "conf/methods/ph.yaml:10:16: drift-allowed: expected a change per minute between 0 "
          "mV/min and 100 mV/min, got \"0.1 mV\"" },
        { LINE, "tolerance: 0.002 A", "tolerance: 1 %",
          "conf/methods/line.yaml:7:12: tolerance: expected a change of the signal in mV, V, A, "
          "µS/cm or mS/cm, got \"1 %\"" },
        { LINE, "check: { within: 0.1 mg/L }\n", "",
          "conf/methods/line.yaml:1:1: check: missing: expected { within: …, every: 10, at-end: "
          "yes }" },
        { LINE, "dwell: 5 s", "dwell: 5 s\nslope: { from: 90 %, to: 110 % }",
          "conf/methods/line.yaml:9:8: slope: used only with model: nernst" },
        { LINE, "dwell: 5 s", "dwell: 5 s\nback-calculated: 10 %",
          "conf/methods/line.yaml:9:18: back-calculated: expected a concentration between 1e-06 "
          "mg/L and 1000000 mg/L, got \"10 %\"" },
        { LINE, "dwell: 5 s", "dwell: 5 s\nresidual-sd: none",
          "conf/methods/line.yaml:1:1: r-squared: R² alone accepts no curve, a wrong standard "
          "hardly changes it: add residual-sd or back-calculated" },
    };

    (void)state;
    check_setup(cases, COUNT(cases));
}

static void what_is_not_built_is_said_to_be_not_possible_yet(void **state)
{
    static const struct {
        const char *old, *new, *says;
        bool built;
    } cases[] = {
        { "rule: spread\nover: 20 s\n", "rule: arrival\n", "rule arrival is not possible yet",
          false },
        { "rule: spread\nover: 20 s\n", "",
          "rule: left out, and the default rule arrival is not possible yet", false },
        { "model: nernst", "model: log-line", "model log-line is not possible yet", false },
    };

    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct bench *b = bench_begin(PH, cases[i].old, cases[i].new);
        struct sm_setup *s = NULL;
        const bool built =
            i < 2 ? sm_rule_built(SM_RULE_ARRIVAL) : sm_model_built(SM_MODEL_LOG_LINE);
        bool said = false;

        assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames),
                         built && b->blames.n == 0 ? SM_OK : SM_ESYNTAX);
        for (size_t k = 0; k < b->blames.n; k++)
            said = said || strstr(b->list[k].text, cases[i].says) != NULL;
        if (said == built)
            fail_msg("%s: %s", cases[i].says, said ? "said, though it is built" : "not said");
        sm_setup_destroy(s);
        bench_end(b);
    }
}

static void bad_standards_are_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { BUFFERS, "phthalate", "phtalate",
          "conf/standards/buffers.yaml:3:25: standards[1].column: expected a column of "
          "conf/standards/tables/t.csv (did you mean \"phthalate\"?), got \"phtalate\"" },
        { BUFFERS, "2027-03-31", "2027-02-30",
          "conf/standards/buffers.yaml:3:57: standards[1].expires: expected a date such as "
          "2027-03-31, got \"2027-02-30\"" },
        { BUFFERS, "2026-11-20", "2027-11-20",
          "conf/standards/buffers.yaml:3:77: standards[1].opened: later than its expiry" },
        { BUFFERS, "10.02 pH", "10.02",
          "conf/standards/buffers.yaml:4:35: standards[2].values.25 °C: expected a value with its "
          "unit, 7.02 pH or 1.00 mg/L say, got \"10.02\"" },
        { BUFFERS, "10.07 pH", "10.07 mV",
          "conf/standards/buffers.yaml:4:52: standards[2].values.20 °C: expected a value in pH, "
          "got \"10.07 mV\"" },
        { BUFFERS, "25 °C: 10", "25 s: 10",
          "conf/standards/buffers.yaml:4:34: standards[2].values.25 s: expected a temperature "
          "between -10 °C and 100 °C as the key" },
        { BUFFERS, "25 °C: 10", "20.0 °C: 10",
          "conf/standards/buffers.yaml:4:54: standards[2].values.20 °C: the same temperature "
          "twice" },
        { BUFFERS, "U: 0.02 pH", "U: 0.02",
          "conf/standards/buffers.yaml:4:79: standards[2].U: expected a pH value between 0 pH and "
          "1 pH, got \"0.02\"" },
        { BUFFERS, "lot: K-291, ", "",
          "conf/standards/buffers.yaml:4:5: standards[2].lot: missing: expected its lot" },
        { BUFFERS, "name: B10", "name: B4",
          "conf/standards/buffers.yaml:4:13: standards[2].name: a second standard of the name "
          "\"B4\"" },
        { BUFFERS, "tables/t.csv", "../t.csv",
          "conf/standards/buffers.yaml:1:8: table: expected a file below this folder, such as "
          "tables/buffers.csv, got \"../t.csv\"" },
        { BUFFERS, "tables/t.csv", "a/../../t.csv",
          "conf/standards/buffers.yaml:1:8: table: expected a file below this folder, such as "
          "tables/buffers.csv, got \"a/../../t.csv\"" },
        { BUFFERS, "tables/t.csv", "/etc/passwd",
          "conf/standards/buffers.yaml:1:8: table: expected a file below this folder, such as "
          "tables/buffers.csv, got \"/etc/passwd\"" },
        { BUFFERS, "value: 1.00 mg/L, ", "",
          "conf/standards/buffers.yaml:6:5: standards[4]: expected values (by temperature), value, "
          "or a column of the table" },
    };

    (void)state;
    check_setup(cases, COUNT(cases));
}

static void a_table_that_names_no_source_is_blamed(void **state)
{
    struct bench *b =
        bench_begin("conf/standards/tables/t.csv", "# source: invented for a test\n", "");
    struct sm_setup *s = NULL;

    (void)state;
    assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames), SM_ESYNTAX);
    assert_string_equal(b->list[0].file, "conf/standards/tables/t.csv");
    assert_non_null(strstr(b->list[0].text, "source"));
    bench_end(b);
}

static void everything_wrong_is_found_at_once_from_top_to_bottom(void **state)
{
    static const char bad[] = "sensr: x\nsilence: 10\nline: { baud: x, stop: 7 }\nprofile: nix\n"
                              "port: usb\nmethod: 'nope'\n";
    static const unsigned lines[] = { 1, 1, 2, 3, 3, 5, 4, 6 };
    struct bench *b = bench_begin(METER, "", bad);
    struct sm_setup *s = NULL;

    (void)state;
    assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames), SM_ESYNTAX);
    if (b->blames.n != COUNT(lines))
        print_blames(&b->blames);
    assert_int_equal(b->blames.n, COUNT(lines));
    for (size_t i = 0; i < COUNT(lines); i++)
        assert_int_equal(b->list[i].line, lines[i]);
    bench_end(b);
}

/* ---- sheets ---- */

static void a_bad_sheet_is_blamed(void **state)
{
    static const struct spoilt cases[] = {
        { NULL, "method: ph", "method: hp",
          "s.yaml:1:9: method: expected a method of this setup (did you mean \"ph\"?), got "
          "\"hp\"" },
        { NULL, "standard: B10", "standard: B11",
          "s.yaml:5:17: items[2].standard: expected a standard of this setup (did you mean "
          "\"B10\"?), got \"B11\"" },
        { NULL, "standard: B10", "standard: N1",
          "s.yaml:5:17: items[2].standard: N1 is in mg/L, and the method measures pH" },
        { NULL, "duplicate: final", "duplicate: finall",
          "s.yaml:8:18: items[5].duplicate: expected a sample that stands earlier in the sheet "
          "(did you mean \"final\"?), got \"finall\"" },
        { NULL, "duplicate: final", "spike: B4",
          "s.yaml:8:14: items[5].spike: expected a sample that stands earlier in the sheet, got "
          "\"B4\"" },
        { NULL, "duplicate: final", "sample: final",
          "s.yaml:8:15: items[5].sample: a second sample of the name \"final\"" },
        { NULL, "duplicate: final", "duplicate: final, sample: x",
          "s.yaml:8:33: items[5].sample: an item is one thing; it is \"duplicate\" already" },
        { NULL, "duplicate: final", "place: x",
          "s.yaml:8:5: items[5]: expected one of standard, check, blank, sample, duplicate, spike "
          "in an item" },
        { NULL, "to: 8.4 pH", "to: 8.4",
          "s.yaml:7:111: items[4].band.to: expected a value in pH, got \"8.4\"" },
        { NULL, "2026-12-01T07:05:00Z", "yesterday",
          "s.yaml:7:50: items[4].sampled: expected a time such as 2026-12-01T07:05:00Z, got "
          "\"yesterday\"" },
        { NULL, "standard: B10", "standard: B10, place: x",
          "s.yaml:5:29: items[2].place: only samples have it" },
        { NULL, "sensor: el-1", "sensr: el-1",
          "s.yaml:2:1: sensr: no such key; did you mean \"sensor\"?" },
        { NULL, "", "method: ph\nitems: [ { sample: a } ]\n",
          "s.yaml:2:8: items: no check in the sheet: without one nothing can be released" },
        { NULL, "", "method: ph\nitems: []\n",
          "s.yaml:2:8: items: expected 1 to 400 items, got 0" },
        { NULL, "", "", "s.yaml: the file is empty: expected keys" },
        { NULL, "", "method: ph\n",
          "s.yaml:1:1: items: missing: expected the list of what is to be measured" },
    };
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);
    struct sm_setup *s = NULL;

    (void)state;
    assert_non_null(sheet);
    assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames), SM_OK);
    for (size_t i = 0; i < COUNT(cases); i++) {
        char *text = spoil(good_sheet, cases[i].old, cases[i].new);

        sm_blames_init(&b->blames, b->list, BLAMES);
        assert_int_equal(sm_sheet_load(s, "s.yaml", text, strlen(text), sheet, &b->blames),
                         SM_ESYNTAX);
        expect(b, &cases[i], text);
        assert_int_equal(sheet->n, 0); /* untouched on failure */
        free(text);
    }
    free(sheet);
    sm_setup_destroy(s);
    bench_end(b);
}

static void a_check_from_the_calibrations_own_lot_is_refused(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    char *text = spoil(good_sheet, "standard: B10", "standard: C7");
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);
    struct sm_setup *s = NULL;

    (void)state;
    assert_non_null(sheet);
    assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames), SM_OK);
    assert_int_equal(sm_sheet_load(s, "s.yaml", text, strlen(text), sheet, &b->blames), SM_ESYNTAX);
    assert_int_equal(b->blames.n, 2); /* both places where the check stands */
    assert_string_equal(b->list[0].text, "items[3].check: the check's lot is the calibration's own "
                                         "(V-077, as standard C7): take another lot");
    assert_int_equal(b->list[1].line, 9);
    free(text);
    free(sheet);
    sm_setup_destroy(s);
    bench_end(b);
}

static void a_sheet_of_more_items_than_fit_is_refused(void **state)
{
    struct bench *b = bench_begin(NULL, NULL, NULL);
    struct sm_sheet *sheet = calloc(1, sizeof *sheet);
    struct sm_setup *s = NULL;

    (void)state;
    assert_non_null(sheet);
    assert_int_equal(sm_setup_load(&b->source, SETUP, &s, &b->blames), SM_OK);
    for (size_t items = SM_ITEMS_MAX; items <= SM_ITEMS_MAX + 1; items++) {
        char *text = malloc(64 * (items + 2)), *at = text;

        assert_non_null(text);
        at += sprintf(at, "method: ph\nitems:\n  - { check: C7 }\n");
        for (size_t i = 1; i < items; i++)
            at += sprintf(at, "  - { sample: s%zu }\n", i);
        sm_blames_init(&b->blames, b->list, BLAMES);
        assert_int_equal(sm_sheet_load(s, "s.yaml", text, strlen(text), sheet, &b->blames),
                         items > SM_ITEMS_MAX ? SM_ESYNTAX : SM_OK);
        if (items > SM_ITEMS_MAX)
            assert_string_equal(b->list[0].text, "items: expected 1 to 400 items, got 401");
        free(text);
    }
    free(sheet);
    sm_setup_destroy(s);
    bench_end(b);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_good_setup_has_no_blame),
        cmocka_unit_test(a_bad_setup_file_is_blamed),
        cmocka_unit_test(a_bad_meter_file_is_blamed),
        cmocka_unit_test(a_bad_profile_is_blamed),
        cmocka_unit_test(a_profile_that_misreads_its_example_is_blamed_there),
        cmocka_unit_test(a_bad_method_is_blamed),
        cmocka_unit_test(what_is_not_built_is_said_to_be_not_possible_yet),
        cmocka_unit_test(bad_standards_are_blamed),
        cmocka_unit_test(a_table_that_names_no_source_is_blamed),
        cmocka_unit_test(everything_wrong_is_found_at_once_from_top_to_bottom),
        cmocka_unit_test(a_bad_sheet_is_blamed),
        cmocka_unit_test(a_check_from_the_calibrations_own_lot_is_refused),
        cmocka_unit_test(a_sheet_of_more_items_than_fit_is_refused),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
