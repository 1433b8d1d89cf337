/* SPDX-License-Identifier: GPL-3.0-or-later */
/* load.c: the setup file and all that it refers to, in a fixed order: the setup file, then each
 * meter with its profile, the methods by name, the standards with their table. */
#include <stdlib.h>
#include <string.h>

#include "bench/fits.h"
#include "setup/parts.h"

/* Bytes of a Unix socket's path: 108 with the NUL (Linux, unix(7)). */
#define SOCKET_PATH_MOST 107
#define METHOD_NAMES_MAX 64 /* listed before they are read */

/* FOLDER-OF-SETUP/sub/name.yaml */
static bool path_of(const struct sm_loader *l, const char *sub, const char *name,
                    const struct sm_reader *r, const struct sm_node *node,
                    char out[SM_SETUP_PATH_SIZE])
{
    char tail[2 * SM_NAME_SIZE];
    struct sm_text t;

    sm_text_init(&t, tail, sizeof tail);
    sm_text_addf(&t, "%s/%s.yaml", sub, name);
    if (sm_path_beside(out, l->setup->file, tail))
        return true;
    sm_blame(r, node, "the path of %s is too long", tail);
    return false;
}

/* ---- profiles and methods ---- */

static int load_profile(struct sm_loader *l, const struct sm_reader *from,
                        const struct sm_node *node)
{
    struct sm_setup *s = l->setup;
    char name[SM_NAME_SIZE], file[SM_SETUP_PATH_SIZE];
    struct sm_reader r = { file, l->blames };
    const size_t start = l->blames->n, before = sm_blames_total(l->blames);
    struct sm_tree *tree;

    if (!sm_get_file_name(from, node, "a profile's name", name))
        return -1;
    for (size_t i = 0; i < s->n_profiles; i++)
        if (strcmp(s->profile[i].name, name) == 0)
            return (int)i;
    if (!path_of(l, "profiles", name, from, node, file))
        return -1;
    tree = sm_loader_tree(l, from, node, file);
    if (tree == NULL)
        return -1;
    sm_profile_fill(&r, sm_tree_root(tree), name, &s->profile[s->n_profiles]);
    sm_tree_destroy(tree);
    sm_blames_sort(l->blames, start);
    l->profile_sound[s->n_profiles] = sm_blames_total(l->blames) == before;
    return (int)s->n_profiles++;
}

struct names {
    size_t n;
    bool too_many;
    char name[METHOD_NAMES_MAX][SM_SETUP_PATH_SIZE];
};

/* Keeps the names sorted whatever order they come in, so that files are always read alike. */
static void take_name(void *arg, const char *name)
{
    struct names *all = arg;
    const char *slash = strrchr(name, '/'), *base = slash != NULL ? slash + 1 : name;
    const size_t n = strlen(name);
    size_t at = 0;

    if (strlen(base) <= 5 || strcmp(name + n - 5, ".yaml") != 0 || base[0] == '.')
        return;
    while (at < all->n && strcmp(all->name[at], name) < 0)
        at++;
    if (at < all->n && strcmp(all->name[at], name) == 0)
        return;
    if (all->n == METHOD_NAMES_MAX || n >= SM_SETUP_PATH_SIZE) {
        all->too_many = true;
        return;
    }
    memmove(all->name[at + 1], all->name[at], (all->n - at) * sizeof all->name[0]);
    memcpy(all->name[at], name, n + 1);
    all->n++;
}

static void load_method(struct sm_loader *l, const char *file)
{
    struct sm_setup *s = l->setup;
    struct sm_reader r = { file, l->blames };
    const size_t start = l->blames->n, before = sm_blames_total(l->blames);
    char name[SM_NAME_SIZE];
    struct sm_tree *tree;

    sm_path_stem(name, file);
    if (!sm_name_ok(name, strlen(name))) {
        sm_blames_add(l->blames, file, 0, 0, "its name cannot be a method's name");
        return;
    }
    tree = sm_loader_tree(l, NULL, NULL, file);
    if (tree == NULL)
        return;
    sm_method_fill(&r, sm_tree_root(tree), name, &s->method[s->n_methods]);
    sm_tree_destroy(tree);
    sm_blames_sort(l->blames, start);
    l->method_sound[s->n_methods++] = sm_blames_total(l->blames) == before;
}

static void load_methods(struct sm_loader *l)
{
    struct names *names = calloc(1, sizeof *names);
    char folder[SM_SETUP_PATH_SIZE];
    enum sm_status st;

    if (names == NULL) {
        l->failed = SM_ENOMEM;
        return;
    }
    if (!sm_path_beside(folder, l->setup->file, "methods")) {
        sm_blames_add(l->blames, l->setup->file, 0, 0, "the path of its methods is too long");
        free(names);
        return;
    }
    st = l->source->list(l->source->ctx, folder, take_name, names);
    if (st == SM_ENOMEM)
        l->failed = st;
    else if (st != SM_OK)
        sm_blames_add(l->blames, folder, 0, 0, "the folder of methods cannot be read");
    if (names->too_many || names->n > SM_METHODS_MAX)
        sm_blames_add(l->blames, folder, 0, 0, "more than %d methods", SM_METHODS_MAX);
    for (size_t i = 0; i < names->n && i < SM_METHODS_MAX; i++)
        load_method(l, names->name[i]);
    free(names);
}

/* ---- meters ---- */

/* What of a meter's file waits until all methods are read. */
struct meter_tree {
    char file[SM_SETUP_PATH_SIZE];
    struct sm_tree *tree;
    int profile;
};

static void load_meter(struct sm_loader *l, const struct sm_reader *from,
                       const struct sm_node *node, struct meter_tree *mt)
{
    struct sm_setup *s = l->setup;
    struct sm_meter_setup *m = &s->meter[s->n_meters];
    struct sm_reader r = { mt->file, l->blames };
    const size_t start = l->blames->n;
    const struct sm_node *root;

    if (!sm_get_short_name(from, node, "a meter's name", m->core.meter))
        return;
    for (size_t i = 0; i < s->n_meters; i++)
        if (strcmp(s->meter[i].core.meter, m->core.meter) == 0) {
            sm_blame_got(from, node, "the same meter twice");
            return;
        }
    if (!path_of(l, "meters", m->core.meter, from, node, mt->file))
        return;
    mt->profile = -1;
    s->n_meters++;
    mt->tree = sm_loader_tree(l, from, node, mt->file);
    if (mt->tree == NULL)
        return;
    root = sm_tree_root(mt->tree);
    sm_meter_fill(&r, root, m);
    (void)sm_need(&r, root, "method", "the method used while no sheet names another");
    node = sm_need(&r, root, "profile", "how to read the meter's lines");
    sm_blames_sort(l->blames, start);
    mt->profile = load_profile(l, &r, node);
}

static int find_method(const struct sm_setup *s, const struct sm_reader *r,
                       const struct sm_node *node)
{
    const char *names[SM_METHODS_MAX], *near;
    char name[SM_NAME_SIZE];

    if (!sm_get_file_name(r, node, "a method's name", name))
        return -1;
    for (size_t i = 0; i < s->n_methods; i++) {
        names[i] = s->method[i].name;
        if (strcmp(names[i], name) == 0)
            return (int)i;
    }
    near = sm_nearest(name, names, s->n_methods);
    sm_blame_got(r, node, "expected a method of the folder methods beside the setup%s%s%s",
                 near != NULL ? " (did you mean \"" : "", near != NULL ? near : "",
                 near != NULL ? "\"?)" : "");
    return -1;
}

/* The meter against its profile, its method and the meters before it. */
static void join_meter(struct sm_loader *l, size_t i, const struct meter_tree *mt)
{
    struct sm_setup *s = l->setup;
    struct sm_meter_setup *m = &s->meter[i];
    const struct sm_reader r = { mt->file, l->blames };
    const struct sm_node *root;
    char why[SM_REASON_SIZE];
    int method;

    if (mt->tree == NULL)
        return;
    root = sm_tree_root(mt->tree);
    method = find_method(s, &r, sm_key(root, "method"));
    for (size_t k = 0; k < i; k++)
        if (m->port.port[0] != '\0' && strcmp(s->meter[k].port.port, m->port.port) == 0)
            sm_blame(&r, sm_key(root, "port"), "the port of meter %s already",
                     s->meter[k].core.meter);
    if (mt->profile < 0)
        return;
    m->core.profile = &s->profile[mt->profile];
    if (m->core.profile->ask.n > 0 && m->core.profile->ask.every_ns >= m->core.silence_ns)
        sm_blame(&r, sm_key(root, "silence") != NULL ? sm_key(root, "silence") : root,
                 "%smust be longer than the profile's ask.every, else the meter is always silent",
                 sm_key(root, "silence") != NULL ? "" : "silence: ");
    if (method < 0)
        return;
    m->core.own_method = (size_t)method;
    if (l->method_sound[method] && l->profile_sound[mt->profile] &&
        sm_method_fits(&s->method[method], m->core.profile, why) != SM_OK)
        sm_blame(&r, sm_key(root, "method"), "%s", why);
}

static void load_meters(struct sm_loader *l, const struct sm_reader *r, const struct sm_node *list)
{
    struct meter_tree *trees = calloc(SM_METERS_MAX, sizeof *trees);

    if (trees == NULL) {
        l->failed = SM_ENOMEM;
        return;
    }
    if (sm_is_list(r, list, 1, SM_METERS_MAX, "meters"))
        for (const struct sm_node *c = list->child; c != NULL; c = c->next)
            load_meter(l, r, c, &trees[l->setup->n_meters]);
    load_methods(l);
    for (size_t i = 0; i < l->setup->n_meters; i++)
        join_meter(l, i, &trees[i]);
    for (size_t i = 0; i < SM_METERS_MAX; i++)
        sm_tree_destroy(trees[i].tree);
    free(trees);
}

/* ---- people, standards, the setup file itself ---- */

static void fill_person(const struct sm_reader *r, const struct sm_node *map, struct sm_setup *s)
{
    static const char *const keys[] = { "who", "analyse", "review", NULL };
    struct sm_person *p = &s->people[s->n_people];

    p->analyse = true;
    if (!sm_keys_known(r, map, keys) ||
        !sm_get_name(r, sm_need(r, map, "who", "a short name"), "a short name", p->who))
        return;
    sm_get_yes(r, sm_key(map, "analyse"), &p->analyse);
    sm_get_yes(r, sm_key(map, "review"), &p->review);
    for (size_t i = 0; i < s->n_people; i++)
        if (strcmp(s->people[i].who, p->who) == 0)
            sm_blame(r, sm_key(map, "who"), "a second person of the name \"%s\"", p->who);
    s->n_people++;
}

static void fill_people(const struct sm_reader *r, const struct sm_node *list, struct sm_setup *s)
{
    if (!sm_is_list(r, list, 0, SM_PEOPLE_MAX, "people"))
        return;
    for (const struct sm_node *c = list->child; c != NULL; c = c->next)
        fill_person(r, c, s);
}

static void load_standards(struct sm_loader *l, const struct sm_reader *from,
                           const struct sm_node *list)
{
    if (!sm_is_list(from, list, 0, SM_STANDARDS_MAX, "files of standards"))
        return;
    for (const struct sm_node *c = list->child; c != NULL; c = c->next) {
        char name[SM_NAME_SIZE], file[SM_SETUP_PATH_SIZE];
        const struct sm_reader r = { file, l->blames };
        const size_t start = l->blames->n;
        struct sm_tree *tree;

        if (!sm_get_file_name(from, c, "the name of a file of standards", name) ||
            !path_of(l, "standards", name, from, c, file))
            continue;
        tree = sm_loader_tree(l, from, c, file);
        if (tree == NULL)
            continue;
        sm_standards_fill(l, &r, sm_tree_root(tree), &l->setup->standards);
        sm_tree_destroy(tree);
        sm_blames_sort(l->blames, start);
    }
}

static void fill_path(const struct sm_reader *r, const struct sm_node *node, const char *what,
                      size_t most, char ret_path[SM_SETUP_PATH_SIZE])
{
    char written[SM_SETUP_PATH_SIZE], joined[SM_SETUP_PATH_SIZE];

    if (!sm_get_text(r, node, what, written, sizeof written))
        return;
    if (!sm_path_beside(joined, r->file, written) || strlen(joined) > most)
        sm_blame(r, node, "the path is too long: at most %zu bytes with the setup's folder", most);
    else
        sm_text_copy(ret_path, SM_SETUP_PATH_SIZE, joined);
}

static void fill_setup(struct sm_loader *l, const struct sm_reader *r, const struct sm_node *root)
{
    static const char *const keys[] = { "logs",      "state",  "people", "meters",
                                        "standards", "socket", NULL };
    struct sm_setup *s = l->setup;
    const size_t start = l->blames->n;
    const struct sm_node *meters;

    if (!sm_keys_known(r, root, keys))
        return;
    fill_path(r, sm_need(r, root, "logs", "the folder of the bench logs"), "a folder",
              SM_SETUP_PATH_SIZE - 1, s->logs);
    fill_path(r, sm_need(r, root, "state", "the folder of keys and state"), "a folder",
              SM_SETUP_PATH_SIZE - 1, s->state);
    fill_path(r, sm_key(root, "socket"), "the socket's path", SOCKET_PATH_MOST, s->socket);
    fill_people(r, sm_key(root, "people"), s);
    meters = sm_need(r, root, "meters", "the list of meters");
    sm_blames_sort(l->blames, start);
    load_meters(l, r, meters);
    load_standards(l, r, sm_key(root, "standards"));
}

static void point_at_parts(struct sm_setup *s)
{
    for (size_t i = 0; i < s->n_meters; i++) {
        struct sm_core_setup *c = &s->meter[i].core;
        c->method = s->method;
        c->n_methods = s->n_methods;
        c->standards = &s->standards;
        c->people = s->people;
        c->n_people = s->n_people;
    }
}

enum sm_status sm_setup_load(const struct sm_source *source, const char *file,
                             struct sm_setup **ret_setup, struct sm_blames *blames)
{
    struct sm_loader l = { .source = source, .blames = blames };
    const size_t before = sm_blames_total(blames);
    const struct sm_reader r = { file, blames };
    struct sm_tree *tree;

    *ret_setup = NULL;
    if (strlen(file) == 0 || strlen(file) >= SM_SETUP_PATH_SIZE) {
        sm_blames_add(blames, file, 0, 0, "the path of the setup file has 1 to %d bytes",
                      SM_SETUP_PATH_SIZE - 1);
        return SM_ESYNTAX;
    }
    l.setup = calloc(1, sizeof *l.setup);
    if (l.setup == NULL)
        return SM_ENOMEM;
    sm_text_copy(l.setup->file, sizeof l.setup->file, file);
    tree = sm_loader_tree(&l, &r, NULL, file);
    if (tree != NULL)
        fill_setup(&l, &r, sm_tree_root(tree));
    sm_tree_destroy(tree);
    if (l.failed == SM_OK && sm_blames_total(blames) == before) {
        point_at_parts(l.setup);
        *ret_setup = l.setup;
        return SM_OK;
    }
    sm_setup_destroy(l.setup);
    return l.failed != SM_OK ? l.failed : SM_ESYNTAX;
}

void sm_setup_destroy(struct sm_setup *s)
{
    if (s == NULL)
        return;
    for (size_t i = 0; i < s->n_files; i++)
        free(s->files[i].text);
    free(s);
}
