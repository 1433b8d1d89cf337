/* SPDX-License-Identifier: GPL-3.0-or-later */
/* parts.h: within the room: the tree of each kind of setup file to its struct. What is wrong is
 * blamed; the struct is whole only where nothing was. */
#ifndef SM_SETUP_PARTS_H
#define SM_SETUP_PARTS_H
#include "setup/setup.h"
#include "setup/value.h"

/* Texts of a setup: read once, kept for the log, in the order of first reading. */
struct sm_loader {
    const struct sm_source *source;
    struct sm_setup *setup;
    struct sm_blames *blames;
    enum sm_status failed; /* SM_ENOMEM, else SM_OK */
    bool profile_sound[SM_METERS_MAX],
        method_sound[SM_METHODS_MAX]; /* nothing was blamed in them */
};

/* The text of a file, from the setup's store or its source; NULL: blamed at `node` of r (the
 * reference; NULL: the file itself) or out of memory. */
const struct sm_setup_file *sm_loader_text(struct sm_loader *l, const struct sm_reader *r,
                                           const struct sm_node *node, const char *name);
/* The same, as a tree that the caller destroys; NULL: blamed. */
struct sm_tree *sm_loader_tree(struct sm_loader *l, const struct sm_reader *r,
                               const struct sm_node *node, const char *name);
/* FOLDER of file + tail; false: too long. */
bool sm_path_beside(char out[SM_SETUP_PATH_SIZE], const char *file, const char *tail);
/* "conf/methods/ph.yaml" -> "ph" */
void sm_path_stem(char out[SM_NAME_SIZE], const char *file);

void sm_profile_fill(const struct sm_reader *r, const struct sm_node *root, const char *name,
                     struct sm_profile *p);
void sm_method_fill(const struct sm_reader *r, const struct sm_node *root, const char *name,
                    struct sm_method *m);
/* Adds to s; table files are read through l. */
void sm_standards_fill(struct sm_loader *l, const struct sm_reader *r, const struct sm_node *root,
                       struct sm_standards *s);
/* The port, silence and sensor; profile and method are references for the caller to resolve. */
void sm_meter_fill(const struct sm_reader *r, const struct sm_node *root, struct sm_meter_setup *m);
void sm_sheet_fill(const struct sm_setup *setup, const struct sm_reader *r,
                   const struct sm_node *root, struct sm_sheet *sheet);

/* Sorts what was blamed since `from` by line, so that a file's faults read from top to bottom. */
void sm_blames_sort(struct sm_blames *b, size_t from);
#endif
