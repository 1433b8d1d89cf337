/* SPDX-License-Identifier: GPL-3.0-or-later */
/* field.c: a line split into fields. */
#include "reading/field.h"

#include <string.h>

#define QUOTE_MAX 24 /* bytes of a meter's text that a message repeats */

static bool blank(char c)
{
    return c == ' ' || c == '\t';
}

static bool blank_or_end(char c)
{
    return blank(c) || c == '\r' || c == '\n';
}

struct sm_span sm_span_trim(struct sm_span s)
{
    while (s.n > 0 && blank_or_end(s.s[0])) {
        s.s++;
        s.n--;
    }
    while (s.n > 0 && blank_or_end(s.s[s.n - 1]))
        s.n--;
    return s;
}

static size_t split_spaces(struct sm_span line, struct sm_span *field)
{
    size_t k = 0, i = 0;

    for (;;) {
        while (i < line.n && blank(line.s[i]))
            i++;
        if (i == line.n || k == SM_FIELDS_MAX)
            return k;
        const size_t from = i;
        while (i < line.n && !blank(line.s[i]))
            i++;
        field[k++] = (struct sm_span){ line.s + from, i - from };
    }
}

static size_t split_char(char c, struct sm_span line, struct sm_span *field)
{
    size_t k = 0, from = 0;

    for (size_t i = 0; i <= line.n && k < SM_FIELDS_MAX; i++) {
        if (i < line.n && line.s[i] != c)
            continue;
        field[k++] = sm_span_trim((struct sm_span){ line.s + from, i - from });
        from = i + 1;
    }
    return k;
}

size_t sm_fields_split(enum sm_split split, char c, struct sm_span line,
                       struct sm_span ret_field[SM_FIELDS_MAX])
{
    if (split == SM_SPLIT_CHAR)
        return split_char(c, line, ret_field);
    return split_spaces(line, ret_field);
}

bool sm_span_is(struct sm_span s, const char *word)
{
    const size_t word_n = strlen(word);
    size_t i = 0, k = 0;

    if (s.n == word_n && (s.n == 0 || memcmp(s.s, word, word_n) == 0))
        return true;
    while (k < word_n && i < s.n) {
        unsigned c = (unsigned char)word[k];

        /* C2 xx and C3 xx are the two-byte forms of U+0080 … U+00FF (RFC 3629) */
        if ((c == 0xc2 || c == 0xc3) && k + 1 < word_n)
            c = (c & 3) << 6 | ((unsigned char)word[++k] & 0x3f);
        if (c != (unsigned char)s.s[i])
            return false;
        i++;
        k++;
    }
    return i == s.n && k == word_n;
}

bool sm_span_is_sign(struct sm_span s)
{
    return s.n == 1 && (s.s[0] == '+' || s.s[0] == '-');
}

const char *sm_span_in(struct sm_span s, const char words[SM_WORDS_MAX][SM_WORD_SIZE])
{
    if (s.n == 0)
        return NULL;
    for (size_t i = 0; i < SM_WORDS_MAX && words[i][0] != '\0'; i++)
        if (sm_span_is(s, words[i]))
            return words[i];
    return NULL;
}

void sm_span_quote(struct sm_text *t, struct sm_span s)
{
    sm_text_add(t, "\"");
    sm_text_add_safe(t, s.n > 0 ? s.s : "", s.n < QUOTE_MAX ? s.n : QUOTE_MAX);
    sm_text_add(t, s.n > QUOTE_MAX ? "…\"" : "\"");
}
