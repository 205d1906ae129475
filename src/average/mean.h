/* mean.h - one vector from the blocks of a run, with the covariance of that mean. */
#ifndef LOPSIDE_AVERAGE_MEAN_H
#define LOPSIDE_AVERAGE_MEAN_H

#include <complex.h>
#include <stddef.h>

#include "average/unsteady.h"

struct mean {
    double complex vector; /* mean of the blocks used, weighted by their turns */
    double cov[3];         /* of the mean: var re, cov, var im */
    size_t used;           /* blocks used */
    long set_aside;        /* outlier blocks not used (robust.h) */
    double turns;          /* turns used */
    double independent;    /* effective number of independent blocks, 1..used */
    double amplitude_sd;   /* standard deviation of the blocks' amplitudes; NaN for one block */
    double phase_sd_deg;   /* circular standard deviation of their lags; NaN for one block */
    double resultant;      /* mean resultant length of their lags */
    double drift; /* size of the trend end to end (trend.h), 0 where not significant; NaN: < 4
                     blocks */
    struct unsteady unsteady; /* beats, steps and wander of the blocks used */
};

/* The mean of `count` (>= 1) block vectors with their turns (> 0) and times t (s, ascending).
 *
 * cov = S * f * g / n: S the covariance of the blocks used, weighted by their turns and drawn
 * towards a round one by 10 degrees of freedom (noise that does not know the shaft is round); f
 * their long-run factor (longrun.h); g what the turns that neighbouring blocks share take from
 * their scatter (5 % for blocks of 4 turns, 1 % for 24). It is made to be read with chi-squared:
 * the region |error|^2 < 5.99 of cov holds the truth 95 times in 100, few blocks and slow noise
 * allowed for, and no wider quantile is due. Hotelling's T2 on n-1 degrees of freedom, which is
 * wider, then holds it 97.7 times in 100 for 16 blocks in white noise, 96 times for 60. One block
 * has no scatter: half of its squared amplitude stands for each variance.
 *
 * What is slower than the recording cannot be seen in it. Of first-order noise 95 % is held where
 * its memory is a fifth of the recording, 90 % at a quarter, 70 to 74 % at a half (16 blocks;
 * tests/bench/bench_average.c): a noise so slow among those of colour.c would hold 90 % there, but
 * make readings of a machine that only swings within the run half as wide again. Where slow noise
 * lies below white noise of its own size, 78 % is held in 16 blocks. A beat of less than half a
 * period is not in cov either, but shows in `drift` by its chord (20 % of beat, a tenth of a
 * period: 12 %).
 *
 * NaN in: NaN out. Returns 0; -1 when memory is out; -2 for no blocks. */
int mean_of_blocks(const double complex *vectors, const double *turns, const double *t,
                   size_t count, struct mean *mean) __attribute__((warn_unused_result));

/* The same where only amplitudes can be believed, the marks of a turn being alike: `amplitudes` of
 * the blocks; cov is {v, 0, v} with v the variance of the mean amplitude; vector is the amplitude.
 * Made for +-1.96 standard errors: in white noise these hold the truth 95 times in 100 for 2 to 5
 * blocks and from 16, and up to 99.6 times between, where slow noise can be told from one component
 * hardly at all. */
int mean_of_amplitudes(const double *amplitudes, const double *turns, const double *t, size_t count,
                       struct mean *mean) __attribute__((warn_unused_result));

#endif
