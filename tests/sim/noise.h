/* noise.h - what a sensor adds to the 1x: noise, other orders, a neighbour machine, an offset. */
#ifndef LOPSIDE_SIM_NOISE_H
#define LOPSIDE_SIM_NOISE_H

#include <stdint.h>

#include "rotor.h"

#define NOISE_LINES 8

struct noise_line {
    double order; /* of the shaft; 0: not tied to it */
    double hz;    /* used where order is 0 */
    double amplitude, phase_deg;
};

/* Amplitudes in the unit that the samples are in. */
struct noise {
    double white;               /* standard deviation */
    double coloured, corner_hz; /* standard deviation and corner of first-order low-passed noise */
    double offset;
    double drift; /* the 1x grows by this fraction over the recording, its mean stays */
    struct noise_line lines[NOISE_LINES];
    size_t line_count;
};

/* Changes x[i * stride], which holds the pure 1x. */
void noise_add(const struct noise *noise, const struct rotor *rotor, uint64_t seed, double rate_hz,
               size_t n, double *x, size_t stride);

#endif
