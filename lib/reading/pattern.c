/* SPDX-License-Identifier: GPL-3.0-or-later */
/* pattern.c: PCRE2 behind limits. Its matcher wants heap memory for backtracking and enlarges it by
 * taking a larger block and giving the smaller back; it gets two blocks of the largest size, taken
 * once at creation. */
#include "reading/pattern.h"

#include <pcre2.h>
#include <stdlib.h>

/* Enough for any honest line of at most 1,024 bytes; bad patterns end in under a millisecond. */
#define MATCH_LIMIT 10000
#define DEPTH_LIMIT 1000
#define HEAP_LIMIT_KIB 128
#define NESTING_LIMIT 32

struct sm_pattern {
    pcre2_code *code;
    pcre2_general_context *general;
    pcre2_compile_context *compile;
    pcre2_match_context *limits;
    pcre2_match_data *match;
    bool made; /* from here on only the two blocks are lent */
    bool lent[2];
    max_align_t block[2][HEAP_LIMIT_KIB * 1024 / sizeof(max_align_t)];
};

static void *take(size_t n, void *data)
{
    struct sm_pattern *p = data;

    if (!p->made)
        return malloc(n);
    for (int i = 0; i < 2; i++)
        if (!p->lent[i] && n <= sizeof p->block[i]) {
            p->lent[i] = true;
            return p->block[i];
        }
    return NULL;
}

static void give_back(void *block, void *data)
{
    struct sm_pattern *p = data;

    for (int i = 0; i < 2; i++)
        if (block == p->block[i]) {
            p->lent[i] = false;
            return;
        }
    free(block);
}

static enum sm_status compile(struct sm_pattern *p, const char *text, char why[SM_REASON_SIZE])
{
    const uint32_t options = PCRE2_NEVER_UTF | PCRE2_NEVER_UCP | PCRE2_NEVER_BACKSLASH_C |
                             PCRE2_DOLLAR_ENDONLY | PCRE2_ANCHORED | PCRE2_ENDANCHORED;
    unsigned char message[120];
    PCRE2_SIZE at = 0;
    int error = 0;
    struct sm_text t;

    p->code =
        pcre2_compile((PCRE2_SPTR)text, PCRE2_ZERO_TERMINATED, options, &error, &at, p->compile);
    if (p->code != NULL)
        return SM_OK;
    if (error == PCRE2_ERROR_HEAP_FAILED)
        return SM_ENOMEM;
    if (pcre2_get_error_message(error, message, sizeof message) < 0)
        message[0] = '\0';
    sm_text_init(&t, why, SM_REASON_SIZE);
    sm_text_addf(&t, "pattern: after %zu characters: %s", (size_t)at, (const char *)message);
    return SM_EINVAL;
}

static enum sm_status make(struct sm_pattern *p, const char *text, char why[SM_REASON_SIZE])
{
    enum sm_status status;

    p->general = pcre2_general_context_create(take, give_back, p);
    p->compile = pcre2_compile_context_create(p->general);
    p->limits = pcre2_match_context_create(p->general);
    if (p->general == NULL || p->compile == NULL || p->limits == NULL)
        return SM_ENOMEM;
    pcre2_set_max_pattern_length(p->compile, SM_PATTERN_SIZE - 1);
    pcre2_set_parens_nest_limit(p->compile, NESTING_LIMIT);
    pcre2_set_match_limit(p->limits, MATCH_LIMIT);
    pcre2_set_depth_limit(p->limits, DEPTH_LIMIT);
    pcre2_set_heap_limit(p->limits, HEAP_LIMIT_KIB);
    status = compile(p, text, why);
    if (status != SM_OK)
        return status;
    p->match = pcre2_match_data_create_from_pattern(p->code, p->general);
    return p->match != NULL ? SM_OK : SM_ENOMEM;
}

enum sm_status sm_pattern_create(const char *text, struct sm_pattern **ret_pattern,
                                 char ret_why[SM_REASON_SIZE])
{
    struct sm_pattern *p = calloc(1, sizeof *p);
    enum sm_status status;

    if (p == NULL)
        return SM_ENOMEM;
    status = make(p, text, ret_why);
    if (status != SM_OK) {
        sm_pattern_destroy(p);
        return status;
    }
    p->made = true;
    *ret_pattern = p;
    return SM_OK;
}

void sm_pattern_destroy(struct sm_pattern *p)
{
    if (p == NULL)
        return;
    pcre2_match_data_free(p->match);
    pcre2_code_free(p->code);
    pcre2_match_context_free(p->limits);
    pcre2_compile_context_free(p->compile);
    pcre2_general_context_free(p->general);
    free(p);
}

int sm_pattern_group(const struct sm_pattern *p, const char *name)
{
    const int group = pcre2_substring_number_from_name(p->code, (PCRE2_SPTR)name);

    if (group == PCRE2_ERROR_NOUNIQUESUBSTRING)
        return -1;
    return group > 0 ? group : 0;
}

enum sm_status sm_pattern_match(struct sm_pattern *p, struct sm_span line)
{
    const int found =
        pcre2_match(p->code, (PCRE2_SPTR)line.s, line.n, 0, PCRE2_NO_JIT, p->match, p->limits);

    if (found > 0)
        return SM_OK;
    switch (found) {
    case PCRE2_ERROR_MATCHLIMIT:
    case PCRE2_ERROR_DEPTHLIMIT:
    case PCRE2_ERROR_HEAPLIMIT:
    case PCRE2_ERROR_NOMEMORY:
    case PCRE2_ERROR_RECURSELOOP:
        return SM_EFULL;
    default:
        return SM_ESYNTAX;
    }
}

struct sm_span sm_pattern_span(const struct sm_pattern *p, int group, struct sm_span line)
{
    const PCRE2_SIZE *ends = pcre2_get_ovector_pointer(p->match);

    if (group <= 0 || (uint32_t)group >= pcre2_get_ovector_count(p->match))
        return (struct sm_span){ NULL, 0 };
    const PCRE2_SIZE from = ends[2 * group], to = ends[2 * group + 1];
    if (from == PCRE2_UNSET || to > line.n || from > to)
        return (struct sm_span){ NULL, 0 };
    return (struct sm_span){ line.s + from, to - from };
}
