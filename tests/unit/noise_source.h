/* noise_source.h - repeatable random numbers for tests: SplitMix64 (Steele, Lea, Flood, OOPSLA 2014)
 * and Box & Muller (1958). Each test sets `seed`. */
#ifndef LOPSIDE_TESTS_NOISE_SOURCE_H
#define LOPSIDE_TESTS_NOISE_SOURCE_H

#include <complex.h>
#include <math.h>
#include <stdint.h>

static uint64_t seed;

/* Evenly spread within (0, 1). */
static inline double uniform(void)
{
    uint64_t z = (seed += 0x9e3779b97f4a7c15u);

    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    z ^= z >> 31;
    return ((double)(z >> 11) + 0.5) / 9007199254740992.0;
}

/* Two independent standard normal numbers. */
static inline double complex normal(void)
{
    double r = sqrt(-2 * log(uniform())), a = 6.283185307179586 * uniform();

    return CMPLX(r * cos(a), r * sin(a));
}

#endif
