/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_fit.c: the two forms of a fit, where the numbers or the headings are extreme. Their everyday
 * content is tested with the command, in tests/daemon/test_stillmark_fit.c. */
#include "view/fit.h"

#include <math.h>
#include <string.h>

#include <gsl/gsl_errno.h>
#include <jansson.h>

#include "check.h"

#define LONG_NUMBER (-1.2345678901234567e-300)
#define N 5

/* A view over points p with readings that are as long as numbers get. */
static struct sm_fit_view view_of(const struct sm_point *p, const struct sm_curve *c,
                                  const struct sm_linearity *l)
{
    static struct sm_fit_reading r[N];

    for (size_t i = 0; i < N; i++)
        r[i] = (struct sm_fit_reading){
            LONG_NUMBER, 4000000000U, true, { LONG_NUMBER, -LONG_NUMBER, -LONG_NUMBER, false }
        };
    return (struct sm_fit_view){ "", "", c, l, p, N, r, N };
}

static void long_numbers_fit_into_the_size_that_is_told(void **state)
{
    static char buf[1 << 15];
    struct sm_point p[N];
    struct sm_curve c;
    struct sm_linearity l;
    struct sm_text t;
    json_error_t e;

    (void)state;
    for (size_t i = 0; i < N; i++)
        p[i] =
            (struct sm_point){ (double)i / 3 - 1e-7, -1.234567890123456e-101 * sin((double)i), 20 };
    assert_int_equal(sm_curve_fit(SM_MODEL_NERNST, p, N, 7, &c), SM_OK);
    sm_curve_linearity(SM_MODEL_NERNST, p, N, 7, &l);
    struct sm_fit_view v = view_of(p, &c, &l);
    char name[SM_NAME_SIZE];
    memset(name, '\x1b', sizeof name - 1); /* grows fourfold when made safe */
    name[sizeof name - 1] = '\0';
    v.x_name = v.y_name = name;
    assert_true(sm_fit_view_size(&v) <= sizeof buf);
    sm_text_init(&t, buf, sm_fit_view_size(&v));
    sm_fit_view_json(&v, &t);
    assert_false(t.cut);
    json_t *j = json_loads(buf, JSON_REJECT_DUPLICATES, &e);
    if (j == NULL)
        fail_msg("%s at %d: %s", e.text, e.position, buf);
    json_t *reading = json_array_get(json_object_get(j, "readings"), N - 1);
    check_close("x comes back", json_number_value(json_object_get(reading, "x")), LONG_NUMBER, 0);
    json_decref(j);
    sm_text_init(&t, buf, sm_fit_view_size(&v));
    sm_fit_view_text(&v, &t);
    assert_false(t.cut);
    assert_null(strchr(buf, '\x1b'));
}

static void what_is_not_known_is_left_out(void **state)
{
    static char buf[1 << 15];
    struct sm_point p[N];
    struct sm_curve c;
    struct sm_linearity l;
    struct sm_text t;

    (void)state;
    for (size_t i = 0; i < N; i++)
        p[i] =
            (struct sm_point){ (double)i, 0.3, 20 }; /* flat: no R squared, no x, no zero point */
    assert_int_equal(sm_curve_fit(SM_MODEL_NERNST, p, N, 7, &c), SM_OK);
    sm_curve_linearity(SM_MODEL_NERNST, p, N, 7, &l);
    struct sm_fit_view v = view_of(p, &c, &l);
    v.n_readings = 0;
    sm_text_init(&t, buf, sizeof buf);
    sm_fit_view_json(&v, &t);
    static const char *const gone[] = { "r_squared",     "linearity", "back_calculated",
                                        "zero_point_ph", "nan",       "inf",
                                        "null" };
    for (size_t i = 0; i < COUNT(gone); i++)
        if (strstr(buf, gone[i]) != NULL)
            fail_msg("%s is in %s", gone[i], buf);
    assert_non_null(strstr(buf, "\"slope_percent\":0,"));
    sm_text_init(&t, buf, sizeof buf);
    sm_fit_view_text(&v, &t);
    assert_non_null(strstr(buf, "none: all y are alike"));
    assert_null(strstr(buf, "nan"));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(long_numbers_fit_into_the_size_that_is_told),
        cmocka_unit_test(what_is_not_known_is_left_out),
    };
    gsl_set_error_handler_off();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
