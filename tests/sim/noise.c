/* noise.c - everything in a channel that is not 1x. */
#include "noise.h"

#include <math.h>

#include "rng.h"

static const double TWO_PI = 6.28318530717958647692;

static double lines(const struct noise *noise, const struct rotor *rotor, double t)
{
    double turned, sum = 0;
    rotor_turned(rotor, t, &turned, NULL, NULL);
    for (size_t k = 0; k < noise->line_count; k++) {
        const struct noise_line *l = &noise->lines[k];
        double angle = l->order > 0 ? l->order * turned : TWO_PI * l->hz * t;
        sum += l->amplitude * cos(angle + l->phase_deg * TWO_PI / 360);
    }
    return sum;
}

void noise_add(const struct noise *noise, const struct rotor *rotor, uint64_t seed, double rate_hz,
               size_t n, double *x, size_t stride)
{
    struct rng rng;
    rng_init(&rng, seed);
    double keep = exp(-TWO_PI * noise->corner_hz / rate_hz), colour = rng_normal(&rng);
    for (size_t i = 0; i < n; i++) {
        double t = (double)i / rate_hz, *v = &x[i * stride];
        *v *= 1 + noise->drift * ((double)i / (double)n - 0.5);
        *v += noise->offset + lines(noise, rotor, t) + noise->white * rng_normal(&rng);
        colour = keep * colour + sqrt(1 - keep * keep) * rng_normal(&rng);
        *v += noise->coloured * colour;
    }
}
