/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sim.c: see sim.h. At any moment one of a few things is due first: a piece of a line under way,
 * the next step of the scenario, the link's return, a reading, an answer. */
#include "sim/sim.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/time.h"
#include "sim/prng.h"

#define HEARD_MAX 512
static const double wander_s = 1;              /* memory of an open input */
static const double slow_byte_s = 1.0 / 960;   /* a line in pieces: ten bits at 9600 baud */
static const double fast_byte_s = 1.0 / 11520; /* rubbish: 115,200 baud */
#define RUBBISH_PIECE 256U

enum answer { ANSWER_NONE, ANSWER_READING, ANSWER_IDENTITY };

struct sm_sim {
    const struct sm_scenario *sc;
    struct sm_sim_prng noise, air, clock, bytes, stray;
    struct sm_sim_probe probe;
    int64_t now_t_ns;
    size_t next_step;       /* the first not begun */
    int64_t next_step_t_ns; /* when it begins, or the end of the session */
    bool ended;

    double noise_now, telegraph; /* AR memory; side of the telegraph */
    struct sm_sim_noise noise_how;
    bool in_air;
    struct sm_sim_open open; /* how it is shown in air */
    double wander;           /* the open input less the probe, */
    int64_t wander_t_ns;     /* as it was then */
    double bubble;
    int64_t bubble_to_t_ns, word_to_t_ns, silent_to_t_ns;
    char word[SM_SCENARIO_WORD];
    unsigned stray_left;
    double stray_by; /* 0: at random */
    double late_s;   /* the next answer; 0: as usual */
    bool down;
    int64_t up_t_ns;

    unsigned long n_read; /* readings due so far */
    int64_t read_t_ns;    /* the next */
    unsigned long number; /* lines written */
    enum answer answer;
    int64_t answer_t_ns;
    char heard[HEARD_MAX];
    size_t n_heard;

    char out[SM_SIM_SHAPE_LINE]; /* the line under way */
    size_t out_n, out_at;
    int64_t out_t_ns;
    bool out_is_reading;
    unsigned rubbish_left;
    bool rubbish_printable;
    const struct sm_sim_step *saying; /* a SAY step under way */
    unsigned say_left;
    size_t said;
    char shown_text[SM_SIM_SHAPE_LINE];
    bool shown_word, shown_complete;
};

static int64_t ns(double s)
{
    return (int64_t)llround(s * 1e9);
}

/* When the next reading is due: the n-th of an even row, early or late by the jitter. */
static void schedule_reading(struct sm_sim *s)
{
    const struct sm_scenario *sc = s->sc;
    const double even_s = (double)s->n_read / sc->rate_per_s;
    const double off_s = sc->jitter_s * (2 * sm_sim_prng_uniform(&s->clock) - 1);
    const int64_t t_ns = ns(even_s + off_s);

    s->n_read++;
    s->read_t_ns = t_ns > s->read_t_ns ? t_ns : s->read_t_ns + 1;
}

enum sm_status sm_sim_create(const struct sm_scenario *sc, struct sm_sim **ret_sim)
{
    struct sm_sim *s = calloc(1, sizeof *s);

    if (!s)
        return SM_ENOMEM;
    s->sc = sc;
    sm_sim_prng_init(&s->noise, sc->seed, 1);
    sm_sim_prng_init(&s->air, sc->seed, 2);
    sm_sim_prng_init(&s->clock, sc->seed, 3);
    sm_sim_prng_init(&s->bytes, sc->seed, 4);
    sm_sim_prng_init(&s->stray, sc->seed, 5);
    sm_sim_probe_start(&s->probe, sc);
    s->noise_how = sc->noise;
    s->noise_now = sm_sim_prng_normal(&s->noise);
    s->telegraph = 1;
    s->read_t_ns = -1;
    schedule_reading(s);
    if (sc->shape.ask.n > 0)
        s->read_t_ns = SM_NEVER;
    *ret_sim = s;
    return SM_OK;
}

void sm_sim_destroy(struct sm_sim *s)
{
    free(s);
}

const struct sm_sim_step *sm_sim_step_now(const struct sm_sim *s)
{
    return s->next_step == 0 ? NULL : &s->sc->step[s->next_step - 1];
}

/* What is due first; ties go to what stands first here. */
enum due { DUE_PIECE, DUE_UP, DUE_STEP, DUE_ANSWER, DUE_READING };

static int64_t due(const struct sm_sim *s, enum due *ret_due)
{
    const bool piece = s->out_at < s->out_n || s->rubbish_left > 0 || s->say_left > 0;
    const int64_t at[] = {
        [DUE_PIECE] = piece ? s->out_t_ns : SM_NEVER,
        [DUE_UP] = s->down ? s->up_t_ns : SM_NEVER,
        [DUE_STEP] = s->next_step_t_ns,
        [DUE_ANSWER] = s->answer != ANSWER_NONE && !piece ? s->answer_t_ns : SM_NEVER,
        [DUE_READING] = piece ? SM_NEVER : s->read_t_ns,
    };
    enum due first = DUE_PIECE;

    for (enum due d = DUE_UP; d <= DUE_READING; d++)
        if (at[d] < at[first])
            first = d;
    *ret_due = first;
    return at[first] > s->now_t_ns ? at[first] : s->now_t_ns;
}

int64_t sm_sim_due(const struct sm_sim *s)
{
    enum due d;

    return s->ended ? s->now_t_ns : due(s, &d);
}

static double noise(struct sm_sim *s, double t_s)
{
    const struct sm_sim_noise *n = &s->noise_how;

    switch (n->kind) {
    case SM_SIM_NOISE_AR:
        s->noise_now =
            n->how * s->noise_now + sqrt(1 - n->how * n->how) * sm_sim_prng_normal(&s->noise);
        return n->sd * s->noise_now;
    case SM_SIM_NOISE_HUM:
        return n->sd * sqrt(2.0) * sin(6.283185307179586 * fmod(n->how * t_s, 1.0));
    case SM_SIM_NOISE_TELEGRAPH:
        if (sm_sim_prng_chance(&s->noise, n->how))
            s->telegraph = -s->telegraph;
        return n->sd * s->telegraph;
    case SM_SIM_NOISE_WHITE:
        break;
    }
    return n->sd * sm_sim_prng_normal(&s->noise);
}

/* The open input: a random walk held together over about wander_s, hundreds of mV wide. */
static double wander(struct sm_sim *s, int64_t t_ns)
{
    const double keep = exp(-1e-9 * (double)(t_ns - s->wander_t_ns) / wander_s);

    s->wander =
        keep * s->wander + sqrt(1 - keep * keep) * s->open.level * sm_sim_prng_normal(&s->air);
    s->wander_t_ns = t_ns;
    if (fabs(s->wander) < s->open.clear)
        s->wander = copysign(s->open.clear, s->wander);
    return s->wander;
}

static double stray(struct sm_sim *s)
{
    const double by = sm_sim_prng_log_between(&s->stray, 3, 100) * sm_scenario_wide(s->sc) / 300;

    s->stray_left--;
    if (s->stray_by > 0 || s->stray_by < 0)
        return s->stray_by;
    return sm_sim_prng_chance(&s->stray, 0.5) ? by : -by;
}

/* What the display shows at t. */
static void show(struct sm_sim *s, int64_t t_ns, struct sm_sim_shown *ret)
{
    const double step = s->sc->display_step;
    const char *word = s->in_air && s->open.kind == SM_SIM_OPEN_WORD ? s->open.word : NULL;
    double v = sm_sim_probe_signal(&s->probe, t_ns) + noise(s, 1e-9 * (double)t_ns);

    if (t_ns < s->word_to_t_ns)
        word = s->word;
    if (s->in_air && s->open.kind == SM_SIM_OPEN_WANDER)
        v += wander(s, t_ns);
    else if (s->in_air && s->open.kind == SM_SIM_OPEN_RAIL)
        v = s->open.level;
    else if (t_ns < s->bubble_to_t_ns)
        v += s->bubble;
    if (s->stray_left > 0)
        v += stray(s);
    if (step > 0)
        v = step * round(v / step);
    *ret = (struct sm_sim_shown){ v, word, sm_sim_probe_celsius(&s->probe, t_ns), ++s->number };
}

/* Puts a line on the wire; its value as text is kept for sm_sim_reading. */
static void line_begin(struct sm_sim *s, int64_t t_ns)
{
    const int decimals = sm_sim_shape_decimals(&s->sc->shape.line);
    struct sm_sim_shown shown;

    show(s, t_ns, &shown);
    s->out_n = sm_sim_shape_write(&s->sc->shape, &shown, s->out);
    s->out_at = 0;
    s->out_t_ns = t_ns;
    s->out_is_reading = true;
    s->shown_word = shown.word != NULL;
    if (shown.word)
        snprintf(s->shown_text, sizeof s->shown_text, "%s", shown.word);
    else
        snprintf(s->shown_text, sizeof s->shown_text, "%.*f", decimals < 0 ? 6 : decimals,
                 shown.value);
}

/* The part of a line, of rubbish or of a saying that goes out now; returns its length. */
static size_t line_piece(struct sm_sim *s, char *buf, size_t cap)
{
    size_t n = s->out_n - s->out_at;

    if (s->sc->split > 0 && n > s->sc->split)
        n = s->sc->split;
    if (n > cap)
        n = cap;
    memcpy(buf, s->out + s->out_at, n);
    s->out_at += n;
    if (s->sc->split > 0)
        s->out_t_ns = s->now_t_ns + ns((double)n * slow_byte_s);
    s->shown_complete = s->out_is_reading && s->out_at == s->out_n;
    return n;
}

static size_t rubbish_piece(struct sm_sim *s, char *buf, size_t cap)
{
    size_t n = s->rubbish_left < RUBBISH_PIECE ? s->rubbish_left : RUBBISH_PIECE;

    if (n > cap)
        n = cap;
    for (size_t i = 0; i < n; i++)
        buf[i] = (char)(s->rubbish_printable ? ' ' + (int)sm_sim_prng_below(&s->bytes, 95)
                                             : (int)sm_sim_prng_below(&s->bytes, 256) - 128);
    s->rubbish_left -= (unsigned)n;
    s->out_t_ns = s->now_t_ns + ns((double)n * fast_byte_s);
    return n;
}

static size_t say_piece(struct sm_sim *s, char *buf, size_t cap)
{
    const struct sm_sim_shape_text *text = &s->saying->text;
    size_t n = text->n - s->said;

    if (n > cap)
        n = cap;
    memcpy(buf, text->bytes + s->said, n);
    s->said += n;
    if (s->said == text->n) {
        s->said = 0;
        s->say_left--;
    }
    s->out_t_ns = s->now_t_ns + ns((double)n * fast_byte_s);
    return n;
}

static void wire_clear(struct sm_sim *s)
{
    s->out_n = s->out_at = 0;
    s->rubbish_left = s->say_left = 0;
    s->answer = ANSWER_NONE;
    s->n_heard = 0;
}

/* What a step does to the meter and its wire (sm_sim_probe_step: what it does to the electrode). */
static void step_on_wire(struct sm_sim *s, const struct sm_sim_step *step, int64_t t_ns)
{
    const int64_t end_t_ns = t_ns + sm_sim_step_span_ns(step);

    switch (step->kind) {
    case SM_SIM_STEP_BUBBLE:
        s->bubble = step->amount;
        s->bubble_to_t_ns = end_t_ns;
        break;
    case SM_SIM_STEP_STRAY:
        s->stray_left = step->count;
        s->stray_by = step->amount;
        break;
    case SM_SIM_STEP_SILENCE:
        wire_clear(s);
        s->silent_to_t_ns = end_t_ns;
        break;
    case SM_SIM_STEP_UNPLUG:
        wire_clear(s);
        s->silent_to_t_ns = s->up_t_ns = end_t_ns;
        s->down = true;
        break;
    case SM_SIM_STEP_WORD:
        memcpy(s->word, step->open.word, sizeof s->word);
        s->word_to_t_ns = end_t_ns;
        break;
    case SM_SIM_STEP_RUBBISH:
        s->rubbish_left = step->count;
        s->rubbish_printable = step->printable;
        s->out_t_ns = t_ns;
        break;
    case SM_SIM_STEP_SAY:
        s->saying = step;
        s->say_left = step->count;
        s->said = 0;
        s->out_t_ns = t_ns;
        break;
    case SM_SIM_STEP_HALFLINE:
        line_begin(s, t_ns);
        s->out_n = (s->out_n + 1) / 2;
        s->out_is_reading = false;
        break;
    case SM_SIM_STEP_LATE:
        s->late_s = step->amount;
        break;
    case SM_SIM_STEP_NOISE:
        s->noise_how = step->noise;
        break;
    default:
        break;
    }
}

static enum sm_sim_what step_begin(struct sm_sim *s, int64_t t_ns)
{
    if (s->next_step == s->sc->n_steps) {
        s->ended = true;
        return SM_SIM_END;
    }
    const struct sm_sim_step *step = &s->sc->step[s->next_step++];
    s->next_step_t_ns = t_ns + sm_sim_step_span_ns(step);
    sm_sim_probe_step(&s->probe, s->sc, step, t_ns);
    if (step->kind == SM_SIM_STEP_AIR || step->kind == SM_SIM_STEP_LIFT) {
        const double far = step->open.level * sm_sim_prng_between(&s->air, 0.4, 1.6);
        s->in_air = true;
        s->open = step->open;
        s->wander = sm_sim_prng_chance(&s->air, 0.5) ? far : -far;
        s->wander_t_ns = t_ns;
    } else if (step->kind == SM_SIM_STEP_IN || step->kind == SM_SIM_STEP_BACK ||
               step->kind == SM_SIM_STEP_RINSE) {
        s->in_air = false;
    }
    step_on_wire(s, step, t_ns);
    return step->kind == SM_SIM_STEP_UNPLUG ? SM_SIM_DOWN : SM_SIM_STEP;
}

static void answer_begin(struct sm_sim *s, int64_t t_ns)
{
    const enum answer answer = s->answer;

    s->answer = ANSWER_NONE;
    if (answer == ANSWER_READING) {
        line_begin(s, t_ns);
        return;
    }
    s->out_n = s->sc->shape.identity_answer.n;
    s->out_at = 0;
    s->out_t_ns = t_ns;
    s->out_is_reading = false;
    memcpy(s->out, s->sc->shape.identity_answer.bytes, s->out_n);
}

static void reading_begin(struct sm_sim *s, int64_t t_ns)
{
    const struct sm_sim_shape_text *ask = &s->sc->shape.ask;

    schedule_reading(s);
    if (t_ns < s->silent_to_t_ns || sm_sim_prng_chance(&s->clock, s->sc->dropout))
        return;
    if (ask->n > 0)
        sm_sim_ask(s, t_ns, ask->bytes, ask->n);
    else
        line_begin(s, t_ns);
}

enum sm_sim_what sm_sim_next(struct sm_sim *s, int64_t *ret_t_ns, char *buf, size_t cap,
                             size_t *ret_n)
{
    enum due what;

    *ret_n = 0;
    s->shown_complete = false;
    if (!s->ended)
        s->now_t_ns = due(s, &what);
    *ret_t_ns = s->now_t_ns;
    if (s->ended)
        return SM_SIM_END;
    switch (what) {
    case DUE_PIECE:
        *ret_n = s->out_at < s->out_n  ? line_piece(s, buf, cap)
                 : s->rubbish_left > 0 ? rubbish_piece(s, buf, cap)
                                       : say_piece(s, buf, cap);
        return SM_SIM_BYTES;
    case DUE_UP:
        s->down = false;
        return SM_SIM_UP;
    case DUE_STEP:
        return step_begin(s, s->now_t_ns);
    case DUE_ANSWER:
        answer_begin(s, s->now_t_ns);
        return SM_SIM_QUIET;
    case DUE_READING:
        reading_begin(s, s->now_t_ns);
        break;
    }
    return SM_SIM_QUIET;
}

static bool ends_with(const char *bytes, size_t n, const struct sm_sim_shape_text *end)
{
    return end->n > 0 && n >= end->n && memcmp(bytes + n - end->n, end->bytes, end->n) == 0;
}

void sm_sim_ask(struct sm_sim *s, int64_t t_ns, const char *bytes, size_t n)
{
    if (s->down || t_ns < s->silent_to_t_ns)
        return;
    for (size_t i = 0; i < n; i++) {
        if (s->n_heard == HEARD_MAX) { /* rubbish: only its end can be a question */
            memmove(s->heard, s->heard + HEARD_MAX / 2, HEARD_MAX - HEARD_MAX / 2);
            s->n_heard -= HEARD_MAX / 2;
        }
        s->heard[s->n_heard++] = bytes[i];
        if (ends_with(s->heard, s->n_heard, &s->sc->shape.ask))
            s->answer = ANSWER_READING;
        else if (ends_with(s->heard, s->n_heard, &s->sc->shape.identity))
            s->answer = ANSWER_IDENTITY;
        else
            continue;
        s->n_heard = 0;
        s->answer_t_ns = t_ns + ns(s->late_s > 0 ? s->late_s : s->sc->answer_s);
        s->late_s = 0;
    }
}

void sm_sim_ask_itself(struct sm_sim *s)
{
    s->read_t_ns = s->sc->shape.ask.n > 0 && s->read_t_ns == SM_NEVER ? 0 : s->read_t_ns;
}

bool sm_sim_reading(struct sm_sim *s, int64_t *ret_t_ns, char ret_text[SM_SIM_SHAPE_LINE],
                    bool *ret_word)
{
    char buf[SM_SIM_SHAPE_LINE];
    size_t n;

    for (;;) {
        const enum sm_sim_what what = sm_sim_next(s, ret_t_ns, buf, sizeof buf, &n);
        if (what == SM_SIM_END)
            return false;
        if (!s->shown_complete)
            continue;
        memcpy(ret_text, s->shown_text, sizeof s->shown_text);
        *ret_word = s->shown_word;
        return true;
    }
}
