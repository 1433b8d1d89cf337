/* SPDX-License-Identifier: GPL-3.0-or-later */
/* checksum.h: sums and CRCs that meters put behind a line. */
#ifndef SM_READING_CHECKSUM_H
#define SM_READING_CHECKSUM_H
#include "reading/profile.h"

/* The sum of bytes[n]; 0 for NONE. Check values over "123456789" (public CRC catalogue):
 * MODBUS 0x4B37, CCITT (IBM-3740) 0x29B1, XMODEM 0x31C3. */
unsigned sm_checksum(enum sm_checksum kind, const char *bytes, size_t n);
/* Hex digits that it takes in a line: 0, 2 or 4; the highest first. */
size_t sm_checksum_digits(enum sm_checksum kind);
const char *sm_checksum_name(enum sm_checksum kind); /* "none", "sum8", "xor8", "crc16-modbus", … */
#endif
