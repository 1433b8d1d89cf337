/* SPDX-License-Identifier: GPL-3.0-or-later */
/* say.c: one sentence, one write. */
#include "say.h"

#include <stdarg.h>
#include <stdio.h>
#include <unistd.h>

#include "base/text.h"

void sm_say(const char *about, const char *fmt, ...)
{
    char raw[1400], line[2000];
    struct sm_text r, t;
    va_list args;
    ssize_t put;

    sm_text_init(&r, raw, sizeof raw);
    if (about != NULL)
        sm_text_addf(&r, "%s: ", about);
    va_start(args, fmt);
    sm_text_addv(&r, fmt, args);
    va_end(args);
    sm_text_init(&t, line, sizeof line - 1);
    sm_text_add_safe(&t, raw, r.len);
    line[t.len] = '\n';
    put = write(STDERR_FILENO, line, t.len + 1);
    (void)put; /* nobody is left to tell */
}
