/* SPDX-License-Identifier: GPL-3.0-or-later */
/* prng.h: random numbers that are the same for the same seed, whatever the compiler.
 * xoshiro256** seeded by splitmix64 (Blackman and Vigna, "Scrambled linear pseudorandom number
 * generators", 2018); normal deviates by the polar method (Marsaglia and Bray, 1964). */
#ifndef SM_SIM_PRNG_H
#define SM_SIM_PRNG_H
#include <stdbool.h>
#include <stdint.h>

struct sm_sim_prng {
    uint64_t s[4];
    bool has_spare;
    double spare; /* the polar method makes two at a time */
};

/* stream: independent sequences of one seed (noise, air, jitter …), so that one does not move when
 * more is drawn from another. */
void sm_sim_prng_init(struct sm_sim_prng *p, uint64_t seed, uint64_t stream);
uint64_t sm_sim_prng_next(struct sm_sim_prng *p);
double sm_sim_prng_uniform(struct sm_sim_prng *p);                         /* [0, 1) */
double sm_sim_prng_between(struct sm_sim_prng *p, double from, double to); /* uniform */
double sm_sim_prng_log_between(struct sm_sim_prng *p, double from,
                               double to);        /* log-uniform, from > 0 */
double sm_sim_prng_normal(struct sm_sim_prng *p); /* mean 0, sd 1 */
bool sm_sim_prng_chance(struct sm_sim_prng *p, double probability);
unsigned sm_sim_prng_below(struct sm_sim_prng *p, unsigned n); /* 0 … n-1 */
#endif
