/* SPDX-License-Identifier: GPL-3.0-or-later */
/* prng.c: see prng.h. */
#include "sim/prng.h"

#include <math.h>

static uint64_t splitmix(uint64_t *x)
{
    *x += UINT64_C(0x9e3779b97f4a7c15);
    uint64_t z = *x;
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return z ^ (z >> 31);
}

void sm_sim_prng_init(struct sm_sim_prng *p, uint64_t seed, uint64_t stream)
{
    uint64_t x = seed;
    const uint64_t a = splitmix(&x);
    x = a ^ stream; /* streams of one seed start far apart */
    *p = (struct sm_sim_prng){ { 0 }, false, 0.0 };
    for (int i = 0; i < 4; i++)
        p->s[i] = splitmix(&x);
}

static uint64_t rotate(uint64_t x, int k)
{
    return (x << k) | (x >> (64 - k));
}

uint64_t sm_sim_prng_next(struct sm_sim_prng *p)
{
    const uint64_t out = rotate(p->s[1] * 5, 7) * 9;
    const uint64_t shifted = p->s[1] << 17;

    p->s[2] ^= p->s[0];
    p->s[3] ^= p->s[1];
    p->s[1] ^= p->s[2];
    p->s[0] ^= p->s[3];
    p->s[2] ^= shifted;
    p->s[3] = rotate(p->s[3], 45);
    return out;
}

double sm_sim_prng_uniform(struct sm_sim_prng *p)
{
    return (double)(sm_sim_prng_next(p) >> 11) * 0x1p-53;
}

double sm_sim_prng_between(struct sm_sim_prng *p, double from, double to)
{
    return from + (to - from) * sm_sim_prng_uniform(p);
}

double sm_sim_prng_log_between(struct sm_sim_prng *p, double from, double to)
{
    return from * exp(log(to / from) * sm_sim_prng_uniform(p));
}

double sm_sim_prng_normal(struct sm_sim_prng *p)
{
    double u, v, q;

    if (p->has_spare) {
        p->has_spare = false;
        return p->spare;
    }
    do {
        u = 2 * sm_sim_prng_uniform(p) - 1;
        v = 2 * sm_sim_prng_uniform(p) - 1;
        q = u * u + v * v;
    } while (q >= 1 || q == 0);
    const double stretch = sqrt(-2 * log(q) / q);
    p->spare = v * stretch;
    p->has_spare = true;
    return u * stretch;
}

bool sm_sim_prng_chance(struct sm_sim_prng *p, double probability)
{
    return sm_sim_prng_uniform(p) < probability;
}

unsigned sm_sim_prng_below(struct sm_sim_prng *p, unsigned n)
{
    return (unsigned)(sm_sim_prng_uniform(p) * (double)n);
}
