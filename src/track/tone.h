/* tone.h - speed and 1x amplitudes where no tacho tells the angle: a line in the vibration's
 * spectrum.
 *
 * The first seconds are searched for the line that the shaft makes: the strongest near the service
 * speed where that is known, else the strongest of all. From then on the line is followed from
 * segment to segment, and its amplitude taken with a Hann window at the frequency where all sensors
 * together are largest (Harris, Proc. IEEE 66 (1978) 51-83; at a line's own frequency the window
 * adds nothing to its amplitude). There is no phase in any of it.
 *
 * Samples are first thinned out: a triangle of two steps' length, which weakens what would alias
 * onto the line by the square of line over rate, and whose own droop is divided out.
 * Memory: TONE_LOOK seconds of thinned samples, TONE_BLOCKS blocks. */
#ifndef LOPSIDE_TRACK_TONE_H
#define LOPSIDE_TRACK_TONE_H

#include <stdbool.h>
#include <stddef.h>

#include "track/shaft.h"

#define TONE_LOOK 10.0   /* seconds that are searched for the line, or 40 turns at service speed */
#define TONE_BLOCKS 2000 /* of a recording whose length is known; segments are joined beyond */

struct tone_set_up {
    double rate_hz, frames; /* frames 0: unknown */
    size_t sensors;
    double service_rpm;     /* NaN: unknown */
    const int *derivatives; /* borrowed, per sensor: acceleration +1, velocity 0, displacement -1 */
};

struct tone_block {
    double from, to; /* samples */
    double hz, turns;
};

struct tone {
    double rate_hz, thin_hz, service_hz, frames;
    size_t sensors;
    int *derivatives;              /* owned */
    size_t step, at;               /* samples to a thinned one, and how many of them have come */
    double *rise, *whole, *before; /* owned, per sensor: sums of the present step */
    bool primed;                   /* `before` holds the half of a triangle */
    double *square, *mean;         /* owned, per sensor: sums since the last segment */
    double count;                  /* samples in those sums */
    float *data;                   /* owned: sensors planes of `room` thinned samples */
    size_t room, fill;
    double used; /* thinned samples that were dropped before data[0] */
    bool found, looked;
    double hz;                 /* of the line; the latest segment's */
    double rival_hz, rival;    /* strongest other line, as a share of the line; 0: none */
    double fine_hz;            /* half a bin of the first search: what it could tell apart */
    size_t segment, join;      /* thinned samples in one; segments to a block */
    size_t joined;             /* in the last block so far */
    struct tone_block *blocks; /* owned */
    double *amplitude, *rest;  /* owned: per block and sensor; peak, rms */
    size_t block_count, block_room;
    double turned; /* samples: end of the last turn given out, */
    size_t block;  /* and the block that it lies in */
};

/* 0, or -1 when memory is out (nothing is kept). rate_hz > 0, sensors may be 0. */
int tone_init(struct tone *tone, const struct tone_set_up *set_up)
    __attribute__((warn_unused_result));
void tone_release(struct tone *tone);

/* n samples of every sensor. 0, or -1 when memory is out. */
int tone_add(struct tone *tone, const float *const *planes, size_t n)
    __attribute__((warn_unused_result));

/* The recording is over. 0, or -1 when memory is out. Afterwards `found` says whether there was a
 * line at all; without one there are no blocks. */
int tone_finish(struct tone *tone) __attribute__((warn_unused_result));

/* The next turn at the line's speed, one after another from the recording's start (which is no
 * mark: the angle is the time's alone), as far as it ends before the sample `end`. False where
 * there is none yet, or no line. */
bool tone_turn(struct tone *tone, double end, struct shaft_turn *turn);

/* Mean speed over the blocks, and the standard deviation of the blocks' speeds (NaN with fewer than
 * two), rpm; NaN where no line was found. */
double tone_speed(const struct tone *tone);
double tone_scatter(const struct tone *tone);

#endif
