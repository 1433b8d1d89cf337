/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stillmark_profile.c: a file of raw lines through the framer and the parser that read the meter.
 */
#include "stillmark_profile.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/number.h"
#include "check_setup.h"
#include "reading/frame.h"
#include "reading/parse.h"
#include "source_disk.h"

#define LINES_MAX ((size_t)16 << 20) /* bytes of the file of lines */
#define CHUNK 4096
#define BLAMES_SHOWN 100

#define DONE 0
#define ANSWER_NO 1
#define NOT_DONE 2
#define SHOWN 256 /* bytes of a line that are shown */

static const char HELP[] =
    "stillmark profile FILE --try LINES\n"
    "\n"
    "Shows what a profile (YAML, as in conf/profiles/) reads out of a file of lines as a meter "
    "sends\n"
    "them: each line's channels, or why it gives no reading. \"step\" is the last digit of the\n"
    "display; \"over\", \"open\" and such are readings without a number. Catch LINES with any\n"
    "terminal program: a minute of what the meter sends, the bytes as they come, over-range and a\n"
    "probe in air among them.\n"
    "Exit status: 0 every line gave a reading; 1 at least one did not; 2 could not be done.\n";

struct trial {
    const struct sm_profile *profile;
    struct sm_parser *parser;
    unsigned long long lines, read;
};

/* One line, "about: what"; about "" is left out. */
static int not_done(const char *about, const char *what)
{
    char safe[2048];
    struct sm_text t;

    sm_text_init(&t, safe, sizeof safe);
    sm_text_add_safe(&t, about, strlen(about));
    sm_text_add(&t, about[0] != '\0' ? ": " : "");
    sm_text_add_safe(&t, what, strlen(what));
    fprintf(stderr, "stillmark profile: %s\n", safe);
    return NOT_DONE;
}

/* ---- one line ---- */

static void add_value(struct sm_text *t, const struct sm_channel *c, const struct sm_value *v)
{
    char number[SM_NUMBER_SIZE];
    const char *unit = sm_unit_name(c->unit);

    sm_text_addf(t, "%s ", c->name);
    if (v->flag != SM_FLAG_OK) {
        sm_text_addf(t, "%s (\"", sm_flag_name(v->flag));
        sm_text_add_safe(t, v->digits, strlen(v->digits));
        sm_text_add(t, "\")");
        return;
    }
    sm_number_write(number, v->value);
    sm_text_addf(t, "%s%s%s", number, unit[0] != '\0' ? " " : "", unit);
    if (v->step > 0) {
        sm_number_write(number, v->step);
        sm_text_addf(t, " (step %s)", number);
    }
}

static void add_reading(struct sm_text *t, const struct sm_profile *p, const struct sm_reading *r)
{
    bool first = true;

    for (size_t i = 0; i < r->n; i++) {
        if (!r->channel[i].present)
            continue;
        sm_text_add(t, first ? "" : ", ");
        add_value(t, &p->channel[i], &r->channel[i]);
        first = false;
    }
}

static void show_line(struct trial *tr, const struct sm_line *line)
{
    char out[8192], why[SM_REASON_SIZE] = "";
    struct sm_reading r;
    struct sm_text t;
    bool mark = false;

    sm_text_init(&t, out, sizeof out);
    sm_text_addf(&t, "%llu: ", ++tr->lines);
    if (line->kind != SM_LINE_WHOLE) {
        sm_text_addf(&t, "no reading: the line is %s%s", sm_line_kind_name(line->kind),
                     line->kind == SM_LINE_OVERLONG ? ": is eol what ends its lines?" : "");
    } else if (sm_parser_read(tr->parser, 0, line->bytes, line->n, &r, &mark, why) == SM_OK) {
        tr->read++;
        add_reading(&t, tr->profile, &r);
        sm_text_add(&t, mark ? ", mark" : "");
    } else {
        sm_text_add(&t, "no reading: ");
        sm_text_add_safe(&t, why, strlen(why));
    }
    sm_text_add(&t, "   | ");
    sm_text_add_safe(&t, line->bytes, line->n < SHOWN ? line->n : SHOWN);
    sm_text_add(&t, line->n > SHOWN ? " …" : "");
    printf("%s\n", out);
}

/* ---- the file ---- */

/* In a file there are no pauses: lines of a meter that ends them by a pause stand one below
 * another. */
static struct sm_framing framing_in_a_file(const struct sm_profile *p)
{
    struct sm_framing how = p->framing;

    if (how.eol == SM_EOL_GAP) {
        how.eol = SM_EOL_AUTO;
        printf("(the meter ends a line by a pause; in this file each line is one)\n");
    }
    return how;
}

/* The last line may lack its end: it is read all the same, and said. */
static void show_last(struct trial *tr, struct sm_framer *f)
{
    struct sm_line line;

    if (!sm_framer_end(f, 0, &line))
        return;
    if (line.kind == SM_LINE_CUT) {
        line.kind = SM_LINE_WHOLE;
        printf("(the last line has no end)\n");
    }
    show_line(tr, &line);
}

static void show_lines(struct trial *tr, const char *text, size_t n)
{
    const struct sm_framing how = framing_in_a_file(tr->profile);
    struct sm_framer *f = malloc(sizeof *f);
    struct sm_line line;

    if (f == NULL)
        return;
    sm_framer_init(f, &how, false);
    for (size_t at = 0; at < n; at += CHUNK) {
        const struct sm_chunk c = { .bytes = (const unsigned char *)text + at,
                                    .n = n - at < CHUNK ? n - at : CHUNK };

        if (sm_framer_feed(f, &c) != SM_OK)
            break;
        while (sm_framer_next(f, &line))
            show_line(tr, &line);
    }
    show_last(tr, f);
    free(f);
}

static int try_lines(const struct sm_profile *p, const char *lines_file)
{
    struct trial tr = { .profile = p };
    char why[SM_REASON_SIZE] = "";
    char *text = NULL;
    size_t n = 0;

    if (sm_disk_read(lines_file, LINES_MAX, &text, &n, why) != SM_OK)
        return not_done(lines_file, why[0] != '\0' ? why : "no memory");
    if (sm_parser_create(p, &tr.parser, why) != SM_OK) {
        free(text);
        return not_done(p->name, why);
    }
    show_lines(&tr, text, n);
    sm_parser_destroy(tr.parser);
    free(text);
    if (tr.lines == 0)
        return not_done(lines_file, "no line in it");
    printf("%llu of %llu lines gave a reading\n", tr.read, tr.lines);
    if (fflush(stdout) != 0 || ferror(stdout))
        return not_done("", "standard output cannot be written");
    return tr.read == tr.lines ? DONE : ANSWER_NO;
}

static int load_profile(const char *file, struct sm_profile *ret_profile)
{
    struct sm_blame *list = calloc(BLAMES_SHOWN, sizeof *list);
    char why[SM_REASON_SIZE] = "";
    struct sm_blames blames;
    char *text = NULL;
    size_t n = 0;
    enum sm_status st =
        list != NULL ? sm_disk_read(file, SM_SETUP_FILE_MAX, &text, &n, why) : SM_ENOMEM;

    if (st == SM_OK) {
        sm_blames_init(&blames, list, BLAMES_SHOWN);
        st = sm_profile_load(file, text, n, ret_profile, &blames);
        sm_print_blames(&blames, stderr);
    } else {
        (void)not_done(file, why[0] != '\0' ? why : sm_status_text(st));
    }
    free(text);
    free(list);
    return st == SM_OK ? DONE : NOT_DONE;
}

int sm_stillmark_profile(int argc, char **argv)
{
    const char *file = NULL, *lines = NULL;
    struct sm_profile *p;
    int status;

    for (int i = 0; i < argc; i++) {
        if (strcmp(argv[i], "--help") == 0) {
            fputs(HELP, stdout);
            return DONE;
        }
        if (strcmp(argv[i], "--try") == 0 && i + 1 < argc)
            lines = argv[++i];
        else if (strncmp(argv[i], "--try=", 6) == 0)
            lines = argv[i] + 6;
        else if (argv[i][0] == '-' || file != NULL)
            return not_done(argv[i], "not understood, see --help");
        else
            file = argv[i];
    }
    if (file == NULL || lines == NULL)
        return not_done("", "wanted: stillmark profile FILE --try LINES");
    p = calloc(1, sizeof *p);
    if (p == NULL)
        return not_done("", "no memory");
    status = load_profile(file, p);
    if (status == DONE)
        status = try_lines(p, lines);
    free(p);
    return status;
}
