/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_parse.c: lines to readings by profiles of six shapes; a line that does not parse is never a
 * value. */
#include "check.h"

#include <malloc.h>
#include <math.h>
#include <stdio.h>
#include <time.h>

#include "base/number.h"
#include "reading/parse.h"
#include "shapes.h"

enum { R_MV, PLAIN_MV, SEMI_COMMA, STAR_SUM, PAUSE_HEX, SCPI_VOLT };

/* "-12.4 by 0.1 ok as -0012.4 | 24.8 by 0.1 ok as 24.8 | mark" or "unread: why". */
static void tell(struct sm_text *t, enum sm_status status, const struct sm_reading *r, bool mark,
                 const char *why)
{
    if (status != SM_OK) {
        sm_text_addf(t, "unread: %s", why);
        return;
    }
    for (size_t i = 0; i < r->n; i++) {
        const struct sm_value *v = &r->channel[i];

        sm_text_add(t, i > 0 ? " | " : "");
        if (!v->present) {
            sm_text_add(t, "absent");
            continue;
        }
        if (!isnan(v->value))
            sm_text_addf(t, "%.10g by %.10g ", v->value, v->step);
        sm_text_addf(t, "%s as %s", sm_flag_name(v->flag), v->digits);
    }
    sm_text_add(t, mark ? " | mark" : "");
}

static void read_line(struct sm_parser *p, const char *line, size_t n, char *out, size_t cap)
{
    struct sm_reading r = { .t_ns = -1, .n = 77 };
    char why[SM_REASON_SIZE] = "";
    bool mark = false;
    struct sm_text t;
    const enum sm_status status = sm_parser_read(p, 42, line, n, &r, &mark, why);

    sm_text_init(&t, out, cap);
    tell(&t, status, &r, mark, why);
    if (status == SM_OK && r.t_ns != 42)
        fail_msg("\"%s\": time %lld, want 42", line, (long long)r.t_ns);
    if (status != SM_OK && (status != SM_ESYNTAX || r.t_ns != -1 || r.n != 77))
        fail_msg("\"%s\": status %d, or the reading was touched", line, status);
}

static struct sm_parser *parser_of(const struct sm_profile *p)
{
    char why[SM_REASON_SIZE] = "";
    struct sm_parser *parser = NULL;
    const enum sm_status status = sm_parser_create(p, &parser, why);

    if (status != SM_OK)
        fail_msg("profile %s: status %d: %s", p->name, status, why);
    return parser;
}

static void lines_become_readings(void **state)
{
    static const struct {
        int shape;
        const char *line, *want;
    } cases[] = {
        { R_MV, "-0012.4 mV  24.8 C", "-12.4 by 0.1 ok as -0012.4 | 24.8 by 0.1 ok as 24.8" },
        { R_MV, " \t-0012.4\tmV  24.8 C \r\n",
          "-12.4 by 0.1 ok as -0012.4 | 24.8 by 0.1 ok as 24.8" },
        { R_MV, "\x02+7 mV", "7 by 1 ok as +7 | absent" },
        { R_MV, "OVR mV 24.8 C", "over as OVR | 24.8 by 0.1 ok as 24.8" },
        { R_MV, "UDR", "under as UDR | absent" },
        { R_MV, "---- mV ---- C", "open as ---- | open as ----" },
        { R_MV, "WAIT mV 24.8 C", "unusable as WAIT | 24.8 by 0.1 ok as 24.8" },
        { R_MV, "1500.1 mV 24.8 C", "1500.1 by 0.1 open as 1500.1 | 24.8 by 0.1 ok as 24.8" },
        { R_MV, "-1500 mV", "-1500 by 1 ok as -1500 | absent" },
        { R_MV, "1.25e2 mV 24.8 C extra", "125 by 1 ok as 1.25e2 | 24.8 by 0.1 ok as 24.8" },
        { R_MV, "-0.0 mV", "-0 by 0.1 ok as -0.0 | absent" },
        { SEMI_COMMA, "0017;1412,6;uS/cm;24,8;°C;st",
          "1412.6 by 0.1 ok as 1412,6 | 24.8 by 0.1 ok as 24,8" },
        { SEMI_COMMA,
          "0017;1412,6;\xb5S/cm;24,8;\xb0"
          "C;st", /* one byte each, as many meters do */
          "1412.6 by 0.1 ok as 1412,6 | 24.8 by 0.1 ok as 24,8" },
        { SEMI_COMMA, "18; 1413 ;µS/cm;;;st", "1413 by 1 ok as 1413 | absent" },
        { SEMI_COMMA, "18;- 1,5;uS/cm;-0,5;°C;st", /* a sign set apart by blanks */
          "-1.5 by 0.1 open as -1,5 | -0.5 by 0.1 ok as -0,5" },
        { SEMI_COMMA, "18;1,4E3;uS/cm;24,8;°C;sto",
          "1400 by 100 ok as 1,4E3 | 24.8 by 0.1 ok as 24,8 | mark" },
        { SEMI_COMMA, "18;1412,6;uS/cm;24,8;°C;wt",
          "1412.6 by 0.1 unusable as 1412,6 | 24.8 by 0.1 unusable as 24,8" },
        { SEMI_COMMA, "18;0,1;uS/cm;24,8;°C;wt", /* in the air, whatever the status says */
          "0.1 by 0.1 open as 0,1 | 24.8 by 0.1 unusable as 24,8" },
        { SEMI_COMMA, "18;HI;;24,8;°C", "over as HI | 24.8 by 0.1 ok as 24,8" },
        { STAR_SUM, "a=0.4312 A t=23.9 C q=ok*53",
          "0.4312 by 0.0001 ok as 0.4312 | 23.9 by 0.1 ok as 23.9" },
        { STAR_SUM, "a=0.4312 A q=ok*4f\r", "0.4312 by 0.0001 ok as 0.4312 | absent" },
        { STAR_SUM, "a=0.4312 A t=23.9 C q=lamp*47",
          "0.4312 by 0.0001 unusable as 0.4312 | 23.9 by 0.1 unusable as 23.9" },
        { STAR_SUM, "a=HIGH A t=23.9 C q=ok*47", "over as HIGH | 23.9 by 0.1 ok as 23.9" },
        { PAUSE_HEX, "S0 - 1.2345E-2 V 24.8#94C7",
          "-12.345 by 0.001 ok as -1.2345E-2 | 24.8 by 0.1 ok as 24.8" },
        { PAUSE_HEX, "S0 1.2345E-2 V 24.8#DC5A", /* no sign: later fields keep their numbers */
          "12.345 by 0.001 ok as 1.2345E-2 | 24.8 by 0.1 ok as 24.8" },
        { PAUSE_HEX, "S0 - 1.2345E-2 V#AC27", "-12.345 by 0.001 ok as -1.2345E-2 | absent" },
        { PAUSE_HEX, "S7 - 1.2345E-2 V 24.8#2372",
          "-12.345 by 0.001 unusable as -1.2345E-2 | 24.8 by 0.1 unusable as 24.8" },
        { PAUSE_HEX, "S0 + 9.9E0 V 24.8#C23D",
          "9900 by 100 open as +9.9E0 | 24.8 by 0.1 ok as 24.8" },
        { PAUSE_HEX, "S0 OL V 24.8#CDD5", "over as OL | 24.8 by 0.1 ok as 24.8" },
        { SCPI_VOLT, "-1.23450000E-02", "-12.345 by 1e-07 ok as -1.23450000E-02" },
        { SCPI_VOLT, "+9.90000000E+37", "over as +9.90000000E+37" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_profile profile;
        char got[400];

        shape(&profile, (size_t)cases[i].shape);
        struct sm_parser *p = parser_of(&profile);
        read_line(p, cases[i].line, strlen(cases[i].line), got, sizeof got);
        sm_parser_destroy(p);
        if (strcmp(got, cases[i].want) != 0)
            fail_msg("%s: \"%s\":\n  got  %s\n  want %s", profile.name, cases[i].line, got,
                     cases[i].want);
    }
}

static void what_is_no_reading_says_why(void **state)
{
    static const struct {
        int shape;
        const char *line, *want;
    } cases[] = {
        { R_MV, "", "no value in it" },
        { R_MV, "abc", "field 1: expected a number, got \"abc\"" },
        { R_MV, "12.4", "field 2: expected unit mV, got nothing" },
        { R_MV, "7.02 pH 24.8 C", "field 2: expected unit mV, got \"pH\"" },
        { R_MV, "12.4 mV 24.8 F", "field 4: expected unit C, got \"F\"" },
        { R_MV, "12.4 mV 2z.8 C", "field 3: expected a number, got \"2z.8\"" },
        { R_MV, "12.4 mV 24.8 C-0012.5 mV", "field 4: expected unit C, got \"C-0012.5\"" },
        { R_MV, "12,4 mV", "field 1: expected a number, got \"12,4\"" },
        { R_MV, "1e999 mV", "field 1: expected a number that is not too large, got \"1e999\"" },
        { R_MV, "nan mV", "field 1: expected a number, got \"nan\"" },
        { R_MV, "0x10 mV", "field 1: expected a number, got \"0x10\"" },
        { R_MV, "--5 mV", "field 1: expected a number, got \"--5\"" },
        { R_MV, "- 5 mV", "field 1: expected a number, got \"-\"" },
        { R_MV, "\xb5\xb2 mV", "field 1: expected a number, got \"\\xb5\\xb2\"" },
        { R_MV, "12\x1b[2J mV", "field 1: expected a number, got \"12\\x1b[2J\"" },
        { R_MV, "11111111111111111111111111111111 mV",
          "field 1: expected a number, got \"111111111111111111111111…\"" },
        { SEMI_COMMA, "1;1.412,6;uS/cm;24,8;°C;st",
          "field 2: expected a number with a decimal comma, got \"1.412,6\"" },
        { SEMI_COMMA, "1;1412.6;uS/cm;24,8;°C;st",
          "field 2: expected a number with a decimal comma, got \"1412.6\"" },
        { SEMI_COMMA, "1;1,412,6;uS/cm", "field 2: expected a number, got \"1,412,6\"" },
        { SEMI_COMMA, "1;-;uS/cm", "field 2: expected a number, got \"-\"" },
        { SEMI_COMMA, "1;+-3;uS/cm", "field 2: expected a number, got \"+-3\"" },
        { SEMI_COMMA, "1;;;;;st", "no value in it" },
        { STAR_SUM, "a=0.4312 A t=23.9 C q=ok*54", "checksum is 53, the line says 54" },
        { STAR_SUM, "a=0.4313 A t=23.9 C q=ok*53", "checksum is 52, the line says 53" },
        { STAR_SUM, "a=0.4312 A t=23.9 C q=ok",
          "expected a xor8 checksum at the end, got \"=ok\"" },
        { STAR_SUM, "a=0.4312 A t=23.9 C q=ok#53",
          "expected a xor8 checksum at the end, got \"#53\"" },
        { STAR_SUM, "3", "too short to hold a xor8 checksum" },
        { STAR_SUM, "xa=0.4312 A q=ok*37", "the pattern does not match \"xa=0.4312 A q=ok\"" },
        { PAUSE_HEX, "S0 - 1.2345E-2 V 24.8#94C8", "checksum is 94C7, the line says 94C8" },
        { PAUSE_HEX, "S0 - 1.2345E-2 V 24.9#94C7", "checksum is 5406, the line says 94C7" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_profile profile;
        char got[400], want[400];

        shape(&profile, (size_t)cases[i].shape);
        struct sm_parser *p = parser_of(&profile);
        read_line(p, cases[i].line, strlen(cases[i].line), got, sizeof got);
        sm_parser_destroy(p);
        snprintf(want, sizeof want, "unread: %s", cases[i].want);
        if (strcmp(got, want) != 0)
            fail_msg("%s: \"%s\":\n  got  %s\n  want %s", profile.name, cases[i].line, got, want);
    }
}

static void bytes_that_end_c_strings_are_no_digits(void **state)
{
    struct sm_profile profile;
    char got[400];
    char long_line[SM_LINE_MAX + 1];
    (void)state;
    shape(&profile, R_MV);
    struct sm_parser *p = parser_of(&profile);
    read_line(p, "12\0 mV", 6, got, sizeof got);
    assert_string_equal(got, "unread: field 1: expected a number, got \"12\\x00\"");
    memset(long_line, ' ', sizeof long_line);
    read_line(p, long_line, SM_LINE_MAX, got, sizeof got);
    assert_string_equal(got, "unread: no value in it");
    read_line(p, long_line, SM_LINE_MAX + 1, got, sizeof got);
    assert_string_equal(got, "unread: longer than 1024 bytes");
    sm_parser_destroy(p);
}

/* Each byte of a line with a CRC replaced by each other byte: never another number. (The CRC finds
 * every error of one byte: that is what a CRC of 16 bits is for; common knowledge.) */
static void one_wrong_byte_under_a_crc_is_never_a_reading(void **state)
{
    struct sm_profile profile;
    (void)state;
    shape(&profile, PAUSE_HEX);
    struct sm_parser *p = parser_of(&profile);
    for (size_t i = 0; i < profile.example.n - 5; i++)
        for (int b = 0; b < 256; b++) {
            char line[SM_LINE_MAX], got[400];

            memcpy(line, profile.example.line, profile.example.n);
            if ((char)b == line[i])
                continue;
            line[i] = (char)b;
            read_line(p, line, profile.example.n, got, sizeof got);
            if (strncmp(got, "unread: ", 8) != 0)
                fail_msg("byte %zu made %02x: read as %s", i, (unsigned)b, got);
        }
    sm_parser_destroy(p);
}

/* A line cut off anywhere (a meter that stops in mid-line) is unread or lacks whole channels: no
 * digit of a number may be missing. */
static void a_cut_line_never_gives_part_of_a_number(void **state)
{
    struct sm_profile profile;
    (void)state;
    shape(&profile, R_MV);
    struct sm_parser *p = parser_of(&profile);
    for (size_t n = 0; n < profile.example.n; n++) {
        char got[400];

        read_line(p, profile.example.line, n, got, sizeof got);
        if (strncmp(got, "unread: ", 8) != 0 &&
            strcmp(got, "-12.4 by 0.1 ok as -0012.4 | absent") != 0)
            fail_msg("cut after %zu bytes: %s", n, got);
    }
    sm_parser_destroy(p);
}

static void signs_in_a_field_of_their_own(void **state)
{
    static const struct {
        enum sm_split split;
        const char *line, *want;
    } cases[] = {
        { SM_SPLIT_SPACES, "- 12.4 mV", "-12.4 by 0.1 ok as -12.4" },
        { SM_SPLIT_SPACES, "+ 12.4 mV", "12.4 by 0.1 ok as +12.4" },
        { SM_SPLIT_SPACES, "  12.4 mV", "12.4 by 0.1 ok as 12.4" },
        { SM_SPLIT_SPACES, "-12.4 mV", "-12.4 by 0.1 ok as -12.4" },
        { SM_SPLIT_SPACES, "- -12.4 mV", "unread: field 2: expected a number, got \"-12.4\"" },
        { SM_SPLIT_CHAR, "-,12.4,mV", "-12.4 by 0.1 ok as -12.4" },
        { SM_SPLIT_CHAR, " ,12.4,mV", "12.4 by 0.1 ok as 12.4" },
        { SM_SPLIT_CHAR, "x,12.4,mV", "unread: field 1: expected + or -, got \"x\"" },
        { SM_SPLIT_PATTERN, "12.4- mV", "-12.4 by 0.1 ok as -12.4" },
        { SM_SPLIT_PATTERN, "12.4 mV", "12.4 by 0.1 ok as 12.4" },
        { SM_SPLIT_PATTERN, "12.4~ mV", "unread: e-1: expected + or -, got \"~\"" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_profile profile = { .split = cases[i].split,
                                      .split_char = ',',
                                      .pattern =
                                          "(?<e_1>[.\\d]+)(?<e_1_sign>\\W?) (?<e_1_unit>mV)" };
        char got[400];

        shape_channel(&profile, "e-1", SM_UNIT_MV, "", 2, 3)->sign_at = 1;
        struct sm_parser *p = parser_of(&profile);
        read_line(p, cases[i].line, strlen(cases[i].line), got, sizeof got);
        sm_parser_destroy(p);
        if (strcmp(got, cases[i].want) != 0)
            fail_msg("\"%s\":\n  got  %s\n  want %s", cases[i].line, got, cases[i].want);
    }
}

static void a_checksum_over_part_of_the_line_without_a_mark(void **state)
{
    struct sm_profile profile = { .checksum = { .kind = SM_CHECKSUM_SUM8, .from = 1 } };
    char got[400];
    (void)state;
    shape_channel(&profile, "e", SM_UNIT_NONE, "", 1, 0);
    struct sm_parser *p = parser_of(&profile);
    read_line(p,
              "\x02"
              "12 63",
              6, got, sizeof got); /* 31 + 32 (+ 20 for the blank: 83) */
    assert_string_equal(got, "unread: checksum is 83, the line says 63");
    read_line(p,
              "\x02"
              "12 83",
              6, got, sizeof got);
    assert_string_equal(got, "12 by 1 ok as 12");
    read_line(p, "83", 2, got, sizeof got);
    assert_string_equal(got, "unread: too short to hold a sum8 checksum");
    sm_parser_destroy(p);
}

static void every_profile_reads_its_own_example(void **state)
{
    (void)state;
    for (size_t i = 0; i < SHAPES; i++) {
        struct sm_profile profile;
        char why[SM_REASON_SIZE];

        shape(&profile, i);
        struct sm_parser *p = parser_of(&profile);
        if (sm_parser_check_example(p, why) != SM_OK)
            fail_msg("%s: %s", profile.name, why);
        sm_parser_destroy(p);
    }
}

static void an_example_that_does_not_agree_says_so(void **state)
{
    struct sm_profile profile;
    char why[SM_REASON_SIZE];
    (void)state;
    shape(&profile, R_MV);
    struct sm_parser *p = parser_of(&profile); /* which looks at the profile each time */
    profile.example.want[1] = 24.9;
    assert_int_equal(sm_parser_check_example(p, why), SM_EVALUE);
    assert_string_equal(why,
                        "probe: the profile reads \"24.8\" (ok) in its example, which says 24.9");
    profile.example.n = 10;
    assert_int_equal(sm_parser_check_example(p, why), SM_EVALUE);
    assert_string_equal(
        why, "probe: the profile reads \"\" (not there) in its example, which says 24.9");
    profile.example.n = 7;
    assert_int_equal(sm_parser_check_example(p, why), SM_EVALUE);
    assert_string_equal(why,
                        "the profile does not read its own example: field 2: expected unit mV, "
                        "got nothing");
    profile.example.given = false;
    assert_int_equal(sm_parser_check_example(p, why), SM_OK);
    sm_parser_destroy(p);
}

/* ---- profiles that are refused ---- */

static void profiles_that_cannot_be_are_refused(void **state)
{
    static const struct {
        enum sm_split split;
        const char *pattern;
        unsigned at, unit_at, sign_at, status_at;
        double scale;
        const char *want;
    } cases[] = {
        { SM_SPLIT_SPACES, "", 0, 0, 0, 0, 1, "channel e-1: fields are numbered from 1 to 64" },
        { SM_SPLIT_SPACES, "", 65, 0, 0, 0, 1, "channel e-1: fields are numbered from 1 to 64" },
        { SM_SPLIT_CHAR, "", 1, 65, 0, 0, 1, "channel e-1: fields are numbered from 1 to 64" },
        { SM_SPLIT_CHAR, "", 2, 0, 2, 0, 1,
          "channel e-1: a sign set apart has a field of its own" },
        { SM_SPLIT_CHAR, "", 1, 0, 0, 65, 1, "status: fields are numbered from 1 to 64" },
        { SM_SPLIT_CHAR, "", 1, 0, 0, 0, 0, "channel e-1: scale must be a number other than 0" },
        { SM_SPLIT_CHAR, "", 1, 0, 0, 0, INFINITY,
          "channel e-1: scale must be a number other than 0" },
        { SM_SPLIT_PATTERN, "(?<e>.*)", 0, 0, 0, 0, 1,
          "pattern: no group (?<e_1>…) for that channel" },
        { SM_SPLIT_PATTERN, "(?J)(?<e_1>a)|(?<e_1>b)", 0, 0, 0, 0, 1,
          "pattern: more than one group is called \"e_1\"" },
        { SM_SPLIT_PATTERN, "(?<e_1>a", 0, 0, 0, 0, 1,
          "pattern: after 8 characters: missing closing parenthesis" },
        { SM_SPLIT_PATTERN, "(*UTF)(?<e_1>a)", 0, 0, 0, 0, 1,
          "pattern: after 6 characters: using UTF is disabled by the application" },
        { SM_SPLIT_PATTERN, "(?<e_1>\\C)", 0, 0, 0, 0, 1,
          "pattern: after 9 characters: using \\C is disabled by the application" },
        { SM_SPLIT_PATTERN,
          "(?<e_1>(((((((((((((((((((((((((((((((((((a)))))))))))))))))))))))))))))))))))", 0, 0, 0,
          0, 1, "pattern: after 39 characters: parentheses are too deeply nested" },
        { SM_SPLIT_PATTERN, "(?<e_1>(((a{1,200}){1,200}){1,200}){1,200})", 0, 0, 0, 0, 1,
          "pattern: after 43 characters: regular expression is too large" },
    };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        struct sm_profile p = { .split = cases[i].split, .split_char = ';' };
        struct sm_parser *parser = NULL;
        char why[SM_REASON_SIZE] = "";
        struct sm_channel *c =
            shape_channel(&p, "e-1", SM_UNIT_MV, "", cases[i].at, cases[i].unit_at);
        c->sign_at = cases[i].sign_at;
        c->scale = cases[i].scale;
        p.status_at = cases[i].status_at;
        sm_text_copy(p.pattern, sizeof p.pattern, cases[i].pattern);
        const enum sm_status status = sm_parser_create(&p, &parser, why);

        if (status != SM_EINVAL || parser != NULL || strcmp(why, cases[i].want) != 0)
            fail_msg("case %zu: status %d, got \"%s\", want \"%s\"", i, status, why, cases[i].want);
    }
}

/* ---- patterns that explode ---- */

static void a_pattern_that_explodes_is_cut_off_and_counted(void **state)
{
    static const char *const pattern[] = { "(?<e>(a+)+)b",       "(?<e>(a|a)*)b",
                                           "(?<e>(a|aa)+)b$",    "(?<e>(?:.*a){12})b",
                                           "(?<e>(?:(?R)|a)+)b", "(?<e>(a(?1)?a?)+)b",
                                           "(?<e>a*a*a*a*a*a*)b" };
    char line[SM_LINE_MAX];
    const clock_t begun = clock();
    (void)state;
    memset(line, 'a', sizeof line);
    memcpy(line + sizeof line - 2, "bc", 2); /* all but the end is there */
    for (size_t i = 0; i < COUNT(pattern); i++) {
        struct sm_profile profile = { .split = SM_SPLIT_PATTERN };
        char got[400];

        shape_channel(&profile, "e", SM_UNIT_NONE, "", 0, 0);
        sm_text_copy(profile.pattern, sizeof profile.pattern, pattern[i]);
        struct sm_parser *p = parser_of(&profile);
        for (unsigned again = 1; again <= 3; again++) {
            read_line(p, line, sizeof line, got, sizeof got);
            if (strcmp(got, "unread: pattern took too long") != 0 || sm_parser_too_long(p) != again)
                fail_msg("%s: got %s, counted %llu", pattern[i], got,
                         (unsigned long long)sm_parser_too_long(p));
        }
        read_line(p, "x", 1, got, sizeof got); /* and goes on */
        assert_string_equal(got, "unread: the pattern does not match \"x\"");
        sm_parser_destroy(p);
    }
    /* 21 lines: 2 ms with the limit of 10,000, 2 s with PCRE2's own (measured) */
    check_close("CPU seconds", (double)(clock() - begun) / CLOCKS_PER_SEC, 0, 1);
}

/* A pattern that backtracks over many groups wants more memory while it matches: it has it already.
 */
static void reading_allocates_nothing(void **state)
{
    struct sm_profile profile = { .split = SM_SPLIT_PATTERN,
                                  .pattern = "(?<e>\\d+)(?:(?: |,)x(\\d)?)*" };
    char line[600] = "12", got[400];
    (void)state;
    for (size_t i = 2; i + 2 < sizeof line; i += 3)
        memcpy(line + i, " x1", 3);
    shape_channel(&profile, "e", SM_UNIT_NONE, "", 0, 0);
    struct sm_parser *p = parser_of(&profile);
    const size_t before = mallinfo2().uordblks; /* 0 under the address sanitizer */
    struct sm_reading r;
    bool mark;
    char why[SM_REASON_SIZE];
    for (int i = 0; i < 100; i++)
        assert_int_equal(sm_parser_read(p, 0, line, i % 2 == 0 ? 599 : 20, &r, &mark, why), SM_OK);
    assert_int_equal(mallinfo2().uordblks, before);
    read_line(p, line, 599, got, sizeof got);
    assert_string_equal(got, "12 by 1 ok as 12");
    sm_parser_destroy(p);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(lines_become_readings),
        cmocka_unit_test(what_is_no_reading_says_why),
        cmocka_unit_test(bytes_that_end_c_strings_are_no_digits),
        cmocka_unit_test(one_wrong_byte_under_a_crc_is_never_a_reading),
        cmocka_unit_test(a_cut_line_never_gives_part_of_a_number),
        cmocka_unit_test(signs_in_a_field_of_their_own),
        cmocka_unit_test(a_checksum_over_part_of_the_line_without_a_mark),
        cmocka_unit_test(every_profile_reads_its_own_example),
        cmocka_unit_test(an_example_that_does_not_agree_says_so),
        cmocka_unit_test(profiles_that_cannot_be_are_refused),
        cmocka_unit_test(a_pattern_that_explodes_is_cut_off_and_counted),
        cmocka_unit_test(reading_allocates_nothing)
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
