/* bench_average.c - how often the 95 % region of a steady reading holds the truth, by block kernels
 * alone: drift of any memory, beats of any period, white noise of any number of blocks.
 *
 *     bench_average [TIMES]      default 4000 readings a line
 *
 * For each: what `cov` holds (chi-squared, 2 degrees of freedom); what it holds of those readings
 * that show neither a drift nor a beat above the checks' cautions (5 and 10 %); how many do; the
 * standard error over the true deviation of the mean (1: as wide as it should be; geometric mean).
 */
#include <complex.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "average/mean.h"
#include "sim/rng.h"

#define PI_HERE 3.14159265358979323846
#define BLOCKS_MOST 128
#define STEPS 24 /* within a block */

enum kind { WHITE, DRIFT, BEAT, SWING };

struct recipe {
    const char *name;
    enum kind kind;
    double seconds;
    size_t blocks;
    double time;  /* memory, s; period of the beat, s */
    double size;  /* rms of the drift, amplitude of the beat; the vector is 1 */
    double noise; /* of a block, each component */
};

static const struct recipe RECIPES[] = {
    {"white", WHITE, 5, 8, 0, 0, 0.02},
    {"white", WHITE, 7, 12, 0, 0, 0.02},
    {"white", WHITE, 10, 16, 0, 0, 0.02},
    {"white", WHITE, 20, 20, 0, 0, 0.02},
    {"white", WHITE, 30, 30, 0, 0, 0.02},
    {"white", WHITE, 60, 60, 0, 0, 0.02},
    {"drift", DRIFT, 10, 16, 0.5, 0.1, 0.01},
    {"drift", DRIFT, 10, 16, 1, 0.1, 0.01},
    {"drift", DRIFT, 10, 16, 2, 0.1, 0.01},
    {"drift", DRIFT, 10, 16, 5, 0.1, 0.01},
    {"drift", DRIFT, 20, 20, 5, 0.1, 0.01},
    {"drift", DRIFT, 30, 30, 5, 0.1, 0.01},
    {"drift", DRIFT, 40, 40, 2, 0.1, 0.01},
    {"drift", DRIFT, 40, 40, 5, 0.1, 0.01},
    {"drift under white", DRIFT, 10, 16, 2, 0.05, 0.05},
    {"drift under white", DRIFT, 20, 20, 5, 0.05, 0.05},
    {"drift under white", DRIFT, 60, 60, 5, 0.05, 0.05},
    {"beat", BEAT, 10, 16, 3.33, 0.2, 0.01},
    {"beat", BEAT, 10, 16, 5.7, 0.2, 0.01},
    {"beat", BEAT, 10, 16, 8.33, 0.2, 0.01},
    {"beat", BEAT, 10, 16, 14.3, 0.2, 0.01},
    {"beat", BEAT, 10, 16, 20, 0.2, 0.01},
    {"beat", BEAT, 40, 40, 33, 0.2, 0.01},
    {"swing", SWING, 10, 16, 3.33, 0.1, 0.01},
    {"swing", SWING, 10, 16, 8, 0.1, 0.01},
    {"swing", SWING, 10, 16, 14, 0.1, 0.01},
};

static double complex normal(struct rng *rng)
{
    return CMPLX(rng_normal(rng), rng_normal(rng));
}

static void record(const struct recipe *r, struct rng *rng, double complex *z)
{
    const double step = r->seconds / (double)r->blocks / STEPS;
    const double keep = r->time > 0 ? exp(-step / r->time) : 0;
    const double way = rng_normal(rng) < 0 ? -1 : 1;
    double complex slow = normal(rng) / sqrt(2);
    double phase = atan2(rng_normal(rng), rng_normal(rng));

    for (size_t i = 0; i < r->blocks; i++) {
        z[i] = 0;
        for (size_t k = 0; k < STEPS; k++) {
            double angle = phase + 2 * PI_HERE * step * (double)(i * STEPS + k) / r->time;
            slow = keep * slow + sqrt(1 - keep * keep) * normal(rng) / sqrt(2);
            z[i] += (r->kind == WHITE   ? 0
                     : r->kind == DRIFT ? slow
                     : r->kind == BEAT  ? cexp(I * way * angle)
                                        : cos(angle)) /
                    STEPS;
        }
        z[i] = 1 + r->size * z[i] + r->noise * normal(rng);
    }
}

static int bench(const struct recipe *r, long times)
{
    double complex z[BLOCKS_MOST];
    double turns[BLOCKS_MOST], t[BLOCKS_MOST], width = 0, power = 0;
    long held = 0, quiet = 0, quiet_held = 0;
    struct rng rng;

    rng_init(&rng, 1);
    for (size_t i = 0; i < r->blocks; i++) {
        t[i] = ((double)i + 0.5) * r->seconds / (double)r->blocks;
        turns[i] = 25 * r->seconds / (double)r->blocks;
    }
    for (long k = 0; k < times; k++) {
        struct mean m;
        record(r, &rng, z);
        if (mean_of_blocks(z, turns, t, r->blocks, &m))
            return 1;
        double complex d = m.vector - 1;
        double q = (m.cov[2] * creal(d) * creal(d) - 2 * m.cov[1] * creal(d) * cimag(d) +
                    m.cov[0] * cimag(d) * cimag(d)) /
                   (m.cov[0] * m.cov[2] - m.cov[1] * m.cov[1]);
        int calm = !(m.drift > 0.05) && !(m.unsteady.beat > 0.1);
        held += q < 5.99146; /* chi-squared, 2 degrees of freedom, 95 % */
        quiet += calm;
        quiet_held += calm && q < 5.99146;
        power += (creal(d) * creal(d) + cimag(d) * cimag(d)) / (double)times;
        width += log(m.cov[0] + m.cov[2]) / 2 / (double)times;
    }
    printf("%-18s %3.0f s %3zu blocks, %5.2f s, %3.0f %%: %5.1f %% hold; %5.1f %% of the %5.1f %% "
           "without caution; width %.2f\n",
           r->name, r->seconds, r->blocks, r->time, 100 * r->size,
           100.0 * (double)held / (double)times, 100.0 * (double)quiet_held / (double)quiet,
           100.0 * (double)quiet / (double)times, exp(width) / sqrt(power));
    return 0;
}

int main(int argc, char **argv)
{
    long times = argc > 1 ? atol(argv[1]) : 4000;

    for (size_t i = 0; i < sizeof RECIPES / sizeof *RECIPES; i++)
        if (bench(&RECIPES[i], times))
            return 1;
    return 0;
}
