/* SPDX-License-Identifier: GPL-3.0-or-later */
/* method.h: the rules of one method: what settled means, which standards, what is accepted. Filled
 * by lib/setup from conf/methods/; every limit names the quantity it limits. */
#ifndef SM_BENCH_METHOD_H
#define SM_BENCH_METHOD_H
#include "base/unit.h"
#include "curve/curve.h"
#include "reading/reading.h"
#include "signal/rule.h"

#define SM_METHODS_MAX 16
#define SM_CAUTIONS_MAX 8
#define SM_CAUTION_SIZE 400

enum sm_temperature_from {
    SM_TEMPERATURE_CHANNEL, /* measured by the meter */
    SM_TEMPERATURE_TYPED,   /* typed by the analyst (act `temperature`) */
    SM_TEMPERATURE_ASSUMED  /* a fixed figure of the method */
};

struct sm_limit {
    bool has;
    double value; /* in the unit that the field's comment names */
};

struct sm_window_limit {
    struct sm_limit from, to, warn_from, warn_to;
};

enum sm_caution_when {
    SM_CAUTION_LOADING,
    SM_CAUTION_STANDARD,
    SM_CAUTION_CHECK,
    SM_CAUTION_SAMPLE
};

struct sm_caution {
    enum sm_caution_when when;
    char text[SM_CAUTION_SIZE];
};

enum sm_marks { SM_MARKS_ASK, SM_MARKS_REQUIRED, SM_MARKS_NONE };
enum sm_redo { SM_REDO_FOR_CAUSE, SM_REDO_MEAN, SM_REDO_FIRST };

struct sm_method {
    char name[SM_NAME_SIZE];
    enum sm_unit measures;        /* unit of results */
    char signal[SM_CHANNEL_SIZE]; /* the channel that must settle */
    enum sm_unit signal_unit;     /* its unit: tolerance, residual SD and offset are in it */
    enum sm_temperature_from temperature_from;
    char temperature[SM_CHANNEL_SIZE]; /* CHANNEL */
    double assumed_c;                  /* ASSUMED, °C */
    enum sm_model model;
    double ph_iso, ph_iso_half_width;
    struct sm_rule rule;                                  /* resolved in the signal's unit */
    struct sm_quantity tolerance_written[SM_CLASS_COUNT]; /* as in the file */
    char note[SM_REASON_SIZE]; /* a sentence shown with the rule: "for the demonstration: …" */
    unsigned levels, levels_after_drop; /* distinct standards needed */
    struct sm_limit r_squared;
    struct sm_limit residual_sd;                   /* signal unit */
    struct sm_window_limit slope;                  /* % of theory */
    struct sm_window_limit offset;                 /* signal unit */
    struct sm_limit back_calculated;               /* unit of results */
    struct sm_limit leave_one_out;                 /* unit of results */
    int64_t curve_valid_ns;                        /* 0: no end by age */
    struct sm_limit after_curve, after_curve_warn; /* unit of results */
    struct sm_limit check, check_warn;             /* unit of results */
    unsigned check_every;                          /* samples; 0: not */
    bool check_at_end;
    struct sm_limit duplicate; /* unit of results */
    unsigned duplicate_one_in; /* 0: not asked for */
    enum sm_marks marks;
    enum sm_redo redo;
    int64_t idle_ns, gap_ns;
    size_t n_cautions;
    struct sm_caution caution[SM_CAUTIONS_MAX];
};
#endif
