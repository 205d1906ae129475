/* channel.h - what a channel's samples say about the channel itself: range, resolution, clipping,
 * and whether two channels carry the same signal. Samples come in chunks; memory does not grow. */
#ifndef LOPSIDE_TRACK_CHANNEL_H
#define LOPSIDE_TRACK_CHANNEL_H

#include <stddef.h>

struct channel_held { /* the largest value so far and how it is held */
    float extreme;
    long run;             /* samples in a row that have it */
    long crests, samples; /* runs of CHANNEL_HOLD or more, and their samples */
};

#define CHANNEL_HOLD 4   /* samples in a row at the extreme make a flat crest */
#define CHANNEL_CRESTS 3 /* flat crests make a clipped channel */

struct channel {
    double rail;                   /* |value| at full scale; NaN: unknown */
    float min, max, step;          /* step: smallest difference of neighbours; INFINITY: none yet */
    float previous;                /* last sample of the chunk before */
    struct channel_held high, low; /* low: of the negated signal */
    long long at_rail, samples;
};

void channel_init(struct channel *channel, double rail);
void channel_add(struct channel *channel, const float *x, size_t n);

/* Samples at full scale, or in flat crests at the extreme. A channel that has fewer than 64 steps
 * between its extremes is too coarse for flat crests to mean anything. */
long long channel_railed(const struct channel *channel);

/* Smallest step between two different values; 0: constant. */
double channel_resolution(const struct channel *channel);

/* ---- the same signal twice ---- */

struct channel_pairs {
    size_t columns;
    size_t stride; /* every stride-th frame is looked at */
    size_t skip;   /* frames until the next one */
    double count;
    double *shift; /* owned, per column: the first value, taken off */
    double *sums;  /* owned: columns sums, then columns*columns sums of products */
};

/* 0, or -1 when memory is out. */
int channel_pairs_init(struct channel_pairs *pairs, size_t columns)
    __attribute__((warn_unused_result));
void channel_pairs_release(struct channel_pairs *pairs);

/* n frames; planes[c] are the samples of column c. */
void channel_pairs_add(struct channel_pairs *pairs, const float *const *planes, size_t n);

/* The first other column whose correlation with this one exceeds 0.99999 in magnitude, or -1.
 * A constant column is like none. */
int channel_pairs_same(const struct channel_pairs *pairs, size_t column);

#endif
