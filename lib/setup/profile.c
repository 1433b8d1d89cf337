/* SPDX-License-Identifier: GPL-3.0-or-later */
/* profile.c: a file of conf/profiles/ to struct sm_profile, tried on its own example. */
#include <string.h>

#include "base/time.h"
#include "reading/checksum.h"
#include "reading/parse.h"
#include "setup/parts.h"

#define UNKNOWN SM_UNIT_COUNT /* a unit that was blamed: what depends on it is not judged */

/* The scalar's characters as bytes: U+0000 to U+00FF is the byte of that code. */
static bool get_bytes(const struct sm_reader *r, const struct sm_node *node, const char *what,
                      char *ret_bytes, size_t cap, size_t *ret_n)
{
    char bytes[SM_LINE_MAX];
    size_t n = 0, at = 0;

    if (node == NULL)
        return false;
    while (node->kind == SM_NODE_TEXT && at < node->n && n < cap && n < sizeof bytes) {
        uint32_t code = 0;
        const size_t len = sm_utf8_next(node->text + at, node->n - at, &code);

        if (len == 0 || code > 0xFF)
            break;
        bytes[n++] = (char)(unsigned char)code;
        at += len;
    }
    if (n == 0 || at < node->n) {
        sm_blame_got(r, node, "expected %s (1 to %zu bytes, characters up to \\xff)", what, cap);
        return false;
    }
    memcpy(ret_bytes, bytes, n);
    *ret_n = n;
    return true;
}

/* ---- framing ---- */

static int hex_digit(char c)
{
    if (c >= '0' && c <= '9')
        return c - '0';
    if (c >= 'a' && c <= 'f')
        return c - 'a' + 10;
    if (c >= 'A' && c <= 'F')
        return c - 'A' + 10;
    return -1;
}

/* One character of a terminator at s[n], escapes \r \n \t \\ \" \xNN; bytes used, 0: none. */
static size_t terminator_byte(const char *s, size_t n, char *ret_byte)
{
    static const char names[] = "rnt\\\"", bytes[] = "\r\n\t\\\"";
    const char *at;

    if (n >= 1 && s[0] != '\\') {
        *ret_byte = s[0];
        return 1;
    }
    if (n >= 4 && s[1] == 'x' && hex_digit(s[2]) >= 0 && hex_digit(s[3]) >= 0) {
        *ret_byte = (char)(unsigned char)(hex_digit(s[2]) * 16 + hex_digit(s[3]));
        return 4;
    }
    if (n < 2 || s[1] == '\0' || (at = strchr(names, s[1])) == NULL)
        return 0;
    *ret_byte = bytes[at - names];
    return 2;
}

static bool read_terminator(const char *s, size_t n, struct sm_framing *f)
{
    size_t at = 1, used;

    if (n < 3 || s[0] != '"' || s[n - 1] != '"')
        return false;
    f->text_n = 0;
    while (at < n - 1 && f->text_n < SM_TERMINATOR_SIZE - 1) {
        used = terminator_byte(s + at, n - 1 - at, &f->text[f->text_n]);
        if (used == 0)
            return false;
        f->text_n++;
        at += used;
    }
    return at == n - 1;
}

static bool starts(const struct sm_node *node, const char *head)
{
    return node->n > strlen(head) && memcmp(node->text, head, strlen(head)) == 0;
}

static void fill_eol(const struct sm_reader *r, const struct sm_node *node, struct sm_framing *f)
{
    static const char *const words[] = { "auto", "cr", "lf", "crlf", "etx" };
    static const enum sm_eol kinds[] = { SM_EOL_AUTO, SM_EOL_CR, SM_EOL_LF, SM_EOL_CRLF,
                                         SM_EOL_ETX };
    struct sm_quantity q;
    int64_t ns;

    if (node == NULL)
        return;
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++)
        if (sm_is_word(node, words[i])) {
            f->eol = kinds[i];
            return;
        }
    if (node->kind == SM_NODE_TEXT && starts(node, "gap ") &&
        sm_quantity_parse(node->text + 4, node->n - 4, &q) == SM_OK &&
        sm_quantity_ns(q, &ns) == SM_OK && ns > 0 && ns <= 60 * SM_NS_PER_S) {
        f->eol = SM_EOL_GAP;
        f->gap_ns = ns;
        return;
    }
    if (node->kind == SM_NODE_TEXT && starts(node, "text ") &&
        read_terminator(node->text + 5, node->n - 5, f)) {
        f->eol = SM_EOL_TEXT;
        return;
    }
    sm_blame_got(r, node,
                 "expected auto, cr, lf, crlf, etx, gap 50 ms (up to 60 s) or text \"…\" (1 to 8 "
                 "bytes)");
}

static void fill_question(const struct sm_reader *r, const struct sm_node *map, bool repeats,
                          struct sm_question *q)
{
    static const char *const keys[] = { "text", "every", "within", NULL };
    static const char *const once[] = { "text", "within", NULL };

    if (!sm_keys_known(r, map, repeats ? keys : once))
        return;
    get_bytes(r, sm_need(r, map, "text", "the question to send"), "the question to send", q->text,
              sizeof q->text, &q->n);
    sm_get_time(r, sm_need(r, map, "within", "how long an answer may take, 600 ms say"),
                SM_NS_PER_MS, 600 * SM_NS_PER_S, &q->within_ns);
    if (repeats)
        sm_get_time(r, sm_need(r, map, "every", "how often to ask, 1 s say"), 10 * SM_NS_PER_MS,
                    24 * 3600 * SM_NS_PER_S, &q->every_ns);
}

/* ---- splitting ---- */

static bool is_separator(const struct sm_node *node)
{
    const char c = node->kind == SM_NODE_TEXT && node->n == 1 ? node->text[0] : '\0';

    return c > ' ' && c < 0x7F && strchr("0123456789+-.", c) == NULL;
}

static void fill_split(const struct sm_reader *r, const struct sm_node *root, struct sm_profile *p)
{
    const struct sm_node *split = sm_key(root, "split"), *pattern = sm_key(root, "pattern");

    p->split = SM_SPLIT_SPACES;
    if (pattern != NULL) {
        p->split = SM_SPLIT_PATTERN;
        sm_get_text(r, pattern, "a pattern", p->pattern, sizeof p->pattern);
        if (split != NULL)
            sm_blame(r, split, "a profile has either split or pattern, not both");
        return;
    }
    if (split == NULL || sm_is_word(split, "spaces"))
        return;
    p->split = SM_SPLIT_CHAR;
    if (sm_is_word(split, "tab"))
        p->split_char = '\t';
    else if (is_separator(split))
        p->split_char = split->text[0];
    else
        sm_blame_got(
            r, split,
            "expected spaces, tab or one character such as \";\" (no digit, sign or point)");
}

static void fill_field(const struct sm_reader *r, const struct sm_node *map, const char *key,
                       bool pattern, unsigned *ret_at)
{
    const struct sm_node *node = sm_key(map, key);

    if (node != NULL && pattern)
        sm_blame(r, node, "not used with a pattern: its groups are found by name");
    else
        sm_get_count(r, node, 1, SM_FIELDS_MAX, ret_at);
}

static void fill_unit(const struct sm_reader *r, const struct sm_node *node, enum sm_unit *ret_unit)
{
    *ret_unit = UNKNOWN;
    if (node == NULL)
        return;
    if (sm_is_word(node, "none"))
        *ret_unit = SM_UNIT_NONE;
    else if (node->kind != SM_NODE_TEXT || sm_unit_parse(node->text, node->n, ret_unit) != SM_OK)
        sm_blame_got(r, node, "expected a unit such as mV, pH, °C, A, µS/cm, mg/L or none");
}

static void fill_plausible(const struct sm_reader *r, const struct sm_node *map,
                           struct sm_channel *c)
{
    static const char *const keys[] = { "from", "to", NULL };

    if (!sm_keys_known(r, map, keys) || c->unit == UNKNOWN)
        return;
    c->has_plausible = true;
    if (sm_get_quantity(r, sm_need(r, map, "from", "the lowest plausible value"), c->unit, -1e9,
                        1e9, &c->plausible_from) &&
        sm_get_quantity(r, sm_need(r, map, "to", "the highest plausible value"), c->unit,
                        -SM_ANY_VALUE, SM_ANY_VALUE, &c->plausible_to) &&
        !(c->plausible_from < c->plausible_to))
        sm_blame(r, map, "from must be less than to");
}

static void fill_scale(const struct sm_reader *r, const struct sm_node *node, struct sm_channel *c)
{
    c->scale = 1.0;
    if (sm_get_number(r, node, -SM_ANY_VALUE, SM_ANY_VALUE, &c->scale) && c->scale == 0.0) {
        sm_blame_got(r, node, "expected a number other than 0");
        c->scale = 1.0;
    }
}

static void fill_channel(const struct sm_reader *r, const struct sm_node *map, bool pattern,
                         struct sm_channel *c)
{
    static const char *const keys[] = { "at", "unit-at",   "sign-at", "unit", "written",
                                        "is", "plausible", "scale",   NULL };
    static const char *const is[] = { "raw", "calibrated" };
    size_t at = 0;

    if (!sm_meter_name_ok(map->key, strlen(map->key)))
        sm_blame(r, map, "expected a channel's name (1 to 32 of a-z, 0-9 and -)");
    else
        sm_text_copy(c->name, sizeof c->name, map->key);
    if (!sm_keys_known(r, map, keys))
        return;
    fill_field(r, map, "at", pattern, &c->at);
    fill_field(r, map, "unit-at", pattern, &c->unit_at);
    fill_field(r, map, "sign-at", pattern, &c->sign_at);
    if (!pattern)
        (void)sm_need(r, map, "at", "the field that holds the number, 1 for the first");
    if (c->sign_at != 0 && c->at != 0 && c->sign_at >= c->at)
        sm_blame(r, sm_key(map, "sign-at"), "the sign must stand before the number (at: %u)",
                 c->at);
    fill_unit(r, sm_need(r, map, "unit", "a unit such as mV or °C, or none"), &c->unit);
    sm_get_text(r, sm_key(map, "written"), "the unit as the meter writes it", c->written,
                sizeof c->written);
    if (sm_get_choice(r, sm_key(map, "is"), is, 2, &at))
        c->raw = at == 0;
    fill_plausible(r, sm_key(map, "plausible"), c);
    fill_scale(r, sm_key(map, "scale"), c);
}

static void fill_channels(const struct sm_reader *r, const struct sm_node *root,
                          struct sm_profile *p)
{
    const struct sm_node *map = sm_need(r, root, "channels", "the channels that a line carries");

    if (map == NULL)
        return;
    if (map->kind != SM_NODE_MAP || map->n_children < 1 || map->n_children > SM_CHANNELS_MAX) {
        sm_blame_got(r, map, "expected 1 to %d channels (\"name: { … }\")", SM_CHANNELS_MAX);
        return;
    }
    for (const struct sm_node *c = map->child; c != NULL; c = c->next)
        fill_channel(r, c, p->split == SM_SPLIT_PATTERN, &p->channel[p->n_channels++]);
}

/* ---- words, checksum, example ---- */

static void fill_words(const struct sm_reader *r, const struct sm_node *list,
                       char words[SM_WORDS_MAX][SM_WORD_SIZE])
{
    size_t n = 0;

    if (!sm_is_list(r, list, 1, SM_WORDS_MAX, "words"))
        return;
    for (const struct sm_node *w = list->child; w != NULL; w = w->next)
        sm_get_text(r, w, "a word", words[n++], SM_WORD_SIZE);
}

static void fill_all_words(const struct sm_reader *r, const struct sm_node *map,
                           struct sm_profile *p)
{
    static const char *const keys[] = { "over", "under", "open", "unusable", "mark", NULL };

    if (!sm_keys_known(r, map, keys))
        return;
    fill_words(r, sm_key(map, "over"), p->over);
    fill_words(r, sm_key(map, "under"), p->under);
    fill_words(r, sm_key(map, "open"), p->open);
    fill_words(r, sm_key(map, "unusable"), p->unusable);
    fill_words(r, sm_key(map, "mark"), p->mark);
}

static void fill_checksum(const struct sm_reader *r, const struct sm_node *map,
                          struct sm_checksum_rule *c)
{
    static const char *const keys[] = { "kind", "mark", "skip", NULL };
    static const enum sm_checksum kinds[] = { SM_CHECKSUM_SUM8, SM_CHECKSUM_XOR8,
                                              SM_CHECKSUM_CRC16_MODBUS, SM_CHECKSUM_CRC16_CCITT,
                                              SM_CHECKSUM_CRC16_XMODEM };
    const char *names[sizeof kinds / sizeof kinds[0]];
    size_t at = 0, n = 0;
    unsigned from = 0;

    if (!sm_keys_known(r, map, keys))
        return;
    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++)
        names[i] = sm_checksum_name(kinds[i]);
    if (sm_get_choice(r, sm_need(r, map, "kind", "sum8, xor8 or a CRC"), names,
                      sizeof kinds / sizeof kinds[0], &at))
        c->kind = kinds[at];
    get_bytes(r, sm_key(map, "mark"), "the one byte before the checksum", &c->mark, 1, &n);
    if (sm_get_count(r, sm_key(map, "skip"), 0, SM_LINE_MAX - 1, &from))
        c->from = from;
}

static void fill_example_value(const struct sm_reader *r, const struct sm_node *node,
                               struct sm_profile *p)
{
    const char *names[SM_CHANNELS_MAX];
    const int i = sm_profile_channel(p, node->key);

    if (i >= 0) {
        if (p->channel[i].unit != UNKNOWN &&
            sm_get_quantity(r, node, p->channel[i].unit, -SM_ANY_VALUE, SM_ANY_VALUE,
                            &p->example.want[i]))
            p->example.has[i] = true;
        return;
    }
    for (size_t c = 0; c < p->n_channels; c++)
        names[c] = p->channel[c].name;
    const char *near = sm_nearest(node->key, names, p->n_channels);
    sm_blame(r, node, "no such channel%s%s%s", near != NULL ? "; did you mean \"" : "",
             near != NULL ? near : "", near != NULL ? "\"?" : "");
}

static void fill_example(const struct sm_reader *r, const struct sm_node *map, struct sm_profile *p)
{
    const struct sm_node *line;

    if (map == NULL)
        return;
    if (map->kind != SM_NODE_MAP) {
        sm_blame_got(r, map, "expected { line: \"…\", CHANNEL: value }");
        return;
    }
    line = sm_need(r, map, "line", "a line as the meter sends it");
    if (line != NULL && (line->kind != SM_NODE_TEXT || line->n < 1 || line->n > SM_LINE_MAX)) {
        sm_blame_got(r, line, "expected a line of 1 to %d bytes", SM_LINE_MAX);
    } else if (line != NULL) {
        memcpy(p->example.line, line->text, line->n);
        p->example.n = line->n;
        p->example.given = true;
    }
    if (map->n_children - (line != NULL) == 0)
        sm_blame(r, map, "expected the value of at least one channel beside the line");
    for (const struct sm_node *c = map->child; c != NULL; c = c->next)
        if (strcmp(c->key, "line") != 0)
            fill_example_value(r, c, p);
}

/* Compiles the profile and reads its example with the parser that will read the meter. */
static void try_it(const struct sm_reader *r, const struct sm_node *root, struct sm_profile *p)
{
    char why[SM_REASON_SIZE] = "";
    struct sm_parser *parser = NULL;
    const struct sm_node *place = sm_key(root, "pattern");

    const enum sm_status st = sm_parser_create(p, &parser, why);

    if (st != SM_OK) {
        sm_blame(r, place != NULL ? place : sm_key(root, "channels"), "%s",
                 st == SM_EINVAL ? why : sm_status_text(st));
        return;
    }
    if (sm_parser_check_example(parser, why) != SM_OK)
        sm_blame(r, sm_key(sm_key(root, "example"), "line"), "%s", why);
    sm_parser_destroy(parser);
}

void sm_profile_fill(const struct sm_reader *r, const struct sm_node *root, const char *name,
                     struct sm_profile *p)
{
    static const char *const keys[] = { "eol",      "strip-bit7", "ask",     "identity", "split",
                                        "pattern",  "status-at",  "decimal", "channels", "words",
                                        "checksum", "example",    NULL };
    static const char *const decimals[] = { "point", "comma" };
    const size_t before = sm_blames_total(r->blames);
    size_t at = 0;

    if (!sm_keys_known(r, root, keys))
        return;
    sm_text_copy(p->name, sizeof p->name, name);
    fill_eol(r, sm_key(root, "eol"), &p->framing);
    sm_get_yes(r, sm_key(root, "strip-bit7"), &p->framing.strip_bit7);
    fill_question(r, sm_key(root, "ask"), true, &p->ask);
    fill_question(r, sm_key(root, "identity"), false, &p->identity);
    fill_split(r, root, p);
    fill_field(r, root, "status-at", p->split == SM_SPLIT_PATTERN, &p->status_at);
    if (sm_get_choice(r, sm_key(root, "decimal"), decimals, 2, &at))
        p->decimal_comma = at == 1;
    if (p->decimal_comma && p->split == SM_SPLIT_CHAR && p->split_char == ',')
        sm_blame(r, sm_key(root, "split"), "the comma cannot split fields and be the decimal sign");
    fill_channels(r, root, p);
    fill_all_words(r, sm_key(root, "words"), p);
    fill_checksum(r, sm_key(root, "checksum"), &p->checksum);
    fill_example(r, sm_need(r, root, "example", "a line as the meter sends it, and what it means"),
                 p);
    if (sm_blames_total(r->blames) == before)
        try_it(r, root, p);
}
