/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_profile.c: channels by name, and names of kinds that setup files and logs use. */
#include "check.h"

#include "reading/checksum.h"
#include "reading/frame.h"
#include "shapes.h"

static void channels_are_found_by_their_whole_name(void **state)
{
    struct sm_profile p;
    (void)state;
    shape(&p, 0);
    assert_int_equal(sm_profile_channel(&p, "potential"), 0);
    assert_int_equal(sm_profile_channel(&p, "probe"), 1);
    assert_int_equal(sm_profile_channel(&p, "prob"), -1);
    assert_int_equal(sm_profile_channel(&p, ""), -1);
}

static void names_of_kinds(void **state)
{
    (void)state;
    assert_string_equal(sm_flag_name(SM_FLAG_OK), "ok");
    assert_string_equal(sm_flag_name(SM_FLAG_UNUSABLE), "unusable");
    assert_string_equal(sm_eol_name(SM_EOL_AUTO), "auto");
    assert_string_equal(sm_eol_name(SM_EOL_TEXT), "text");
    assert_string_equal(sm_line_kind_name(SM_LINE_WHOLE), "whole");
    assert_string_equal(sm_line_kind_name(SM_LINE_CUT), "cut");
    assert_string_equal(sm_checksum_name(SM_CHECKSUM_XOR8), "xor8");
    assert_string_equal(sm_checksum_name(SM_CHECKSUM_CRC16_XMODEM), "crc16-xmodem");
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(channels_are_found_by_their_whole_name),
                                        cmocka_unit_test(names_of_kinds) };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
