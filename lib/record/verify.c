/* SPDX-License-Identifier: GPL-3.0-or-later */
/* verify.c: one walk over the lines, hashing group by group; only the heads of lines are looked at.
 */
#include "record/verify.h"

#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

#include "record/entry.h"
#include "record/fields.h"
#include "record/head.h"
#include "record/load.h"

#define HASH_N (SM_HASH_HEX - 1)
#define SIG_N (SM_SIG_HEX - 1)

struct line {
    const char *s;
    size_t n; /* without the newline */
};

struct walk {
    const char *text, *end;
    const char *at;        /* the next line */
    const char *hash_from; /* first byte of the stamp before, or of the text */
    const char *group;     /* first byte of the first entry not under a stamp yet */
    int64_t line;          /* lines before `at` */
    int64_t group_line;    /* number of the group's first line */
    int64_t from;          /* n that the group's first entry must have */
    int64_t entries;       /* whole lines in the group so far */
    struct sm_head before; /* of the line before; k NULL: none, or unreadable */
    bool after_close;      /* the line before is `close` */
    const char *key;
    struct sm_hasher *hasher;
    struct sm_verify *v;
};

struct stamp {
    int64_t from;
    char hash[SM_HASH_HEX], sig[SM_SIG_HEX]; /* sig "": none */
};

/* ---- what is wrong ---- */

/* The first line of text[from, to) that does not parse or is out of number; 0: none. */
static int64_t find_bad_line(const struct walk *w, const char *from, const char *to)
{
    struct sm_entry_store *store = malloc(sizeof *store);
    struct sm_entry *e = malloc(sizeof *e);
    int64_t line = w->group_line, n = w->from, bad = 0;
    char why[SM_REASON_SIZE];

    if (store != NULL && e != NULL) {
        sm_entry_store_init(store);
        while (from < to && bad == 0) {
            const char *newline = memchr(from, '\n', (size_t)(to - from));
            const size_t len = (size_t)((newline != NULL ? newline : to) - from);
            struct sm_head head;

            if (!sm_head_read(from, len, &head) || head.n != n ||
                sm_entry_read(from, len, store, e, why) != SM_OK)
                bad = line;
            else
                json_decref(e->json);
            from += len + 1;
            line++;
            n++;
        }
        sm_entry_store_finish(store);
    }
    free(store);
    free(e);
    return bad;
}

/* The group that begins at w->group and ends before `to` does not verify. */
static void refuse(struct walk *w, int64_t bad_to, const char *to, const char *why)
{
    struct sm_verify *v = w->v;

    if (!v->good)
        return;
    v->good = false;
    v->bad_from = w->from;
    v->bad_to = bad_to > w->from ? bad_to : w->from;
    v->bad_line = find_bad_line(w, w->group, to);
    sm_text_copy(v->why, sizeof v->why, why);
}

/* ---- open ---- */

static void take_previous(struct sm_taking *k, const json_t *o, struct sm_verify *v)
{
    struct sm_fields f;

    if (!sm_fields_begin(&f, k, o, "previous"))
        return;
    v->previous.has = sm_fields_int(&f, "ordinal", 1, INT64_MAX, &v->previous.ordinal);
    sm_fields_text(&f, "stamp", v->previous.stamp, sizeof v->previous.stamp);
}

/* The first line; what cannot be read is left empty, and its group's hash will say so. */
static void read_open(struct sm_verify *v, struct line l)
{
    char why[SM_REASON_SIZE];
    json_t *o = NULL;
    const json_t *previous;
    struct sm_taking k;
    struct sm_fields f;
    struct sm_head head;

    if (!sm_head_read(l.s, l.n, &head) || !sm_head_is(&head, "open") ||
        sm_json_load(l.s, l.n, &o, why) != SM_OK)
        return;
    sm_taking_begin(&k, why);
    if (sm_fields_begin(&f, &k, o, "open")) {
        sm_fields_int(&f, "ordinal", 1, INT64_MAX, &v->ordinal);
        sm_fields_plain(&f, "meter", v->meter, sizeof v->meter);
        sm_fields_plain(&f, "key", v->key, sizeof v->key);
        previous = sm_fields_get(&f, "previous");
        if (previous != NULL)
            take_previous(&k, previous, v);
    }
    json_decref(o);
}

/* ---- stamps ---- */

static bool pass(struct line *l, const char *text)
{
    const size_t n = strlen(text);

    if (l->n < n || memcmp(l->s, text, n) != 0)
        return false;
    l->s += n;
    l->n -= n;
    return true;
}

static bool take_hex(struct line *l, size_t n, char *out)
{
    if (l->n < n)
        return false;
    for (size_t i = 0; i < n; i++)
        if (!((l->s[i] >= '0' && l->s[i] <= '9') || (l->s[i] >= 'a' && l->s[i] <= 'f')))
            return false;
    memcpy(out, l->s, n);
    out[n] = '\0';
    l->s += n;
    l->n -= n;
    return true;
}

/* What follows a stamp's head, in exactly the form that sm_entry_stamp writes. */
static bool read_stamp(struct line l, const struct sm_head *head, struct stamp *ret)
{
    struct stamp s = { 0 };
    size_t digits = 0;

    l = (struct line){ l.s + head->rest, l.n - head->rest };
    if (!pass(&l, ",\"from\":"))
        return false;
    while (digits < l.n && digits < 18 && l.s[digits] >= '0' && l.s[digits] <= '9')
        s.from = 10 * s.from + (l.s[digits++] - '0'); /* a digit more is not what comes next */
    if (digits == 0 || (l.s[0] == '0' && digits > 1))
        return false;
    l = (struct line){ l.s + digits, l.n - digits };
    if (!pass(&l, ",\"hash\":\"") || !take_hex(&l, HASH_N, s.hash) || !pass(&l, "\""))
        return false;
    if (pass(&l, ",\"sig\":\"") && (!take_hex(&l, SIG_N, s.sig) || !pass(&l, "\"")))
        return false;
    if (!pass(&l, "}") || l.n != 0)
        return false;
    *ret = s;
    return true;
}

/* What is wrong with a stamp; NULL: nothing. */
static const char *judge_stamp(struct walk *w, struct line l, const struct sm_head *head,
                               struct stamp *s)
{
    char hash[SM_HASH_HEX];
    const struct sm_verify *v = w->v;

    if (!read_stamp(l, head, s))
        return "its stamp does not have the form of a stamp";
    sm_hasher_add(w->hasher, w->hash_from, (size_t)(l.s - w->hash_from));
    sm_hasher_take(w->hasher, hash);
    if (memcmp(hash, s->hash, HASH_N) != 0)
        return "the hash in its stamp is not that of its entries";
    if (s->from != w->from || head->n != w->from + w->entries)
        return "its stamp is out of number";
    if (w->before.k != NULL &&
        (w->before.when_n != head->when_n || memcmp(w->before.when, head->when, head->when_n) != 0))
        return "its stamp does not have the time of the entry before it";
    if (s->sig[0] != '\0' && w->key[0] == '\0')
        return "its stamp is signed, but the log names no key";
    if (s->sig[0] != '\0' &&
        sm_signature_check(w->key, v->meter, v->ordinal, head->n, s->hash, s->sig) != SM_OK)
        return w->key == v->key ? "the signature in its stamp is not by the log's key"
                                : "the signature in its stamp is not by the key given";
    return NULL;
}

/* In a first group that does not verify the damage may be in the first number of all: then the
 * stamp, where it can be read, says how its entries are numbered. */
static void number_by_stamp(struct walk *w, const struct sm_head *head, const struct stamp *s)
{
    if (w->v->stamps > 0 || s->from == 0 || w->from + w->entries == head->n)
        return;
    if (s->from + w->entries == head->n || s->from < w->from)
        w->from = s->from;
}

static void take_stamp(struct walk *w, struct line l, const struct sm_head *head)
{
    struct sm_verify *v = w->v;
    struct stamp s = { 0 };
    const char *why = v->good ? judge_stamp(w, l, head, &s) : NULL;
    int64_t place;

    if (why != NULL)
        number_by_stamp(w, head, &s);
    place = w->from + w->entries;
    if (why != NULL)
        refuse(w, head->n > place && head->n - place < 1000000 ? head->n : place, l.s, why);
    if (!v->good)
        return;
    v->stamps++;
    v->signed_stamps += s.sig[0] != '\0';
    memcpy(v->last_stamp, s.hash, sizeof v->last_stamp);
    v->last_stamp_n = head->n;
    v->last_n = head->n - 1;
    if (s.sig[0] != '\0')
        v->last_signed_n = head->n;
    v->stamped_bytes = (size_t)(l.s + l.n + 1 - w->text);
    v->closed = w->after_close;
    w->hash_from = l.s;
    w->group = l.s + l.n + 1;
    w->group_line = w->line + 2; /* w->line counts those before this one */
    w->from = head->n + 1;
    w->entries = -1; /* this one does not count */
}

/* ---- the walk ---- */

static void take_line(struct walk *w, struct line l)
{
    struct sm_verify *v = w->v;
    struct sm_head head = { 0 };

    if (sm_head_read(l.s, l.n, &head)) {
        if (head.n > v->last_line_n)
            v->last_line_n = head.n;
        if (w->from == 0) { /* the first line that has a number */
            w->from = head.n - w->entries;
            v->first_n = w->from;
        }
        if (sm_head_is(&head, "stamp"))
            take_stamp(w, l, &head);
    }
    w->after_close = head.k != NULL && sm_head_is(&head, "close");
    w->before = head;
    w->entries++;
    w->line++;
}

/* What no torn end looks like; NULL: it may be one. */
static const char *judge_after(int64_t n, struct line l, bool *closed)
{
    struct sm_head head;
    struct stamp s;

    if (!sm_head_read(l.s, l.n, &head) || sm_json_span(l.s, l.n) != l.n)
        return "a line behind its last stamp is no entry";
    if (head.n != n)
        return "a line behind its last stamp is out of number";
    if (*closed)
        return "something other than a stamp follows its close";
    if (read_stamp(l, &head, &s))
        return "a line behind its last stamp is a stamp by another name";
    *closed = sm_head_is(&head, "close");
    return NULL;
}

static void take_rest(struct walk *w)
{
    struct sm_verify *v = w->v;
    const char *at = w->group, *why = NULL;
    bool closed = v->closed;
    int64_t n = w->from;

    v->after_bytes = (size_t)(w->end - at);
    while (at < w->end) {
        const char *newline = memchr(at, '\n', (size_t)(w->end - at));
        const struct line l = { at, (size_t)((newline != NULL ? newline : w->end) - at) };

        if (newline == NULL) {
            const size_t whole = sm_json_span(l.s, l.n);

            if (why == NULL && whole > 0 && whole < l.n)
                why = "its last line goes on behind a whole entry";
            break;
        }
        if (why == NULL)
            why = judge_after(n, l, &closed);
        v->after_lines++;
        n++;
        at = newline + 1;
    }
    v->closed = v->closed && v->after_bytes == 0;
    if (why != NULL && v->good) {
        v->bad_after = true;
        refuse(w, n, w->end, why);
    }
}

void sm_verify(const char *text, size_t n, const char *key_hex, struct sm_verify *ret_verify)
{
    struct sm_verify *v = ret_verify;
    struct walk w = { .text = text,
                      .end = text + n,
                      .at = text,
                      .hash_from = text,
                      .group = text,
                      .group_line = 1,
                      .v = v };

    memset(v, 0, sizeof *v);
    v->good = true;
    if (n == 0)
        return;
    if (sm_hasher_create(&w.hasher) != SM_OK) {
        v->good = false;
        sm_text_copy(v->why, sizeof v->why, "no memory");
        return;
    }
    w.key = key_hex != NULL ? key_hex : v->key;
    while (w.at < w.end) {
        const char *newline = memchr(w.at, '\n', (size_t)(w.end - w.at));
        const struct line l = { w.at, newline != NULL ? (size_t)(newline - w.at) : 0 };

        if (newline == NULL)
            break;
        if (w.line == 0)
            read_open(v, l);
        take_line(&w, l);
        w.at = newline + 1;
    }
    take_rest(&w);
    sm_hasher_destroy(w.hasher);
}

enum sm_status sm_verify_chain(const struct sm_verify *before, const struct sm_verify *after,
                               char ret_why[SM_REASON_SIZE])
{
    struct sm_text t;

    sm_text_init(&t, ret_why, SM_REASON_SIZE);
    if (strcmp(before->meter, after->meter) != 0 && before->meter[0] != '\0' &&
        after->meter[0] != '\0')
        sm_text_addf(&t, "they are of two meters, %s and %s", before->meter, after->meter);
    else if (after->ordinal == 0 || before->ordinal == 0)
        return SM_OK; /* one of them was torn before it said who it is */
    else if (after->ordinal == before->ordinal)
        sm_text_addf(&t, "ordinal %" PRId64 " is there twice", after->ordinal);
    else if (after->ordinal < before->ordinal)
        sm_text_addf(&t, "ordinal %" PRId64 " follows %" PRId64, after->ordinal, before->ordinal);
    else if (after->ordinal == before->ordinal + 2)
        sm_text_addf(&t, "ordinal %" PRId64 " is missing", before->ordinal + 1);
    else if (after->ordinal > before->ordinal + 2)
        sm_text_addf(&t, "ordinals %" PRId64 " to %" PRId64 " are missing", before->ordinal + 1,
                     after->ordinal - 1);
    else if (!after->good && after->stamps == 0)
        return SM_OK; /* its `open` is damaged, and that is said elsewhere */
    else if (!after->previous.has)
        sm_text_addf(&t, "ordinal %" PRId64 " does not name the file before it", after->ordinal);
    else if (after->previous.ordinal != before->ordinal)
        sm_text_addf(&t, "ordinal %" PRId64 " follows %" PRId64 ", it says", after->ordinal,
                     after->previous.ordinal);
    else if (before->good && strcmp(after->previous.stamp, before->last_stamp) != 0)
        sm_text_addf(&t,
                     "ordinal %" PRId64 " names another last stamp of ordinal %" PRId64
                     " than that file has",
                     after->ordinal, before->ordinal);
    else
        return SM_OK;
    return SM_EVALUE;
}
