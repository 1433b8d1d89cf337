/* SPDX-License-Identifier: GPL-3.0-or-later */
/* tree.h: the text of one setup file as a small tree in which every node knows its place. YAML,
 * less what a setup needs not: no aliases, anchors, tags, nor several documents; each key once;
 * bounded size, depth and number of nodes. */
#ifndef SM_SETUP_TREE_H
#define SM_SETUP_TREE_H
#include <stdbool.h>
#include <stddef.h>

#include "base/blame.h"
#include "base/status.h"

#define SM_TREE_TEXT_MAX (128u * 1024u) /* bytes of a file */
#define SM_TREE_DEPTH_MAX 16            /* lists and maps inside one another */
#define SM_TREE_NODES_MAX 20000
#define SM_TREE_KEYS_MAX 256 /* keys of one map */

enum sm_node_kind { SM_NODE_TEXT, SM_NODE_LIST, SM_NODE_MAP };

struct sm_node {
    enum sm_node_kind kind;
    unsigned line, column; /* from 1; columns count characters */
    char *text;            /* TEXT: n bytes of UTF-8 and a NUL; it may hold NULs ("\0" in quotes) */
    size_t n;
    char *key; /* the node is a map's value: its key (no control characters); else NULL */
    unsigned key_line, key_column;
    size_t at;                                    /* in a list or map: which, from 1 */
    struct sm_node *parent, *next, *child, *last; /* last: child */
    size_t n_children;
};

struct sm_tree; /* owns its nodes */

/* Reads text[n]. `file` is for the blames alone.
 *   SM_OK       also where a key said twice, an anchor, alias or tag was blamed: what else is wrong
 *               with the file can still be found
 *   SM_ESYNTAX  no tree: blames say what and where
 *   SM_ENOMEM */
SM_MUST_CHECK enum sm_status sm_tree_parse(const char *file, const char *text, size_t n,
                                           struct sm_tree **ret_tree, struct sm_blames *blames);
void sm_tree_destroy(struct sm_tree *t); /* NULL is fine */

const struct sm_node *sm_tree_root(const struct sm_tree *t); /* a map */
#endif
