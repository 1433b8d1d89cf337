/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_replay.c: when two entries say the same. */
#include "check.h"

#include <string.h>

#include "record/arithmetic.h"
#include "record/replay.h"

#define HEAD "{\"n\":7,\"t\":5,\"utc\":\"2026-12-01T08:41:09.600000Z\",\"k\":"

/* want: "" agree; else the reason. */
static void expect(enum sm_compare how, const char *a, const char *b, const char *want)
{
    char why[SM_REASON_SIZE] = "";
    const bool same = sm_replay_agree(how, a, strlen(a), b, strlen(b), why);

    if (same != (want[0] == '\0') || (!same && strcmp(why, want) != 0))
        fail_msg("%s\n%s\nagree %d: \"%s\", want \"%s\"", a, b, same, why, want);
}

static void the_same_bytes_agree_and_the_first_key_that_differs_is_named(void **state)
{
    const enum sm_compare how = SM_COMPARE_BYTES;

    (void)state;
    expect(how, HEAD "\"capture\",\"value\":-58.31}\n", HEAD "\"capture\",\"value\":-58.31}", "");
    expect(how, HEAD "\"capture\",\"value\":-58.31}",
           HEAD "\"capture\",\"value\":-58.310000000001}",
           "value: logged -58.31, again -58.310000000001");
    expect(how, HEAD "\"capture\",\"value\":1}", HEAD "\"capture\",\"value\":1.0}",
           "value: logged 1, again 1.0");
    expect(how, HEAD "\"moved\"}", HEAD "\"transit\"}", "k: logged \"moved\", again \"transit\"");
    expect(how, HEAD "\"curve\",\"fit\":{\"coefficients\":[{\"value\":1.5},{\"value\":2.5}]}}",
           HEAD "\"curve\",\"fit\":{\"coefficients\":[{\"value\":1.5},{\"value\":2.75}]}}",
           "fit.coefficients[1].value: logged 2.5, again 2.75");
    expect(how, HEAD "\"result\",\"value\":1}", HEAD "\"result\"}",
           "value: logged 1, again nothing");
    expect(how, HEAD "\"result\"}", HEAD "\"result\",\"value\":1}",
           "value: logged nothing, again 1");
    expect(how, HEAD "\"result\",\"why\":\"\\u0041\"}", HEAD "\"result\",\"why\":\"A\"}",
           "byte 70: logged \\u0041\"}, again A\"}");
}

static void derived_reals_agree_within_a_billionth_and_nothing_else_does(void **state)
{
    const enum sm_compare how = SM_COMPARE_TOLERANCE;

    (void)state;
    expect(how, HEAD "\"capture\",\"value\":-58.31}", HEAD "\"capture\",\"value\":-58.31000005}",
           "");
    expect(how, HEAD "\"capture\",\"value\":-58.31}", HEAD "\"capture\",\"value\":-58.31000007}",
           "value: logged -58.31, again -58.31000007");
    expect(how, HEAD "\"capture\",\"value\":7}", HEAD "\"capture\",\"value\":7.000000001}", "");
    expect(how, HEAD "\"capture\",\"readings\":63}", HEAD "\"capture\",\"readings\":64}",
           "readings: logged 63, again 64");
    expect(how, HEAD "\"capture\",\"window\":[1683000000000,1746731204511]}",
           HEAD "\"capture\",\"window\":[1683000000000,1746731204512]}",
           "window[1]: logged 1746731204511, again 1746731204512");
    expect(how, HEAD "\"check\",\"pass\":true}", HEAD "\"check\",\"pass\":false}",
           "pass: logged true, again false");
    expect(how, HEAD "\"capture\",\"name\":\"final\"}", HEAD "\"capture\",\"name\":\"finis\"}",
           "name: logged \"final\", again \"finis\"");
    expect(how, HEAD "\"capture\",\"a\":1,\"b\":2}", HEAD "\"capture\",\"b\":2,\"a\":1}",
           "a: in another place among the keys");
    expect(how, HEAD "\"hold\",\"results\":[1,2]}", HEAD "\"hold\",\"results\":[1]}",
           "results: logged a list of 2, again a list of 1");
    expect(how, HEAD "\"capture\",\"value\":1.5}", HEAD "\"capture\",\"value\":\"1.5\"}",
           "value: logged 1.5, again \"1.5\"");
}

static void a_residual_is_as_good_as_what_it_is_the_difference_of(void **state)
{
    const char *a = HEAD "\"curve\",\"points\":[{\"x\":4.01,\"y\":170.25,\"residual\":1.5e-8}]}";
    const char *b = HEAD "\"curve\",\"points\":[{\"x\":4.01,\"y\":170.25,\"residual\":4.5e-8}]}";
    const char *c = HEAD "\"curve\",\"points\":[{\"x\":4.01,\"y\":170.25,\"residual\":4.5e-7}]}";

    (void)state;
    expect(SM_COMPARE_TOLERANCE, a, b, "");
    expect(SM_COMPARE_TOLERANCE, a, c, "points[0].residual: logged 1.5e-08, again 4.5e-07");
    expect(SM_COMPARE_BYTES, a, b, "points[0].residual: logged 1.5e-08, again 4.5e-08");
}

static void arithmetic_is_one_hash_however_often_it_is_asked_for(void **state)
{
    char a[17], b[17];

    (void)state;
    sm_arithmetic(a);
    sm_arithmetic(b);
    assert_int_equal(strspn(a, "0123456789abcdef"), 16);
    assert_string_equal(a, b);
    assert_string_not_equal(a, "0000000000000000");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(the_same_bytes_agree_and_the_first_key_that_differs_is_named),
        cmocka_unit_test(derived_reals_agree_within_a_billionth_and_nothing_else_does),
        cmocka_unit_test(a_residual_is_as_good_as_what_it_is_the_difference_of),
        cmocka_unit_test(arithmetic_is_one_hash_however_often_it_is_asked_for),
    };

    return cmocka_run_group_tests(tests, NULL, NULL);
}
