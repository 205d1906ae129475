/* edge.h - where a pulse passes its own half height.
 *
 * Half way between the pulse's own base, just before its edge, and its own top, just behind it, is
 * the same instant of the shaft whatever the gain, the gap of the probe or the speed that a coil's
 * pulses grow with; and a capacitor in the line, which tilts the base and the top over a turn,
 * leaves the edge itself alone. (IEEE Std 181 names these instants by the 50 % reference level
 * between base state and top state.)
 *
 * Base and top are sought within four widths of the pulse, the width being that of its shorter
 * side, as the largest mean of 2m+1 samples, m an eighth of the width (where m is large the mean is
 * of evenly spaced ones among them); a parabola through all 2m+1 gives the extreme. A side that is
 * flat is followed by a straight line instead, which takes noise off and does not mind a tilt. The
 * time between samples is a cubic's; on an edge of many samples, one of least squares. Where m is 1
 * the parabola would overshoot a flat top: how much of its overshoot counts is learnt from the
 * pulses before, by what makes their heights equal whatever the sampling (a regression of the
 * changes of height on those of the overshoot). */
#ifndef LOPSIDE_TRACK_EDGE_H
#define LOPSIDE_TRACK_EDGE_H

#include <stdbool.h>
#include <stddef.h>

#define EDGE_KEPT 4 /* pulses among which one of the same kind is sought */

/* What was learnt of one side's shape. All zero: nothing yet. */
struct edge_side {
    size_t count;
    double value[EDGE_KEPT], over[EDGE_KEPT]; /* of the latest pulses, in the signal's unit */
    double cross, square; /* running means of the products of their changes, shares of the height */
};

struct edge {
    struct edge_side base, top;
};

struct edge_half {
    double rise;        /* when the signal passed the half height, samples from x[0] */
    double fall;        /* when it fell below it again, past a tenth of the height less */
    double bottom, top; /* base and top, times the sign */
};

/* Where a comparator saw a pulse. Indices of samples, which may be negative. */
struct edge_spot {
    ptrdiff_t from, past; /* x[from] ... x[past - 1] can be read */
    ptrdiff_t low;        /* the pulse before was over, */
    ptrdiff_t rise;       /* this one rises between x[rise] and x[rise + 1], */
    ptrdiff_t fall;       /* and is over */
    double middle;        /* the comparator's level, times the sign, */
    double allowed;       /* and half its hysteresis */
};

/* The half height of the pulse at `spot`, from <= low < rise < fall < past. `sign` -1: for a pulse
 * that goes down. False, and nothing given: the samples are too few or not finite, or there is no
 * height. */
bool edge_find(struct edge *edge, const float *x, float sign, const struct edge_spot *spot,
               struct edge_half *half) __attribute__((warn_unused_result));

/* The time within [0, 1] at which the curve through y(0) and y(1), y = sign*x, passes `level`,
 * which lies between them: a cubic through y(-1) and y(2), too, unless the signal turns back before
 * it gets to them; then a straight line, as where they are not to be had (`outer` false). */
double edge_crossing(const float *x, float sign, double level, bool outer);

#endif
