/* SPDX-License-Identifier: GPL-3.0-or-later */
/* group.c: a growing text and where its lines are. */
#include "group.h"

#include <stdlib.h>
#include <string.h>

struct sm_group *sm_group_create(void)
{
    return calloc(1, sizeof(struct sm_group));
}

void sm_group_destroy(struct sm_group *g)
{
    if (g == NULL)
        return;
    free(g->text);
    free(g->line);
    free(g);
}

static bool room(struct sm_group *g, size_t more)
{
    size_t cap = g->cap > 0 ? g->cap : 4096;
    char *text;

    while (cap - g->n < more)
        cap *= 2;
    if (cap > g->cap) {
        text = realloc(g->text, cap);
        if (text == NULL)
            return false;
        g->text = text;
        g->cap = cap;
    }
    if (g->n_lines == g->cap_lines) {
        const size_t lines = g->cap_lines > 0 ? g->cap_lines * 2 : 32;
        struct sm_group_line *line = realloc(g->line, lines * sizeof *line);
        if (line == NULL)
            return false;
        g->line = line;
        g->cap_lines = lines;
    }
    return true;
}

enum sm_status sm_group_add(struct sm_group *g, const char *line, size_t n, bool held,
                            int64_t answer)
{
    if (!room(g, n))
        return SM_ENOMEM;
    memcpy(g->text + g->n, line, n);
    g->line[g->n_lines++] = (struct sm_group_line){ g->n, n, held, answer };
    g->n += n;
    return SM_OK;
}
