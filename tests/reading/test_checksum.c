/* SPDX-License-Identifier: GPL-3.0-or-later */
/* test_checksum.c: sums and CRCs against published check values. */
#include "check.h"

#include "reading/checksum.h"

/* CRCs: check values over the nine ASCII digits, CRC RevEng "Catalogue of parametrised CRC
 * algorithms" (CRC-16/MODBUS 4B37, CRC-16/IBM-3740 29B1, CRC-16/XMODEM 31C3). Sum and exclusive or
 * of 31..39 hex are done by hand: 9 × 0x35 = 0x1DD; 1^2^…^9 = 1 and the nine 0x30 leave 0x30. */
static void check_values_over_123456789(void **state)
{
    static const struct {
        enum sm_checksum kind;
        unsigned want;
    } cases[] = { { SM_CHECKSUM_NONE, 0 },
                  { SM_CHECKSUM_SUM8, 0xdd },
                  { SM_CHECKSUM_XOR8, 0x31 },
                  { SM_CHECKSUM_CRC16_MODBUS, 0x4b37 },
                  { SM_CHECKSUM_CRC16_CCITT, 0x29b1 },
                  { SM_CHECKSUM_CRC16_XMODEM, 0x31c3 } };
    (void)state;
    for (size_t i = 0; i < COUNT(cases); i++) {
        const unsigned got = sm_checksum(cases[i].kind, "123456789", 9);

        if (got != cases[i].want)
            fail_msg("%s: got %X, want %X", sm_checksum_name(cases[i].kind), got, cases[i].want);
    }
}

/* Bytes over 7F are bytes, not negative numbers. The CRC of FF FF from init FFFF: each leaves the
 * register's other half as it was, so 0x0000 (Modbus form), worked out by hand. */
static void bytes_with_the_top_bit_set(void **state)
{
    (void)state;
    assert_int_equal(sm_checksum(SM_CHECKSUM_SUM8, "\xff\xfe", 2), 0xfd);
    assert_int_equal(sm_checksum(SM_CHECKSUM_XOR8, "\xff\x0f", 2), 0xf0);
    assert_int_equal(sm_checksum(SM_CHECKSUM_CRC16_MODBUS, "\xff\xff", 2), 0);
    assert_int_equal(sm_checksum(SM_CHECKSUM_CRC16_CCITT, "\xff\xff", 2), 0);
}

static void nothing_has_the_initial_value(void **state)
{
    (void)state;
    assert_int_equal(sm_checksum(SM_CHECKSUM_SUM8, "", 0), 0);
    assert_int_equal(sm_checksum(SM_CHECKSUM_CRC16_MODBUS, "", 0), 0xffff);
    assert_int_equal(sm_checksum(SM_CHECKSUM_CRC16_CCITT, "", 0), 0xffff);
    assert_int_equal(sm_checksum(SM_CHECKSUM_CRC16_XMODEM, "", 0), 0);
}

static void digits_that_each_takes(void **state)
{
    (void)state;
    assert_int_equal(sm_checksum_digits(SM_CHECKSUM_NONE), 0);
    assert_int_equal(sm_checksum_digits(SM_CHECKSUM_SUM8), 2);
    assert_int_equal(sm_checksum_digits(SM_CHECKSUM_XOR8), 2);
    assert_int_equal(sm_checksum_digits(SM_CHECKSUM_CRC16_MODBUS), 4);
    assert_int_equal(sm_checksum_digits(SM_CHECKSUM_CRC16_XMODEM), 4);
}

int main(void)
{
    const struct CMUnitTest tests[] = { cmocka_unit_test(check_values_over_123456789),
                                        cmocka_unit_test(bytes_with_the_top_bit_set),
                                        cmocka_unit_test(nothing_has_the_initial_value),
                                        cmocka_unit_test(digits_that_each_takes) };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
