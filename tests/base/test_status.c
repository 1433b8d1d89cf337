/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tests of base/status: each status has words of its own. */
#include "check.h"

#include <string.h>

#include "base/status.h"

static const enum sm_status all[] = { SM_OK,     SM_EINVAL, SM_EVALUE,  SM_EORDER,
                                      SM_ESHORT, SM_EFULL,  SM_ESYNTAX, SM_EBUSY,
                                      SM_ENOMEM, SM_EIO,    SM_EUNKNOWN };

static void every_status_has_words_of_its_own(void **state)
{
    (void)state;
    for (size_t i = 0; i < COUNT(all); i++) {
        const char *text = sm_status_text(all[i]);
        if (text == NULL || *text == '\0')
            fail_msg("status %d: no words", all[i]);
        for (size_t j = 0; j < i; j++)
            if (strcmp(text, sm_status_text(all[j])) == 0)
                fail_msg("status %d and %d both read \"%s\"", all[i], all[j], text);
    }
}

static void a_number_that_is_no_status_is_called_so(void **state)
{
    (void)state;
    assert_string_equal(sm_status_text((enum sm_status) - 99), "unknown status");
    assert_string_equal(sm_status_text((enum sm_status)1), "unknown status");
}

static void success_is_zero_and_every_failure_is_negative(void **state)
{
    (void)state;
    assert_int_equal(SM_OK, 0);
    for (size_t i = 1; i < COUNT(all); i++)
        if (all[i] >= 0)
            fail_msg("status %d \"%s\" is not negative", all[i], sm_status_text(all[i]));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_status_has_words_of_its_own),
        cmocka_unit_test(a_number_that_is_no_status_is_called_so),
        cmocka_unit_test(success_is_zero_and_every_failure_is_negative),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
