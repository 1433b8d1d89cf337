/* SPDX-License-Identifier: GPL-3.0-or-later */
/* made_up.h: random texts, bytes and numbers for the tests of the log, the same for the same seed
 * (splitmix64, Steele, Lea and Flood 2014). */
#ifndef SM_MADE_UP_H
#define SM_MADE_UP_H
#include <math.h>
#include <stdint.h>
#include <string.h>

struct made_up {
    uint64_t state;
};

static inline uint64_t made_up_next(struct made_up *m)
{
    uint64_t z = m->state += UINT64_C(0x9e3779b97f4a7c15);

    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return z ^ (z >> 31);
}

static inline unsigned made_up_below(struct made_up *m, unsigned n)
{
    return (unsigned)(made_up_next(m) % n);
}

static inline bool made_up_chance(struct made_up *m)
{
    return made_up_next(m) % 2 == 0;
}

/* 0 … INT64_MAX, all sizes alike. */
static inline int64_t made_up_int(struct made_up *m)
{
    return (int64_t)(made_up_next(m) >> (1 + made_up_below(m, 63)));
}

/* Any finite double by its bits; sometimes a whole number, a zero of either sign. */
static inline double made_up_real(struct made_up *m)
{
    uint64_t bits;
    double v;

    switch (made_up_below(m, 6)) {
    case 0:
        return (double)made_up_below(m, 1000);
    case 1:
        return made_up_chance(m) ? 0.0 : -0.0;
    case 2:
        return (double)((int64_t)made_up_next(m) >> 20) / 1000;
    default:
        do {
            bits = made_up_next(m);
            memcpy(&v, &bits, sizeof v);
        } while (!isfinite(v));
        return v;
    }
}

/* UTF-8 of random length into out[cap]: letters, quotes, and (plain = false) controls and
 * overrides. */
static inline void made_up_text(struct made_up *m, char *out, size_t cap, bool plain)
{
    static const char *const parts[] = {
        "a",  "Z",  "7", " ",  "-",  "\xc3\xa4", "\xc2\xb5", "\xe2\x82\xac", "\xf0\x9f\xa7\xaa",
        "\"", "\\", "/", "\n", "\t", "\x01",     "\x7f",     "\xc2\x85",     "\xe2\x80\xae"
    };
    const unsigned kinds = plain ? 12 : sizeof parts / sizeof parts[0];
    const size_t want = made_up_below(m, 4) == 0 ? cap : made_up_below(m, (unsigned)cap);
    size_t len = 0;

    memset(out, 0, cap);
    for (;;) {
        const char *part = parts[made_up_below(m, kinds)];
        const size_t n = strlen(part);

        if (len + n >= want || len + n >= cap)
            break;
        memcpy(out + len, part, n);
        len += n;
    }
}

/* Printable ASCII, 1 to cap - 1 characters. */
static inline void made_up_id(struct made_up *m, char *out, size_t cap)
{
    const size_t n = 1 + made_up_below(m, (unsigned)cap - 1);

    memset(out, 0, cap);
    for (size_t i = 0; i < n; i++)
        out[i] = (char)(' ' + made_up_below(m, 95));
}
#endif
