/* rng.c - xoshiro256**, splitmix64, Box-Muller. */
#include "rng.h"

#include <math.h>

static const double TWO_PI = 6.28318530717958647692;

static uint64_t splitmix(uint64_t *x)
{
    uint64_t z = (*x += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

static uint64_t rotate(uint64_t x, int k)
{
    return (x << k) | (x >> (64 - k));
}

void rng_init(struct rng *rng, uint64_t seed)
{
    for (int i = 0; i < 4; i++)
        rng->state[i] = splitmix(&seed);
    rng->has_spare = 0;
    rng->spare = 0;
}

static uint64_t next(struct rng *rng)
{
    uint64_t *s = rng->state;
    uint64_t result = rotate(s[1] * 5, 7) * 9, t = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= t;
    s[3] = rotate(s[3], 45);
    return result;
}

double rng_uniform(struct rng *rng)
{
    return (double)(next(rng) >> 11) * 0x1.0p-53;
}

double rng_normal(struct rng *rng)
{
    if (rng->has_spare) {
        rng->has_spare = 0;
        return rng->spare;
    }
    double radius = sqrt(-2 * log(1 - rng_uniform(rng)));
    double angle = TWO_PI * rng_uniform(rng);
    rng->spare = radius * sin(angle);
    rng->has_spare = 1;
    return radius * cos(angle);
}
