/* vector.h - the sums over one turn from which 1x vectors are made.
 *
 * The samples of a turn are weighted with the angle each of them stands for, so that
 * sum x*exp(+j*theta) is the integral over the angle and DC and all harmonics fall out over whole
 * turns. Arithmetic is in lanes of single precision that are emptied into double every VECTOR_PIECE
 * samples; lane order is fixed, so that every machine type gives its own bytes again and again. */
#ifndef LOPSIDE_TRACK_VECTOR_H
#define LOPSIDE_TRACK_VECTOR_H

#include <stddef.h>

#include "track/shaft.h"

#define VECTOR_PIECE 256 /* samples; a multiple of 8 */

struct vector_sums {
    double re, im; /* of w*x*exp(+j*theta) */
    double mean;   /* of w*x */
    double square; /* of w*x*x */
};

/* Weights of a piece of a turn. */
struct vector_weights {
    _Alignas(16) float cosine[VECTOR_PIECE], sine[VECTOR_PIECE], one[VECTOR_PIECE];
    _Alignas(16) float angle[VECTOR_PIECE]; /* fraction of the turn */
    size_t count; /* samples; the lanes behind it are zero up to a multiple of 4 */
};

/* The weights of `count` samples (at most VECTOR_PIECE), the first at time `start` within the turn.
 */
void vector_weigh(struct vector_weights *weights, const struct shaft_turn *turn, double start,
                  size_t count);

/* Multiplies the weights with the ramp s - sin(2*pi*s)/(2*pi) that rises from 0 to 1 over the
 * turn: a box of whole turns convolved with a Hann kernel of one turn begins and ends like this. */
void vector_ramp(struct vector_weights *weights);

/* Adds the sums over x[0..count-1] - offset. */
void vector_add(struct vector_sums *sums, const struct vector_weights *weights, const float *x,
                float offset);

#endif
