/* SPDX-License-Identifier: GPL-3.0-or-later */
/* setup.h: setup files (YAML) to typed setup. Pure: texts come from whoever can read them, so that
 * replay reads the same setup out of a bench log. All errors at once, each with its place. */
#ifndef SM_SETUP_SETUP_H
#define SM_SETUP_SETUP_H
#include "base/blame.h"
#include "core/core.h"

#define SM_METERS_MAX 32
#define SM_SETUP_FILES_MAX 128
#define SM_SETUP_FILE_MAX (128u * 1024u) /* bytes of one file */
#define SM_SETUP_PATH_SIZE 256

enum sm_parity { SM_PARITY_NONE, SM_PARITY_EVEN, SM_PARITY_ODD, SM_PARITY_MARK, SM_PARITY_SPACE };
enum sm_flow { SM_FLOW_NONE, SM_FLOW_RTS_CTS, SM_FLOW_XON_XOFF };

struct sm_port_setup {
    char port[SM_SETUP_PATH_SIZE]; /* device path as written */
    unsigned baud, bits, stop;
    enum sm_parity parity;
    enum sm_flow flow;
    bool dtr, rts;
    bool other_adapter; /* a different adapter is allowed back on this port */
};

/* One file that was read, as it goes into the log. */
struct sm_setup_file {
    char name[SM_SETUP_PATH_SIZE]; /* as reached from the setup file: "conf/methods/ph.yaml" */
    char *text;                    /* owned by the setup */
    size_t n;
};

struct sm_meter_setup {
    struct sm_port_setup port;
    struct sm_core_setup core; /* meter's name, sensor, silence, pointers into struct sm_setup */
};

struct sm_setup {
    char file[SM_SETUP_PATH_SIZE];
    char logs[SM_SETUP_PATH_SIZE],
        state[SM_SETUP_PATH_SIZE];   /* joined to the setup file's folder */
    char socket[SM_SETUP_PATH_SIZE]; /* "" not stated */
    size_t n_people;
    struct sm_person people[SM_PEOPLE_MAX];
    size_t n_meters;
    struct sm_meter_setup meter[SM_METERS_MAX];
    size_t n_profiles;
    struct sm_profile profile[SM_METERS_MAX];
    size_t n_methods;
    struct sm_method method[SM_METHODS_MAX];
    struct sm_standards standards;
    size_t n_files;
    struct sm_setup_file files[SM_SETUP_FILES_MAX];
};

/* Where texts come from: the file system in the daemon, the `file` entries in replay. */
struct sm_source {
    void *ctx;
    /* The whole text of a file, in malloc'd storage that the caller frees.
     *   SM_EIO no such file or not readable; SM_EFULL larger than limit: ret_why */
    enum sm_status (*get)(void *ctx, const char *name, size_t limit, char **ret_text, size_t *ret_n,
                          char ret_why[SM_REASON_SIZE]);
    /* Names of all method files beside the setup ("conf/methods/…"), so that a sheet may name any:
     * calls back for each in a fixed (sorted) order. */
    enum sm_status (*list)(void *ctx, const char *folder, void (*each)(void *arg, const char *name),
                           void *arg);
};

/* Reads the setup file and all that it refers to; every key, unit, range and cross-reference is
 * checked, profiles' examples are read with their parser. The setup is heap storage.
 *   SM_ESYNTAX  something is wrong: blames lists it all; *ret_setup is NULL
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_setup_load(const struct sm_source *source, const char *file,
                                           struct sm_setup **ret_setup, struct sm_blames *blames);
void sm_setup_destroy(struct sm_setup *s);

/* A sheet's text to a typed sheet against a setup.
 *   SM_ESYNTAX  blames */
SM_MUST_CHECK enum sm_status sm_sheet_load(const struct sm_setup *setup, const char *name,
                                           const char *text, size_t n, struct sm_sheet *ret_sheet,
                                           struct sm_blames *blames);

/* One profile alone (`stillmark profile FILE --try LINES`). */
SM_MUST_CHECK enum sm_status sm_profile_load(const char *name, const char *text, size_t n,
                                             struct sm_profile *ret_profile,
                                             struct sm_blames *blames);

/* One method alone (`stillmark-replay --rules METHOD.yaml`). */
SM_MUST_CHECK enum sm_status sm_method_load(const char *name, const char *text, size_t n,
                                            struct sm_method *ret_method, struct sm_blames *blames);
#endif
