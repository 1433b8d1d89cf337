/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sheet.c: a bench sheet's text to struct sm_sheet, against a setup: every standard known, every
 * duplicate of something earlier, every check of another lot than the calibration's. */
#include <string.h>

#include "setup/parts.h"

struct sheet_reader {
    const struct sm_reader *r;
    const struct sm_setup *setup;
    struct sm_sheet *sheet;
};

/* `, did you mean "B4"?` into out; "" when nothing is near. */
static void did_you_mean(char out[SM_REASON_SIZE], const char *written, const char *const *names,
                         size_t n)
{
    const char *near = sm_nearest(written, names, n);
    struct sm_text t;

    sm_text_init(&t, out, SM_REASON_SIZE);
    if (near != NULL)
        sm_text_addf(&t, " (did you mean \"%s\"?)", near);
}

static void fill_method(const struct sheet_reader *s, const struct sm_node *node)
{
    const char *names[SM_METHODS_MAX];
    char name[SM_NAME_SIZE], near[SM_REASON_SIZE];

    s->sheet->method = -1;
    if (!sm_get_name(s->r, node, "a method's name", name))
        return;
    for (size_t i = 0; i < s->setup->n_methods; i++) {
        names[i] = s->setup->method[i].name;
        if (strcmp(names[i], name) == 0)
            s->sheet->method = (int)i;
    }
    if (s->sheet->method >= 0)
        return;
    did_you_mean(near, name, names, s->setup->n_methods);
    sm_blame_got(s->r, node, "expected a method of this setup%s", near);
}

static const struct sm_method *method_of(const struct sheet_reader *s)
{
    return s->sheet->method < 0 ? NULL : &s->setup->method[s->sheet->method];
}

static void fill_standard(const struct sheet_reader *s, const struct sm_node *node,
                          struct sm_item *item)
{
    const struct sm_standards *all = &s->setup->standards;
    const char *names[SM_STANDARDS_MAX];
    const struct sm_method *m = method_of(s);
    char near[SM_REASON_SIZE];

    item->standard = sm_standards_find(all, item->name);
    if (item->standard < 0) {
        for (size_t i = 0; i < all->n; i++)
            names[i] = all->list[i].name;
        did_you_mean(near, item->name, names, all->n);
        sm_blame_got(s->r, node, "expected a standard of this setup%s", near);
        return;
    }
    const enum sm_unit unit = all->list[item->standard].unit;
    if (m != NULL && unit != m->measures)
        sm_blame(s->r, node, "%s is in %s, and the method measures %s", item->name,
                 sm_unit_name(unit), sm_unit_name(m->measures));
}

static bool is_sample_before(const struct sm_sheet *sheet, const char *name)
{
    for (size_t i = 0; i < sheet->n; i++)
        if (sheet->item[i].kind == SM_ITEM_SAMPLE && strcmp(sheet->item[i].name, name) == 0)
            return true;
    return false;
}

static void fill_repeat(const struct sheet_reader *s, const struct sm_node *node,
                        const struct sm_item *item)
{
    const char *names[SM_ITEMS_MAX];
    char near[SM_REASON_SIZE];
    size_t n = 0;

    if (is_sample_before(s->sheet, item->name))
        return;
    for (size_t i = 0; i < s->sheet->n; i++)
        if (s->sheet->item[i].kind == SM_ITEM_SAMPLE)
            names[n++] = s->sheet->item[i].name;
    did_you_mean(near, item->name, names, n);
    sm_blame_got(s->r, node, "expected a sample that stands earlier in the sheet%s", near);
}

static void fill_band(const struct sheet_reader *s, const struct sm_node *map, struct sm_item *item)
{
    static const char *const keys[] = { "from", "to", NULL };
    const struct sm_method *m = method_of(s);

    if (!sm_keys_known(s->r, map, keys) || m == NULL)
        return;
    if (sm_get_quantity(s->r, sm_need(s->r, map, "from", "the lowest plausible result"),
                        m->measures, -SM_ANY_VALUE, SM_ANY_VALUE, &item->band_from) &&
        sm_get_quantity(s->r, sm_need(s->r, map, "to", "the highest plausible result"), m->measures,
                        -SM_ANY_VALUE, SM_ANY_VALUE, &item->band_to)) {
        item->has_band = true;
        if (!(item->band_from < item->band_to))
            sm_blame(s->r, map, "from must be less than to");
    }
}

static bool is_portion(enum sm_item_kind kind)
{
    return kind == SM_ITEM_SAMPLE || kind == SM_ITEM_DUPLICATE || kind == SM_ITEM_SPIKE;
}

/* Where, when and by whom a sample was taken. */
static void fill_origin(const struct sheet_reader *s, const struct sm_node *map,
                        struct sm_item *item)
{
    static const char *const keys[] = { "place", "sampled", "by", "band" };

    if (!is_portion(item->kind)) {
        for (size_t i = 0; i < sizeof keys / sizeof keys[0]; i++)
            if (sm_key(map, keys[i]) != NULL)
                sm_blame(s->r, sm_key(map, keys[i]), "only samples have it");
        return;
    }
    sm_get_name(s->r, sm_key(map, "place"), "a place", item->place);
    sm_get_name(s->r, sm_key(map, "by"), "who took it", item->by);
    item->has_sampled = sm_get_utc(s->r, sm_key(map, "sampled"), &item->sampled_utc_us);
    fill_band(s, sm_key(map, "band"), item);
}

/* The one key that says what the item is; NULL: blamed. */
static const struct sm_node *find_kind(const struct sheet_reader *s, const struct sm_node *map,
                                       enum sm_item_kind *ret_kind)
{
    const struct sm_node *found = NULL;

    for (const struct sm_node *c = map->child; c != NULL; c = c->next) {
        enum sm_item_kind kind;

        if (!sm_item_kind_known(c->key, &kind) || kind == SM_ITEM_NONE)
            continue;
        if (found != NULL) {
            sm_blame(s->r, c, "an item is one thing; it is \"%s\" already", found->key);
            return NULL;
        }
        found = c;
        *ret_kind = kind;
    }
    if (found == NULL)
        sm_blame(s->r, map,
                 "expected one of standard, check, blank, sample, duplicate, spike in an item");
    return found;
}

static void fill_item(const struct sheet_reader *s, const struct sm_node *map, struct sm_item *item)
{
    static const char *const keys[] = { "standard",  "check", "blank", "sample",
                                        "duplicate", "spike", "place", "sampled",
                                        "by",        "band",  NULL };
    const struct sm_node *what;

    item->kind = SM_ITEM_NONE;
    item->standard = -1;
    if (!sm_keys_known(s->r, map, keys))
        return;
    what = find_kind(s, map, &item->kind);
    if (what == NULL || !sm_get_name(s->r, what, "a name", item->name))
        return;
    if (item->kind == SM_ITEM_STANDARD || item->kind == SM_ITEM_CHECK)
        fill_standard(s, what, item);
    else if (item->kind == SM_ITEM_DUPLICATE || item->kind == SM_ITEM_SPIKE)
        fill_repeat(s, what, item);
    else if (item->kind == SM_ITEM_SAMPLE && is_sample_before(s->sheet, item->name))
        sm_blame(s->r, what, "a second sample of the name \"%s\"", item->name);
    fill_origin(s, map, item);
}

/* A check from the calibration's own lot would agree with a wrong calibration. */
static void refuse_own_lot(const struct sheet_reader *s, const struct sm_node *list)
{
    const struct sm_standard *all = s->setup->standards.list;
    const struct sm_node *node = list->child;

    for (size_t i = 0; i < s->sheet->n && node != NULL; i++, node = node->next) {
        const struct sm_item *check = &s->sheet->item[i];

        if (check->kind != SM_ITEM_CHECK || check->standard < 0)
            continue;
        for (size_t k = 0; k < s->sheet->n; k++) {
            const struct sm_item *own = &s->sheet->item[k];

            if (own->kind != SM_ITEM_STANDARD || own->standard < 0 ||
                strcmp(all[own->standard].lot, all[check->standard].lot) != 0)
                continue;
            sm_blame(
                s->r, sm_key(node, "check"),
                "the check's lot is the calibration's own (%s, as standard %s): take another lot",
                all[check->standard].lot, own->name);
            break;
        }
    }
}

static void fill_items(const struct sheet_reader *s, const struct sm_node *list)
{
    bool any_check = false;

    if (!sm_is_list(s->r, list, 1, SM_ITEMS_MAX, "items"))
        return;
    for (const struct sm_node *c = list->child; c != NULL; c = c->next) {
        struct sm_item *item = &s->sheet->item[s->sheet->n];

        fill_item(s, c, item);
        any_check = any_check || item->kind == SM_ITEM_CHECK;
        s->sheet->n++;
    }
    if (!any_check)
        sm_blame(s->r, list, "no check in the sheet: without one nothing can be released");
    refuse_own_lot(s, list);
}

void sm_sheet_fill(const struct sm_setup *setup, const struct sm_reader *r,
                   const struct sm_node *root, struct sm_sheet *sheet)
{
    static const char *const keys[] = { "method", "sensor", "items", NULL };
    const struct sheet_reader s = { r, setup, sheet };

    sheet->method = -1;
    if (!sm_keys_known(r, root, keys))
        return;
    fill_method(&s, sm_need(r, root, "method", "a method's name"));
    sm_get_name(r, sm_key(root, "sensor"), "a sensor's name", sheet->sensor);
    fill_items(&s, sm_need(r, root, "items", "the list of what is to be measured"));
}
