/* SPDX-License-Identifier: GPL-3.0-or-later */
/* replay.c: two entries side by side, key by key in their order. */
#include "record/replay.h"

#include <math.h>
#include <string.h>

#include "base/number.h"
#include "record/load.h"

#define RELATIVE 1e-9
#define SHOWN 60 /* bytes of a text in the reason */

/* Where the comparison is, and the reason it will leave. */
struct place {
    enum sm_compare how;
    struct sm_text path; /* "fit.coefficients[1].value" */
    char *why;
};

/* A value in a few words. */
static void show(struct sm_text *t, const json_t *v)
{
    char digits[SM_NUMBER_SIZE];

    if (v == NULL) {
        sm_text_add(t, "nothing");
    } else if (json_is_integer(v)) {
        sm_text_addf(t, "%lld", (long long)json_integer_value(v));
    } else if (json_is_real(v)) {
        const size_t n = sm_number_write(digits, json_real_value(v));

        sm_text_addn(t, digits, n);
        if (strspn(digits, "-0123456789") == n) /* a real that looks like a whole number */
            sm_text_add(t, ".0");
    } else if (json_is_string(v)) {
        const size_t n = json_string_length(v);
        size_t at = 0, len;

        while (at < n && (len = sm_utf8_next(json_string_value(v) + at, n - at, NULL)) > 0 &&
               at + len <= SHOWN)
            at += len;
        sm_text_add(t, "\"");
        sm_text_add_safe(t, json_string_value(v), at);
        sm_text_add(t, at < n ? "…\"" : "\"");
    } else if (json_is_boolean(v)) {
        sm_text_add(t, json_is_true(v) ? "true" : "false");
    } else if (json_is_array(v)) {
        sm_text_addf(t, "a list of %zu", json_array_size(v));
    } else {
        sm_text_add(t, json_is_object(v) ? "an object" : "null");
    }
}

static bool differ(struct place *p, const json_t *logged, const json_t *again)
{
    struct sm_text t;

    sm_text_init(&t, p->why, SM_REASON_SIZE);
    sm_text_add_safe(&t, p->path.buf, p->path.len);
    sm_text_add(&t, ": logged ");
    show(&t, logged);
    sm_text_add(&t, ", again ");
    show(&t, again);
    return false;
}

/* A difference is known as well as what it is the difference of: the largest real beside it. */
static bool is_difference(const char *key)
{
    return strcmp(key, "residual") == 0 || strcmp(key, "difference") == 0;
}

static double largest_real(const json_t *o)
{
    void *it = json_object_iter((json_t *)(uintptr_t)o); /* iterating changes nothing */
    double most = 0;

    for (; it != NULL; it = json_object_iter_next((json_t *)(uintptr_t)o, it))
        if (json_is_real(json_object_iter_value(it)))
            most = fmax(most, fabs(json_real_value(json_object_iter_value(it))));
    return most;
}

/* Two whole numbers are equal or not; a derived real may be whole by chance on one side. */
static bool numbers_agree(enum sm_compare how, const json_t *a, const json_t *b, double scale)
{
    double x, y;

    if (how == SM_COMPARE_BYTES && json_typeof(a) != json_typeof(b))
        return false;
    if (json_is_integer(a) && json_is_integer(b))
        return json_integer_value(a) == json_integer_value(b);
    x = json_number_value(a);
    y = json_number_value(b);
    if (how == SM_COMPARE_BYTES)
        return x == y;
    return fabs(x - y) <= RELATIVE * fmax(scale, fmax(fabs(x), fabs(y)));
}

static bool agree(struct place *p, const json_t *a, const json_t *b, double scale);

static bool lists_agree(struct place *p, const json_t *a, const json_t *b)
{
    const size_t len = p->path.len;
    bool same = json_array_size(a) == json_array_size(b);

    if (!same)
        return differ(p, a, b);
    for (size_t i = 0; i < json_array_size(a) && same; i++) {
        sm_text_addf(&p->path, "[%zu]", i);
        same = agree(p, json_array_get(a, i), json_array_get(b, i), 0);
        p->path.len = len;
        p->path.buf[len] = '\0';
        p->path.cut = false;
    }
    return same;
}

/* A key that one side has here and the other has not. */
static bool misplaced(struct place *p, const json_t *logged, const json_t *again)
{
    struct sm_text t;

    if (logged == NULL || again == NULL)
        return differ(p, logged, again);
    sm_text_init(&t, p->why, SM_REASON_SIZE);
    sm_text_add_safe(&t, p->path.buf, p->path.len);
    sm_text_add(&t, ": in another place among the keys");
    return false;
}

static bool objects_agree(struct place *p, const json_t *a, const json_t *b)
{
    json_t *ja = (json_t *)(uintptr_t)a, *jb = (json_t *)(uintptr_t)b;
    void *ia = json_object_iter(ja), *ib = json_object_iter(jb);
    const size_t len = p->path.len;
    bool same = true;

    while (same && (ia != NULL || ib != NULL)) {
        const char *key = json_object_iter_key(ia != NULL ? ia : ib);
        json_t *va = ia != NULL ? json_object_iter_value(ia) : NULL;
        json_t *vb = ib != NULL ? json_object_iter_value(ib) : NULL;

        sm_text_addf(&p->path, "%s%s", len > 0 ? "." : "", key);
        if (ia == NULL || ib == NULL || strcmp(key, json_object_iter_key(ib)) != 0)
            same = misplaced(p, va, ia != NULL ? json_object_get(jb, key) : vb);
        else
            same = agree(p, va, vb, is_difference(key) ? largest_real(a) : 0);
        p->path.len = len;
        p->path.buf[len] = '\0';
        p->path.cut = false;
        ia = ia != NULL ? json_object_iter_next(ja, ia) : NULL;
        ib = ib != NULL ? json_object_iter_next(jb, ib) : NULL;
    }
    return same;
}

static bool agree(struct place *p, const json_t *a, const json_t *b, double scale)
{
    if (json_is_number(a) && json_is_number(b))
        return numbers_agree(p->how, a, b, scale) || differ(p, a, b);
    if (json_typeof(a) != json_typeof(b))
        return differ(p, a, b);
    if (json_is_object(a))
        return objects_agree(p, a, b);
    if (json_is_array(a))
        return lists_agree(p, a, b);
    return json_equal(a, b) || differ(p, a, b);
}

/* The newline at the end plays no part. */
static size_t without_newline(const char *s, size_t n)
{
    return n > 0 && s[n - 1] == '\n' ? n - 1 : n;
}

/* The same words may still be other bytes: say where. */
static bool differ_in_bytes(const char *a, size_t na, const char *b, size_t nb, char *why)
{
    struct sm_text t;
    size_t at = 0;

    while (at < na && at < nb && a[at] == b[at])
        at++;
    sm_text_init(&t, why, SM_REASON_SIZE);
    sm_text_addf(&t, "byte %zu: logged ", at + 1);
    sm_text_add_safe(&t, a + at, na - at < 20 ? na - at : 20);
    sm_text_add(&t, ", again ");
    sm_text_add_safe(&t, b + at, nb - at < 20 ? nb - at : 20);
    return false;
}

bool sm_replay_agree(enum sm_compare how, const char *logged, size_t n_logged, const char *again,
                     size_t n_again, char ret_why[SM_REASON_SIZE])
{
    const size_t na = without_newline(logged, n_logged), nb = without_newline(again, n_again);
    char path[256];
    struct place p = { .how = how, .why = ret_why };
    json_t *a = NULL, *b = NULL;
    bool same;

    if (na == nb && memcmp(logged, again, na) == 0)
        return true;
    if (sm_json_load(logged, na, &a, ret_why) != SM_OK)
        return false;
    if (sm_json_load(again, nb, &b, ret_why) != SM_OK) {
        json_decref(a);
        return false;
    }
    sm_text_init(&p.path, path, sizeof path);
    same = agree(&p, a, b, 0);
    json_decref(a);
    json_decref(b);
    if (same && how == SM_COMPARE_BYTES)
        same = differ_in_bytes(logged, na, again, nb, ret_why);
    return same;
}
