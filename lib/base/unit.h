/* SPDX-License-Identifier: GPL-3.0-or-later */
/* unit.h: units as written in setup files, logs and tables, and values with a unit. */
#ifndef SM_BASE_UNIT_H
#define SM_BASE_UNIT_H
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

enum sm_unit {
    SM_UNIT_NONE, /* a plain number */
    SM_UNIT_MV,
    SM_UNIT_V,
    SM_UNIT_PH,
    SM_UNIT_CELSIUS,
    SM_UNIT_A, /* absorbance */
    SM_UNIT_US_CM,
    SM_UNIT_MS_CM,
    SM_UNIT_MG_L,
    SM_UNIT_UG_L,
    SM_UNIT_PERCENT,
    SM_UNIT_MS,
    SM_UNIT_S,
    SM_UNIT_MIN,
    SM_UNIT_H,
    SM_UNIT_D,
    SM_UNIT_MV_MIN,
    SM_UNIT_PH_MIN,
    SM_UNIT_PERCENT_MIN,
    SM_UNIT_US_CM_MIN,
    SM_UNIT_A_MIN,
    SM_UNIT_COUNT
};

struct sm_quantity {
    double value;
    enum sm_unit unit;
};

/* "mV", "pH", "°C", "µS/cm", …; "" for SM_UNIT_NONE. Never NULL. */
const char *sm_unit_name(enum sm_unit u);

/* Case matters. Also understood: "uS/cm", "ug/L" for the µ (either code point of µ), "C" is NOT
 * °C, "" is SM_UNIT_NONE.
 *   SM_EUNKNOWN  no such unit */
SM_MUST_CHECK enum sm_status sm_unit_parse(const char *s, size_t n, enum sm_unit *ret_unit);

/* "0.6 mV", "98 %", "15 s", "7": number, blanks, unit. A number alone has SM_UNIT_NONE.
 *   SM_ESYNTAX   no number at the head, or one longer than 63 bytes
 *   SM_EVALUE    a number too large for a double
 *   SM_EUNKNOWN  a unit that is none of ours */
SM_MUST_CHECK enum sm_status sm_quantity_parse(const char *s, size_t n, struct sm_quantity *ret_q);

/* A time (ms, s, min, h, d) in ns.
 *   SM_EINVAL  not a unit of time
 *   SM_EVALUE  negative, or over 100 years */
SM_MUST_CHECK enum sm_status sm_quantity_ns(struct sm_quantity q, int64_t *ret_ns);

/* Between like units (V to mV, mS/cm to µS/cm, µg/L to mg/L, min to s): by a whole factor, rounded
 * once.
 *   SM_EINVAL  they do not measure the same thing */
SM_MUST_CHECK enum sm_status sm_quantity_in(struct sm_quantity q, enum sm_unit want,
                                            double *ret_value);
#endif
