/* SPDX-License-Identifier: GPL-3.0-or-later */
/* standards.c: a file of conf/standards/: lots with their certificates, and the table of published
 * values beside it. */
#include <math.h>
#include <string.h>

#include "setup/parts.h"

/* A path below the standards file's folder: no way up, not from the root. */
static bool stays_below(const struct sm_node *node)
{
    const char *s = node->text;

    if (node->kind != SM_NODE_TEXT || node->n == 0 || node->n > 128 || strlen(s) != node->n ||
        s[0] == '/' || strchr(s, '\\') != NULL || sm_utf8_span(s, node->n) != node->n)
        return false;
    for (size_t i = 0; i < node->n; i++)
        if ((unsigned char)s[i] < 0x20 || (s[i] == '.' && (i == 0 || s[i - 1] == '/')))
            return false;
    return true;
}

static void fill_table(struct sm_loader *l, const struct sm_reader *r, const struct sm_node *node,
                       struct sm_table *t)
{
    char name[SM_SETUP_PATH_SIZE], why[SM_REASON_SIZE] = "";
    const struct sm_setup_file *f;
    unsigned line = 0;

    if (node == NULL)
        return;
    if (!stays_below(node)) {
        sm_blame_got(r, node, "expected a file below this folder, such as tables/buffers.csv");
        return;
    }
    if (!sm_path_beside(name, r->file, node->text)) {
        sm_blame(r, node, "the path is too long");
        return;
    }
    if (t->n_rows > 0 && strcmp(t->name, name) == 0)
        return;
    if (t->n_rows > 0) {
        sm_blame(r, node, "one table serves all standards: %s is read already", t->name);
        return;
    }
    f = sm_loader_text(l, r, node, name);
    if (f == NULL)
        return;
    if (sm_table_parse(f->text, f->n, t, &line, why) != SM_OK) {
        memset(t, 0, sizeof *t);
        sm_blames_add(r->blames, name, line, line > 0 ? 1 : 0, "%s", why);
        return;
    }
    sm_text_copy(t->name, sizeof t->name, name);
}

/* ---- one standard; t is NULL where the table was blamed ---- */

#define UNKNOWN SM_UNIT_COUNT

static bool is_standard_unit(enum sm_unit u)
{
    return u == SM_UNIT_PH || u == SM_UNIT_MG_L || u == SM_UNIT_UG_L || u == SM_UNIT_US_CM ||
           u == SM_UNIT_MS_CM || u == SM_UNIT_MV || u == SM_UNIT_A || u == SM_UNIT_PERCENT;
}

/* A value with a unit that a standard may have; all of one standard share the first one's. */
static bool get_value(const struct sm_reader *r, const struct sm_node *node, bool first,
                      enum sm_unit *unit, double *ret_value)
{
    struct sm_quantity q;

    if (!sm_get_any_quantity(node, &q) || !is_standard_unit(q.unit) ||
        (first ? false : sm_quantity_in(q, *unit, &q.value) != SM_OK)) {
        if (first)
            sm_blame_got(r, node, "expected a value with its unit, 7.02 pH or 1.00 mg/L say");
        else
            sm_blame_got(r, node, "expected a value in %s", sm_unit_name(*unit));
        return false;
    }
    if (first)
        *unit = q.unit;
    *ret_value = q.value;
    return true;
}

static bool insert(struct sm_standard *s, double t_c, double value)
{
    size_t i = s->n_values;

    while (i > 0 && s->t_c[i - 1] > t_c) {
        s->t_c[i] = s->t_c[i - 1];
        s->value[i] = s->value[i - 1];
        i--;
    }
    s->t_c[i] = t_c;
    s->value[i] = value;
    s->n_values++;
    return i == 0 || s->t_c[i - 1] < t_c;
}

/* { 20 °C: 10.07 pH, 25 °C: 10.02 pH } */
static void fill_values(const struct sm_reader *r, const struct sm_node *map, struct sm_standard *s)
{
    if (map->kind != SM_NODE_MAP || map->n_children < 1 || map->n_children > SM_CERTIFICATE_MAX) {
        sm_blame_got(r, map, "expected 1 to %d values by temperature, { 25 °C: 7.00 pH } say",
                     SM_CERTIFICATE_MAX);
        return;
    }
    for (const struct sm_node *c = map->child; c != NULL; c = c->next) {
        struct sm_quantity t;
        double value = 0;

        if (sm_quantity_parse(c->key, strlen(c->key), &t) != SM_OK || t.unit != SM_UNIT_CELSIUS ||
            t.value < -10 || t.value > 100)
            sm_blame(r, c, "expected a temperature between -10 °C and 100 °C as the key");
        else if (get_value(r, c, s->n_values == 0, &s->unit, &value) && !insert(s, t.value, value))
            sm_blame(r, c, "the same temperature twice");
    }
}

static void fill_column(const struct sm_reader *r, const struct sm_node *node,
                        const struct sm_table *t, struct sm_standard *s)
{
    const char *names[SM_TABLE_COLUMNS_MAX], *near;
    char name[SM_NAME_SIZE];

    if (node == NULL || !sm_get_name(r, node, "a column of the table", name))
        return;
    if (t == NULL)
        return;
    if (t->n_rows == 0) {
        sm_blame(r, node, "no table to take the column from (\"table: FILE\" at the head)");
        return;
    }
    for (size_t i = 0; i < t->n_columns; i++) {
        names[i] = t->column[i];
        if (strcmp(t->column[i], name) == 0)
            s->table_column = (int)i;
    }
    if (s->table_column >= 0) {
        if (s->n_values == 0)
            s->unit = t->unit;
        return;
    }
    near = sm_nearest(name, names, t->n_columns);
    sm_blame_got(r, node, "expected a column of %s%s%s%s", t->name,
                 near != NULL ? " (did you mean \"" : "", near != NULL ? near : "",
                 near != NULL ? "\"?)" : "");
}

static void fill_u(const struct sm_reader *r, const struct sm_node *node, struct sm_standard *s)
{
    double percent = 0;
    struct sm_quantity q;

    if (node == NULL || s->unit == UNKNOWN)
        return;
    if (sm_get_any_quantity(node, &q) && q.unit == SM_UNIT_PERCENT && s->unit != SM_UNIT_PERCENT &&
        s->n_values == 1) {
        if (sm_get_quantity(r, node, SM_UNIT_PERCENT, 0, 100, &percent))
            s->u = fabs(s->value[0]) * percent / 100;
        return;
    }
    sm_get_quantity(r, node, s->unit, 0, s->unit == SM_UNIT_PH ? 1 : SM_ANY_VALUE, &s->u);
}

static void fill_dates(const struct sm_reader *r, const struct sm_node *map, struct sm_standard *s)
{
    s->has_expires = sm_get_date(r, sm_key(map, "expires"), &s->expires_day);
    s->has_opened = sm_get_date(r, sm_key(map, "opened"), &s->opened_day);
    if (s->has_expires && s->has_opened && s->opened_day > s->expires_day)
        sm_blame(r, sm_key(map, "opened"), "later than its expiry");
}

static void fill_standard(const struct sm_reader *r, const struct sm_node *map,
                          const struct sm_table *t, struct sm_standard *s)
{
    static const char *const keys[] = { "name",    "column", "values", "value", "lot",
                                        "expires", "opened", "U",      NULL };
    const struct sm_node *values, *value, *column;

    s->table_column = -1;
    s->unit = UNKNOWN;
    if (!sm_keys_known(r, map, keys))
        return;
    sm_get_name(r, sm_need(r, map, "name", "the standard's name"), "a name", s->name);
    sm_get_name(r, sm_need(r, map, "lot", "its lot"), "a lot", s->lot);
    values = sm_key(map, "values");
    value = sm_key(map, "value");
    column = sm_key(map, "column");
    if (values == NULL && value == NULL && column == NULL)
        sm_blame(r, map, "expected values (by temperature), value, or a column of the table");
    if (values != NULL && value != NULL)
        sm_blame(r, value, "a standard has either value or values");
    if (values != NULL) {
        fill_values(r, values, s);
    } else if (value != NULL && get_value(r, value, true, &s->unit, &s->value[0])) {
        s->t_c[0] = (double)NAN; /* holds whatever the temperature */
        s->n_values = 1;
    }
    fill_column(r, column, t, s);
    fill_u(r, sm_key(map, "U"), s);
    fill_dates(r, map, s);
}

void sm_standards_fill(struct sm_loader *l, const struct sm_reader *r, const struct sm_node *root,
                       struct sm_standards *s)
{
    static const char *const keys[] = { "table", "standards", NULL };
    const struct sm_node *list;
    bool table_bad;

    if (!sm_keys_known(r, root, keys))
        return;
    fill_table(l, r, sm_key(root, "table"), &s->table);
    table_bad = sm_key(root, "table") != NULL && s->table.n_rows == 0;
    list = sm_need(r, root, "standards", "the list of standards");
    if (!sm_is_list(r, list, 1, SM_STANDARDS_MAX, "standards"))
        return;
    for (const struct sm_node *c = list->child; c != NULL; c = c->next) {
        struct sm_standard *one;

        if (s->n == SM_STANDARDS_MAX) {
            sm_blame(r, c, "more than %d standards in all", SM_STANDARDS_MAX);
            return;
        }
        one = &s->list[s->n];
        fill_standard(r, c, table_bad ? NULL : &s->table, one);
        if (one->name[0] != '\0' && sm_standards_find(s, one->name) >= 0)
            sm_blame(r, sm_key(c, "name"), "a second standard of the name \"%s\"", one->name);
        s->n++;
    }
}
