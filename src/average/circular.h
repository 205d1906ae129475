/* circular.h - statistics of directions, such as the lags of a run's blocks.
 *
 * Definitions after K. V. Mardia and P. E. Jupp, Directional Statistics (Wiley, 2000), section 2.3:
 * with C and S the mean cosine and sine, the mean resultant length is R = sqrt(C^2 + S^2), the mean
 * direction atan2(S, C), the circular variance 1 - R, the circular standard deviation
 * sqrt(-2 ln R). The angular deviation is sqrt(2 (1 - R)), as J. H. Zar, Biostatistical Analysis
 * (5th ed. 2010), ch. 26, uses it.
 */
#ifndef LOPSIDE_AVERAGE_CIRCULAR_H
#define LOPSIDE_AVERAGE_CIRCULAR_H

#include <complex.h>
#include <stddef.h>

struct circular {
    double mean_deg;      /* [0, 360); NaN where R is 0 to rounding: there is no mean direction */
    double resultant;     /* R, 0..1 */
    double variance;      /* 1 - R */
    double deviation_deg; /* angular deviation, 0..81.03 */
    double sd_deg;        /* circular standard deviation; infinite where R is 0 */
};

/* Summary of the arguments of `count` vectors: each counts by its direction only. No vectors, a NaN
 * among them, or a zero vector, which has no direction, give NaN throughout. */
struct circular circular_of_vectors(const double complex *vectors, size_t count);

#endif
