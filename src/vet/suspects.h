/* suspects.h - would the runs fit better if something had been moved between them? */
#ifndef LOPSIDE_VET_SUSPECTS_H
#define LOPSIDE_VET_SUSPECTS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

/* The readings of one condition, runs in the order of recording. */
struct suspects_set {
    size_t run_count, sensor_count, plane_count;
    const double complex *weights; /* [run * plane_count + plane], kg; NULL without planes */
    const double complex *vectors; /* [run * sensor_count + sensor], argument is lag; NaN: none */
    const double *variance;        /* the same shape: per component, of the reading itself */
    const double *repeatability;   /* [sensor]: variance per component from run to run, > 0 */
    const bool *alike; /* [sensor * sensor_count + sensor]: the two may have been exchanged */
};

enum suspects_kind { SUSPECTS_TAPE, SUSPECTS_SWAP, SUSPECTS_TURN };

struct suspect {
    bool hidden;         /* tape: from some run on it might have been moved without a trace */
    bool spare;          /* some run is spare; otherwise nothing can be told */
    double misfit;       /* of the runs as they are, root mean square in standard errors */
    double chance;       /* below 0.001: no chance that the runs fit as they are */
    bool likely;         /* they do not fit as they are, and do if it were so */
    double better;       /* how many times less the misfit would be then; at least 1 */
    double angle_deg;    /* tape, turn: by how much lags grew; (-180, 180] */
    size_t sensor, with; /* turn: the sensor; swap: both */
    size_t run;          /* the run it is about */
    bool onwards;        /* all runs from that one on; false: it alone */
    bool ambiguous;      /* another run, or the same of fewer or more runs, explains it as well */
    size_t other;        /* that run */
    double other_deg;    /* and its angle */
    bool other_onwards;
};

/* Regression of each sensor's readings on [1, weights] (least squares, weighted by variance +
 * repeatability), as they are and as they would be were one thing undone in one run or from one run
 * on: all lags turned alike by any angle (tape: the best angle in closed form), two sensors
 * exchanged, one sensor turned by 90, 180 or -90 deg. The misfit is the weighted sum of squares,
 * chi-squared with two degrees of freedom for every spare reading. `likely` where that is beyond
 * its 99.9 % point as the runs are and within its 95 % point if it were so (points after Wilson &
 * Hilferty, PNAS 17 (1931) 684-688), for a turn of the tape of at least 5 deg. `other` is told
 * where the misfit would be within 6 (chi-squared) of the best. `hidden` where from some run on a
 * shift of all lags by 30 deg would not lift the misfit beyond the 99.9 % point, since the
 * responses to weights take it up, although it changes the readings by twice that and more: then
 * that the runs fit says nothing. 0; -1: no memory. */
int suspects_find(const struct suspects_set *set, enum suspects_kind kind, struct suspect *suspect)
    __attribute__((warn_unused_result));

/* The point of chi-squared with `freedom` (>= 1) degrees of freedom that a share of
 * Phi(normal) stays below. */
double suspects_chi2(double freedom, double normal);

#endif
