/* amplitude.h - one plane without phase: as found and trial runs at known angles, amplitudes only.
 *
 * The four-run method by nonlinear least squares: amplitude[i] = |T + A w[i]| with T >= 0 (the
 * phase of the as-found vibration is unknowable and taken as zero) and A complex. The correction
 * -T/A does not depend on that choice. A job of collinear weights has two mirrored answers; so have
 * too few runs.
 */
#ifndef LOPSIDE_SOLVE_AMPLITUDE_H
#define LOPSIDE_SOLVE_AMPLITUDE_H

#include <complex.h>
#include <stddef.h>

#include "solve/posterior.h"

enum amplitude_result {
    AMPLITUDE_OK = 0,
    AMPLITUDE_NO_MEMORY = -1,
    AMPLITUDE_AMBIGUOUS = -2, /* another answer fits as well, or too few runs; `p` is empty */
    AMPLITUDE_NAN = -3
};

/* amplitude[count] (SI peak, >= 0), w[count] equivalent weights (kg), variance[count] of each
 * amplitude (SI^2; below (1e-9 scale)^2 counts as that), scale > 0 the as-found amplitude. Fills
 * `p` (new) with unknowns [T, A]. Levenberg-Marquardt (J. SIAM 11 (1963) 431-441) from a fixed grid
 * of starts; a second minimum whose sum of squares is within 5.99 (chi-square, 2 degrees of
 * freedom, 95 %) of the best is an ambiguity. *misfit: root of the sum of squares per spare run at
 * the best, in s.e., where variances are stated (else NaN); *which: the reading with the largest
 * residual. */
int amplitude_fit(size_t count, const double *amplitude, const double complex *w,
                  const double *variance, double scale, struct posterior *p, double *misfit,
                  size_t *which) __attribute__((warn_unused_result));

/* Where two answers fit alike (within 5.99 of each other, as above), their corrections -T/A, kg:
 * for one more run than is enough for a circle of answers (as found and two trials), or for
 * collinear weights. AMPLITUDE_AMBIGUOUS: there are more than two, or one alone. Arguments as in
 * amplitude_fit. */
int amplitude_pair(size_t count, const double *amplitude, const double complex *w,
                   const double *variance, double scale, double complex either[2])
    __attribute__((warn_unused_result));

#endif
