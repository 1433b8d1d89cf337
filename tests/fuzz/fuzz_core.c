/* SPDX-License-Identifier: GPL-3.0-or-later */
/* fuzz_core.c: any bytes as a sequence of inputs to a core: what a port, a clock and people may
 * bring, and much that they never would. The first bytes choose the setup. Checked: an event has
 * the next number and its input's time; it is written as one entry that can be read back; what is
 * carried is read back whole and is not too large; a new core begins from it; no deadline stays in
 * the past. */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "record/entry.h"
#include "view/sentence.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

#define CHECK(what)                                                                                \
    do {                                                                                           \
        if (!(what)) {                                                                             \
            fprintf(stderr, "%s:%d: broken: %s\n", __FILE__, __LINE__, #what);                     \
            abort();                                                                               \
        }                                                                                          \
    } while (0)

#define TICKS_MOST 64 /* at one time */
#define STEPS_MOST 800

struct bench {
    const uint8_t *at, *end; /* the bytes that are left */
    struct sm_profile profile;
    struct sm_method method[2];
    struct sm_standards standards;
    struct sm_core_setup setup;
    struct sm_sheet sheet;
    struct sm_carried carried;
    struct sm_core *core;
    int64_t n, t_ns, utc_us;
    unsigned steps;
};

static struct bench b;
static char line[SM_ENTRY_MAX], again[SM_ENTRY_MAX];

static unsigned byte(void)
{
    return b.at < b.end ? *b.at++ : 0;
}

static unsigned two(void)
{
    const unsigned high = byte();

    return high << 8 | byte();
}

/* ---- the setup ---- */

static void channel(struct sm_channel *c, const char *name, enum sm_unit unit, unsigned at)
{
    sm_text_copy(c->name, sizeof c->name, name);
    c->unit = unit;
    c->at = at;
    c->raw = true;
    c->scale = 1;
}

static void make_profile(unsigned choice)
{
    struct sm_profile *p = &b.profile;
    static const enum sm_eol eols[] = { SM_EOL_AUTO, SM_EOL_GAP, SM_EOL_CRLF, SM_EOL_LF };

    p->framing.eol = eols[choice & 3];
    p->framing.gap_ns = 50 * SM_NS_PER_MS;
    p->split = SM_SPLIT_SPACES;
    p->n_channels = 2;
    channel(&p->channel[0], "potential", SM_UNIT_MV, 1);
    channel(&p->channel[1], "probe", SM_UNIT_CELSIUS, 2);
    p->status_at = 3;
    sm_text_copy(p->open[0], SM_WORD_SIZE, "----");
    sm_text_copy(p->mark[0], SM_WORD_SIZE, "KEY");
    if (choice & 4) {
        p->ask = (struct sm_question){ "R\r", 2, SM_NS_PER_S, SM_NS_PER_S / 2 };
        p->identity = (struct sm_question){ "I\r", 2, 0, SM_NS_PER_S / 2 };
    }
    if (choice & 8)
        p->channel[0].scale = 1e200;
}

static void make_method(struct sm_method *m, const char *name, enum sm_model model, unsigned choice)
{
    sm_text_copy(m->name, sizeof m->name, name);
    m->measures = SM_UNIT_PH;
    sm_text_copy(m->signal, sizeof m->signal, "potential");
    m->signal_unit = SM_UNIT_MV;
    sm_text_copy(m->temperature, sizeof m->temperature, "probe");
    m->temperature_from = (enum sm_temperature_from)(choice % 3);
    m->assumed_c = 20;
    m->model = model;
    m->ph_iso = 7;
    m->rule.kind = SM_RULE_SPREAD;
    for (int c = 0; c < SM_CLASS_COUNT; c++) {
        m->rule.tolerance[c] = 0.6;
        m->rule.longest_wait_ns[c] = 30 * SM_NS_PER_S;
    }
    m->rule.dwell_ns = SM_NS_PER_S;
    m->rule.over_ns = SM_NS_PER_S;
    m->levels = 3;
    m->r_squared = (struct sm_limit){ true, 0.99 };
    m->back_calculated = (struct sm_limit){ true, 0.05 };
    m->check = (struct sm_limit){ (choice & 4) == 0, 0.1 };
    m->curve_valid_ns = 3600 * SM_NS_PER_S;
    m->marks = (choice & 8) != 0 ? SM_MARKS_REQUIRED : SM_MARKS_ASK;
}

static void make_standards(void)
{
    static const double ph[] = { 1.68, 4.00, 6.88, 9.22, 10.07 };

    b.standards.n = 5;
    for (size_t i = 0; i < 5; i++) {
        struct sm_standard *s = &b.standards.list[i];

        snprintf(s->name, sizeof s->name, "B%zu", i);
        sm_text_copy(s->lot, sizeof s->lot, "lot");
        s->has_expires = i == 4;
        s->expires_day = INT64_C(20788) + 2; /* two days after the beginning */
        s->unit = SM_UNIT_PH;
        s->n_values = 1;
        s->t_c[0] = 20;
        s->value[0] = ph[i];
        s->table_column = -1;
    }
}

static void make_setup(void)
{
    const unsigned choice = byte(), rules = byte();

    make_profile(choice);
    make_method(&b.method[0], "one", SM_MODEL_NERNST, rules);
    make_method(&b.method[1], "two", (rules & 16) != 0 ? SM_MODEL_QUADRATIC : SM_MODEL_LINE,
                rules / 2);
    make_standards();
    sm_text_copy(b.setup.meter, sizeof b.setup.meter, "m");
    sm_text_copy(b.setup.sensor, sizeof b.setup.sensor, "e");
    b.setup.silence_ns = 10 * SM_NS_PER_S;
    b.setup.profile = &b.profile;
    b.setup.method = b.method;
    b.setup.n_methods = 2;
    b.setup.standards = &b.standards;
    b.utc_us = INT64_C(20788) * SM_US_PER_DAY;
}

/* ---- what must hold ---- */

static void check_carried(const json_t *entry, const struct sm_carried *c)
{
    static struct sm_carried back;
    unsigned passed_over = 0;
    struct sm_text one, two_;
    char why[SM_REASON_SIZE];

    CHECK(sm_carried_read(entry, &back, &passed_over, why) == SM_OK && passed_over == 0);
    sm_text_init(&one, line, sizeof line);
    sm_carried_write(&one, c);
    sm_text_init(&two_, again, sizeof again);
    sm_carried_write(&two_, &back);
    CHECK(one.len == two_.len && memcmp(line, again, one.len) == 0);
    CHECK(one.len <= SM_CARRIED_MAX);
}

static void check_event(const struct sm_event *e)
{
    static struct sm_entry entry;
    struct sm_entry_store store;
    struct sm_text t;
    char why[SM_REASON_SIZE];

    CHECK(e->t_ns == b.t_ns && e->utc_us == b.utc_us);
    sm_text_init(&t, line, sizeof line);
    sm_entry_event(&t, e);
    CHECK(!t.cut);
    if (sm_event_class(e->kind) == SM_LIVE) {
        CHECK(e->n == 0);
        return;
    }
    CHECK(e->n == ++b.n);
    sm_entry_store_init(&store);
    CHECK(sm_entry_read(line, t.len - 1, &store, &entry, why) == SM_OK);
    CHECK(entry.kind == SM_ENTRY_EVENT && entry.event == e->kind && entry.n == e->n);
    if (e->kind == SM_EVENT_CARRIED)
        check_carried(entry.json, e->u.carried);
    json_decref(entry.json);
    sm_entry_store_finish(&store);
}

static void check_status(void)
{
    struct sm_core_status s;
    char sentence[1024];
    struct sm_text t;

    sm_core_status(b.core, &s);
    sm_text_init(&t, sentence, sizeof sentence);
    sm_sentence(&s, b.t_ns, &t);
    CHECK(s.measured <= s.items && t.len > 0);
}

static void feed(struct sm_input *in)
{
    const struct sm_event *e;
    enum sm_status s;

    in->n = b.n + 1;
    in->t_ns = b.t_ns;
    in->utc_us = b.utc_us;
    in->chunk.t_ns = b.t_ns;
    s = sm_core_feed(b.core, in);
    if (s != SM_OK) { /* only what cannot be, and nothing has changed */
        CHECK(s == SM_EINVAL && in->kind == SM_INPUT_BYTES);
        return;
    }
    b.n = in->n;
    b.steps++;
    while (sm_core_next(b.core, &e))
        check_event(e);
    CHECK(sm_core_last_n(b.core) == b.n);
}

static void ticks(void)
{
    for (unsigned i = 0; sm_core_deadline(b.core) <= b.t_ns; i++) {
        struct sm_input in = { .kind = SM_INPUT_TICK };

        CHECK(i < TICKS_MOST);
        feed(&in);
    }
}

static void later(int64_t ns)
{
    if (ns > INT64_C(2000) * 86400 * SM_NS_PER_S || b.t_ns > INT64_MAX / 8)
        return;
    b.t_ns += ns;
    b.utc_us += ns / 1000;
    ticks();
}

/* ---- inputs ---- */

static void raw_bytes(void)
{
    static unsigned char bytes[300];
    static uint16_t bad[2];
    struct sm_input in = { .kind = SM_INPUT_BYTES };

    in.chunk.n = byte();
    for (size_t i = 0; i < in.chunk.n; i++)
        bytes[i] = (unsigned char)byte();
    in.chunk.bytes = bytes;
    if ((byte() & 3) == 3) {
        bad[0] = (uint16_t)byte();
        bad[1] = (uint16_t)byte();
        in.chunk.bad = bad;
        in.chunk.n_bad = 2;
    }
    feed(&in);
}

/* So many readings of one value, ten a second. */
static void readings(void)
{
    static const char *const end[] = { "20.0\r\n", "20.0 KEY\r\n", "25.5\r\n", "\r\n" };
    const double mv = ((int)two() - 32768) / 10.0;
    const unsigned how = byte(), count = 1 + how % 64;
    char text[64];

    for (unsigned i = 0; i < count && b.steps < STEPS_MOST; i++) {
        struct sm_input in = { .kind = SM_INPUT_BYTES };

        later(SM_NS_PER_S / 10);
        snprintf(text, sizeof text, "%.1f %s", mv, end[(how >> 6) & (i == 0 ? 3 : 2)]);
        in.chunk.bytes = (const unsigned char *)text;
        in.chunk.n = strlen(text);
        feed(&in);
    }
}

static void make_sheet(void)
{
    static const enum sm_item_kind kinds[] = { SM_ITEM_STANDARD, SM_ITEM_CHECK,     SM_ITEM_SAMPLE,
                                               SM_ITEM_BLANK,    SM_ITEM_DUPLICATE, SM_ITEM_SPIKE };

    memset(&b.sheet, 0, sizeof b.sheet);
    sm_text_copy(b.sheet.file, sizeof b.sheet.file, "s.yaml");
    b.sheet.method = (int)(byte() % 3) - (byte() == 7); /* 2 and -1: there is none */
    b.sheet.n = 1 + byte() % 16;
    for (size_t i = 0; i < b.sheet.n; i++) {
        struct sm_item *item = &b.sheet.item[i];
        const unsigned c = byte();

        item->kind = kinds[c % 6];
        snprintf(item->name, sizeof item->name, "item-%zu", i);
        item->standard = (int)(c / 6 % 7) - 1;
    }
}

static void words(char *out, size_t cap)
{
    size_t n = byte() % 80;

    for (size_t i = 0; i < n && i + 1 < cap; i++)
        out[i] = (char)(byte() | 1); /* never the end */
}

static void act(void)
{
    static struct sm_input in;
    const unsigned how = byte();

    memset(&in, 0, sizeof in);
    in.kind = SM_INPUT_ACT;
    in.act.act = (enum sm_act_kind)(byte() % SM_ACT_COUNT);
    in.act.has_seen = (how & 1) == 0;
    in.act.seen = (how & 2) != 0 ? (int64_t)byte() - 100 : b.n;
    in.act.has_temperature = (how & 4) != 0;
    in.act.temperature_c = (how & 8) != 0 ? (double)NAN : (double)byte() - 50;
    snprintf(in.act.id, sizeof in.act.id, "%lld", (long long)((how & 16) != 0 ? b.n : b.n / 100));
    if ((how & 32) != 0)
        words(in.act.id, sizeof in.act.id);
    sm_text_copy(in.act.text, sizeof in.act.text, "word");
    sm_text_copy(in.act.why, sizeof in.act.why, "because");
    if ((how & 64) != 0) {
        words(in.act.text, sizeof in.act.text);
        words(in.act.who, sizeof in.act.who);
        words(in.act.why, sizeof in.act.why);
    }
    if (in.act.act == SM_ACT_SHEET && (how & 128) == 0) {
        make_sheet();
        in.act.sheet = &b.sheet;
    }
    feed(&in);
}

static void link_change(void)
{
    static struct sm_input in;

    memset(&in, 0, sizeof in);
    in.kind = SM_INPUT_LINK;
    in.link.state = (enum sm_link_state)(byte() % 3);
    in.link.continues = byte() == 1;
    sm_text_copy(in.link.settings, sizeof in.link.settings, "9600 8N1");
    feed(&in);
}

static void clock_change(void)
{
    struct sm_input in = { .kind = SM_INPUT_CLOCK };

    in.clock_what = byte() & 1 ? SM_CLOCK_JUMP : SM_CLOCK_SUSPEND;
    in.clock_by_us = ((int64_t)two() - 32768) * 1000000;
    if (in.clock_what == SM_CLOCK_JUMP)
        b.utc_us += in.clock_by_us;
    feed(&in);
}

/* Another core, from what is carried. */
static void begin_again(void)
{
    const struct sm_sheet *in_force = sm_core_sheet(b.core);
    static struct sm_sheet sheet;
    struct sm_core *next = NULL;
    char why[SM_REASON_SIZE];

    if (in_force != NULL)
        sheet = *in_force;
    CHECK(sm_core_start(&b.setup, &b.carried, in_force != NULL ? &sheet : NULL, &next, why) ==
          SM_OK);
    sm_core_destroy(b.core);
    b.core = next;
    b.t_ns = 0;
    CHECK(sm_core_deadline(b.core) >= 0);
}

static void new_file(void)
{
    const bool crash = byte() & 1;
    struct sm_input in = { .kind = SM_INPUT_ROLL };

    if (!crash && !sm_core_may_cut(b.core))
        return;
    if (!crash)
        feed(&in);
    sm_core_carried(b.core, &b.carried);
    if (crash) {
        sm_carried_interrupt(&b.carried);
        sm_carried_age(&b.carried, byte() == 255 ? INT64_MAX : (int64_t)two() * SM_NS_PER_S);
    }
    begin_again();
    link_change();
}

static void one(void)
{
    struct sm_input in = { .kind = SM_INPUT_TICK };
    static const int64_t spans_ns[] = {
        0, 1, SM_NS_PER_MS, SM_NS_PER_S, 60 * SM_NS_PER_S, 3600 * SM_NS_PER_S
    };

    switch (byte() % 12) {
    case 0:
        later(spans_ns[byte() % 6] * (int64_t)byte());
        break;
    case 1:
        raw_bytes();
        break;
    case 2:
        feed(&in); /* before its time */
        break;
    case 3:
    case 4:
        act();
        break;
    case 5:
        link_change();
        break;
    case 6:
        clock_change();
        break;
    case 7:
        new_file();
        break;
    case 8:
        in.kind = SM_INPUT_SENT;
        feed(&in);
        break;
    default:
        readings();
        break;
    }
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    struct sm_input up = { .kind = SM_INPUT_LINK };
    char why[SM_REASON_SIZE];

    memset(&b, 0, sizeof b);
    b.at = data;
    b.end = data + size;
    make_setup();
    sm_carried_init(&b.carried);
    CHECK(sm_core_start(&b.setup, &b.carried, NULL, &b.core, why) == SM_OK);
    feed(&up);
    while (b.at < b.end && b.steps < STEPS_MOST) {
        one();
        check_status();
    }
    sm_core_destroy(b.core);
    return 0;
}
