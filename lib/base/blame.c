/* SPDX-License-Identifier: GPL-3.0-or-later */
/* blame.c: collecting what is wrong in a person's file, and writing it as one line. */
#include "base/blame.h"

#include <stdarg.h>
#include <string.h>

#include "base/text.h"

void sm_blames_init(struct sm_blames *b, struct sm_blame *list, size_t cap)
{
    *b = (struct sm_blames){ .list = list, .cap = cap };
}

void sm_blames_add(struct sm_blames *b, const char *file, unsigned line, unsigned column,
                   const char *fmt, ...)
{
    struct sm_blame *one;
    struct sm_text text;
    va_list args;

    if (b->n == b->cap) {
        b->left_out++;
        return;
    }
    one = &b->list[b->n++];
    one->line = line;
    one->column = column;
    sm_text_copy(one->file, sizeof one->file, file);
    sm_text_init(&text, one->text, sizeof one->text);
    va_start(args, fmt);
    sm_text_addv(&text, fmt, args);
    va_end(args);
}

void sm_blame_write(const struct sm_blame *b, char *out, size_t cap)
{
    struct sm_text t;

    sm_text_init(&t, out, cap);
    sm_text_add_safe(&t, b->file, strlen(b->file));
    if (b->line > 0)
        sm_text_addf(&t, ":%u", b->line);
    if (b->line > 0 && b->column > 0)
        sm_text_addf(&t, ":%u", b->column);
    sm_text_add(&t, ": ");
    sm_text_add_safe(&t, b->text, strlen(b->text));
}
