/* window.h - turns to blocks of whole turns.
 *
 * A block of M turns has a window of M turns convolved with a Hann kernel of one turn: its
 * transform vanishes at every whole order but zero, so that neither a constant nor a harmonic leaks
 * into 1x (Harris, Proc. IEEE 66 (1978) 51-83, on windows and their leakage). Neighbours overlap in
 * the one turn in which the one falls and the other rises, and add up to one there: every sample
 * counts once. The last block of a stretch takes the turns that are left, or they go to the one
 * before. */
#ifndef LOPSIDE_TRACK_WINDOW_H
#define LOPSIDE_TRACK_WINDOW_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "track/shaft.h"
#include "track/vector.h"

struct window_block {
    double from, to; /* samples: middles of the turns in which the window rises and falls */
    long turns;
};

struct windows {
    size_t sensors;
    long length;                 /* turns per block */
    long turn;                   /* in the stretch */
    size_t stretch;              /* number of blocks before this stretch */
    struct window_block *blocks; /* owned */
    struct vector_sums *sums;    /* owned, count * sensors */
    size_t count, room;
    bool open; /* the last block is still being filled */
};

/* About a second of turns, at least four, shortened so that the recording gives sixteen blocks or
 * more, lengthened so that it gives two thousand at most; a quarter of a second where the speed
 * `sweeps` (at 20 rpm/s it changes by 5 rpm in it). `period` and `frames` (0: unknown) in samples.
 */
long window_length(double rate_hz, double period, double frames, bool sweeps);

void window_init(struct windows *windows, size_t sensors);
void window_release(struct windows *windows);

/* True where the next turn is one in which windows rise or fall, so that its ramped sums are
 * needed. */
bool window_ramps(const struct windows *windows, const struct shaft_turn *turn);

/* Takes the sums of a turn, one per sensor; `ramped`: the same, weighted with vector_ramp, where
 * window_ramps said so. Returns 0, or -1 when memory is out. */
int window_turn(struct windows *windows, const struct shaft_turn *turn,
                const struct vector_sums *full, const struct vector_sums *ramped)
    __attribute__((warn_unused_result));

/* The 1x vector (peak, argument is lag) of a block, and the rms of all but 1x and the constant. */
double complex window_vector(const struct windows *windows, size_t block, size_t sensor,
                             double *rest);

#endif
