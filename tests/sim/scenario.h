/* SPDX-License-Identifier: GPL-3.0-or-later */
/* scenario.h: what a simulated meter lives through: settings, then steps in order. Read from a
 * small text file, or built by the generator (random_session.h).
 *
 * The file: one statement a line, words and numbers with units parted by blanks, "quoted text" with
 * \r \n \t \\ \" \xNN, comments from # to the end of the line. Settings come before the first step,
 * each once at most. Every mistake is blamed with file:line:column.
 *
 * Settings
 *   seed 7
 *   signal mV                        the unit the meter shows; before anything that is in it
 *   rate 10 /s                       readings
 *   jitter 5 ms                      each reading up to so much early or late
 *   dropout 1 %                      readings that never come
 *   noise 0.05 mV [white | ar 0.5 | hum 3 /s | telegraph 0.05]
 *   step 0.1 mV                      of the display
 *   response [exponential] 0.5 s | double 0.5 s 20 s 10 % | hyperbolic 2 s | sqrt 0.01 s |
 *            layer 1 s
 *   drift 0 mV/h                     of the electrode
 *   temperature 20 °C                of solutions and of the air, where a step says no other
 *   probe-response 3 s               of the temperature channel
 *   electrode pH slope 98.6 % offset 3.9 mV
 *                                    log: the same; line: slope 0.215 offset 0.001
 *   open wander | rail 1999.9 mV | word "OVR"
 *                                    what the meter shows in air
 *   rinse-water 6.5 pH
 *   start 7.0 pH                     where the electrode stood before; left out: the rinse water
 *   tolerance 0.6 mV                 to which the truth states settling times
 *   dwell 3 s                        of the method, for the truth's "stayed_three"
 *   shape plain-mv                   or  shape "%+07.1v mV\r\n", see shape.h
 *   status st                        replaces the shape's word for "all is well"
 *   ask "R\r"   identity "I\r" "meter 7\r\n"       replace those of the shape
 *   answer 120 ms                    from a question to its answer
 *   split 4                          lines arrive in pieces of so many bytes, at 960 bytes/s
 * Steps
 *   in NAME 7.00 pH for 12 s [at 10.8 °C] [falling|rising 0.004 pH/min] [as standard|check|blank|…]
 *   back 5 s                         the probe is (still, or again) in that beaker
 *   air 1 s   lift 1 s               [wander | rail V | word W]; a lift ends with `back`
 *   rinse 1.5 s [in 6.5 pH]
 *   bubble 8 mV for 2 s              displaced by so much, then back
 *   stray 2 [by 40 mV]               the next readings are odd by so much, else by 3 to 100 mV
 *   silence 15 s                     nothing is sent or answered
 *   unplug 3 s                       the link goes and comes back
 *   word "WAIT" for 2 s              shown in place of values
 *   rubbish 200 [printable]          so many random bytes
 *   say "text" [times 3]             exactly these bytes
 *   halfline                         half a line, no end
 *   late 2 s                         the next answer takes so long
 *   drift 5 mV/h   noise …   response …            from here on */
#ifndef SM_SIM_SCENARIO_H
#define SM_SIM_SCENARIO_H
#include <stdint.h>

#include "base/blame.h"
#include "base/text.h"
#include "sim/electrode.h"
#include "sim/shape.h"

#define SM_SCENARIO_BYTES_MAX 65536 /* of a scenario file */
#define SM_SCENARIO_STEPS_MAX 100000
#define SM_SCENARIO_WORD 17

enum sm_sim_noise_kind {
    SM_SIM_NOISE_WHITE,
    SM_SIM_NOISE_AR,
    SM_SIM_NOISE_HUM,
    SM_SIM_NOISE_TELEGRAPH
};

struct sm_sim_noise {
    enum sm_sim_noise_kind kind;
    double sd;  /* of one reading, in the signal's unit */
    double how; /* AR: the lag-1 coefficient; HUM: /s; TELEGRAPH: chance of a flip per reading */
};

enum sm_sim_open_kind { SM_SIM_OPEN_WANDER, SM_SIM_OPEN_RAIL, SM_SIM_OPEN_WORD };

struct sm_sim_open {
    enum sm_sim_open_kind kind;
    double level; /* WANDER: how wide, a standard deviation; RAIL: the value; signal */
    double clear; /* WANDER: never nearer than this to where the electrode stands; signal */
    char word[SM_SCENARIO_WORD];
};

enum sm_sim_step_kind {
    SM_SIM_STEP_IN,
    SM_SIM_STEP_BACK,
    SM_SIM_STEP_AIR,
    SM_SIM_STEP_LIFT,
    SM_SIM_STEP_RINSE,
    SM_SIM_STEP_BUBBLE,
    SM_SIM_STEP_STRAY,
    SM_SIM_STEP_SILENCE,
    SM_SIM_STEP_UNPLUG,
    SM_SIM_STEP_WORD,
    SM_SIM_STEP_RUBBISH,
    SM_SIM_STEP_SAY,
    SM_SIM_STEP_HALFLINE,
    SM_SIM_STEP_LATE,
    SM_SIM_STEP_DRIFT,
    SM_SIM_STEP_NOISE,
    SM_SIM_STEP_RESPONSE,
    SM_SIM_STEP_KINDS
};
const char *sm_sim_step_name(enum sm_sim_step_kind k);

enum sm_sim_role {
    SM_SIM_ROLE_SAMPLE,
    SM_SIM_ROLE_STANDARD,
    SM_SIM_ROLE_CHECK,
    SM_SIM_ROLE_BLANK,
    SM_SIM_ROLE_DUPLICATE,
    SM_SIM_ROLE_SPIKE,
    SM_SIM_ROLE_COUNT
};
const char *sm_sim_role_name(enum sm_sim_role r);

struct sm_sim_step {
    enum sm_sim_step_kind kind;
    double span_s;                   /* how long; 0 for those that take no time */
    char name[SM_NAME_SIZE];         /* IN */
    enum sm_sim_role role;           /* IN */
    double value;                    /* IN, RINSE: of the solution */
    enum sm_unit unit;               /* IN, RINSE: of value */
    double per_s;                    /* IN: the sample's own change, unit/s */
    double celsius;                  /* IN, RINSE */
    double amount;                   /* BUBBLE, STRAY (0: at random): signal; DRIFT: signal/s */
    unsigned count;                  /* STRAY, RUBBISH, SAY */
    bool printable;                  /* RUBBISH */
    struct sm_sim_open open;         /* AIR, LIFT, WORD */
    struct sm_sim_response response; /* RESPONSE */
    struct sm_sim_noise noise;       /* NOISE */
    struct sm_sim_shape_text text;   /* SAY */
};

struct sm_scenario {
    uint64_t seed;
    enum sm_unit signal;
    double rate_per_s, jitter_s, dropout; /* dropout: 0 … 1 */
    struct sm_sim_noise noise;
    double display_step; /* 0: as the shape's decimals have it */
    struct sm_sim_response response;
    double drift_per_s; /* signal/s */
    double celsius, probe_response_s;
    struct sm_sim_electrode electrode;
    struct sm_sim_open open;
    double rinse_value; /* rinse water, in rinse_unit */
    enum sm_unit rinse_unit;
    double start_value; /* in start_unit */
    enum sm_unit start_unit;
    double tolerance, dwell_s; /* signal; s: what the truth is told against */
    struct sm_sim_shape shape;
    double answer_s;
    unsigned split; /* bytes; 0: whole lines */
    struct sm_sim_step *step;
    size_t n_steps, cap_steps;
};

/* The defaults: 1 reading/s in mV, response 1 s, no noise, 20 °C, shape plain-mv. */
void sm_scenario_init(struct sm_scenario *sc);
void sm_scenario_free(struct sm_scenario *sc);

/* Makes room for n steps in all: until then steps do not move. SM_ENOMEM, SM_EFULL. */
SM_MUST_CHECK enum sm_status sm_scenario_reserve(struct sm_scenario *sc, size_t n);

/* Adds a step. SM_ENOMEM; SM_EFULL: SM_SCENARIO_STEPS_MAX. */
SM_MUST_CHECK enum sm_status sm_scenario_add(struct sm_scenario *sc,
                                             const struct sm_sim_step *step);

/* What is "hundreds of mV" in the signal's unit: how wide an open input wanders unless told. */
double sm_scenario_wide(const struct sm_scenario *sc);

/* The settled signal of a solution. SM_EINVAL: its unit is not one that the electrode feels. */
SM_MUST_CHECK enum sm_status sm_scenario_signal(const struct sm_scenario *sc, double value,
                                                enum sm_unit unit, double celsius,
                                                double *ret_signal);

/* Reads a scenario's text into an initialised sc. SM_ESYNTAX: b holds what is wrong. */
SM_MUST_CHECK enum sm_status sm_scenario_read(struct sm_scenario *sc, const char *file,
                                              const char *text, size_t n, struct sm_blames *b);
#endif
