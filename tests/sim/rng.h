/* rng.h - the simulator's own random numbers: the same on every machine.
 *
 * xoshiro256** seeded through splitmix64 (Blackman & Vigna, ACM TOMS 47 (2021) 36), normal deviates
 * by Box & Muller (Ann. Math. Stat. 29 (1958) 610-611).
 */
#ifndef LOPSIDE_SIM_RNG_H
#define LOPSIDE_SIM_RNG_H

#include <stdint.h>

struct rng {
    uint64_t state[4];
    double spare; /* the second deviate of a pair */
    int has_spare;
};

void rng_init(struct rng *rng, uint64_t seed);
double rng_uniform(struct rng *rng); /* [0, 1) */
double rng_normal(struct rng *rng);  /* mean 0, standard deviation 1 */

#endif
