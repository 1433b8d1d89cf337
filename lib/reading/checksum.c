/* SPDX-License-Identifier: GPL-3.0-or-later */
/* checksum.c: sums and CRCs, bit by bit: a line has at most a thousand bytes. */
#include "reading/checksum.h"

static unsigned sum8(const unsigned char *b, size_t n)
{
    unsigned sum = 0;

    for (size_t i = 0; i < n; i++)
        sum += b[i];
    return sum & 0xff;
}

static unsigned xor8(const unsigned char *b, size_t n)
{
    unsigned x = 0;

    for (size_t i = 0; i < n; i++)
        x ^= b[i];
    return x;
}

/* Lowest bit first; 0xA001 is 0x8005 with its bits reversed. */
static unsigned crc16_modbus(const unsigned char *b, size_t n)
{
    unsigned crc = 0xffff;

    for (size_t i = 0; i < n; i++) {
        crc ^= b[i];
        for (int bit = 0; bit < 8; bit++)
            crc = (crc & 1) != 0 ? crc >> 1 ^ 0xa001 : crc >> 1;
    }
    return crc;
}

/* Polynomial 0x1021, highest bit first. */
static unsigned crc16_1021(const unsigned char *b, size_t n, unsigned crc)
{
    for (size_t i = 0; i < n; i++) {
        crc ^= (unsigned)b[i] << 8;
        for (int bit = 0; bit < 8; bit++)
            crc = ((crc & 0x8000) != 0 ? crc << 1 ^ 0x1021 : crc << 1) & 0xffff;
    }
    return crc;
}

unsigned sm_checksum(enum sm_checksum kind, const char *bytes, size_t n)
{
    const unsigned char *b = (const unsigned char *)bytes;

    switch (kind) {
    case SM_CHECKSUM_NONE:
        break;
    case SM_CHECKSUM_SUM8:
        return sum8(b, n);
    case SM_CHECKSUM_XOR8:
        return xor8(b, n);
    case SM_CHECKSUM_CRC16_MODBUS:
        return crc16_modbus(b, n);
    case SM_CHECKSUM_CRC16_CCITT:
        return crc16_1021(b, n, 0xffff);
    case SM_CHECKSUM_CRC16_XMODEM:
        return crc16_1021(b, n, 0);
    }
    return 0;
}

size_t sm_checksum_digits(enum sm_checksum kind)
{
    if (kind == SM_CHECKSUM_NONE)
        return 0;
    return kind == SM_CHECKSUM_SUM8 || kind == SM_CHECKSUM_XOR8 ? 2 : 4;
}

const char *sm_checksum_name(enum sm_checksum kind)
{
    static const char *const name[] = { "none",         "sum8",        "xor8",
                                        "crc16-modbus", "crc16-ccitt", "crc16-xmodem" };

    return (size_t)kind < sizeof name / sizeof *name ? name[kind] : "?";
}
