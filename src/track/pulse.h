/* pulse.h - a tacho signal to the times of its pulses: a comparator with hysteresis tells that one
 * came, and its own half height (edge.h) when.
 *
 * The comparator's levels come from the recording itself: first from a stretch at its beginning,
 * then from the pulses as they pass, so that AC coupling, offsets and pulses that grow are
 * followed. Pulses that go to both sides of where the signal rests, as a coil's, are seen half way
 * between there and the top: never where it rests, whichever side comes first. A level given by the
 * user wins, over the half height, too. Time is counted in samples
 * from the start of the recording.
 *
 *     struct pulse_finder finder;
 *     pulse_init(&finder, +1, NAN);
 *     if (pulse_levels(&finder, x, n)) ...  // the first seconds; false: nothing there
 *     // chunk by chunk, from the first sample on; x[-back] ... x[-1] are those before it
 *     count = pulse_find(&finder, x, n, back, start, pulses);
 *     count = pulse_finish(&finder, end, &pulse); // the pulse that was under way
 */
#ifndef LOPSIDE_TRACK_PULSE_H
#define LOPSIDE_TRACK_PULSE_H

#include <stdbool.h>
#include <stddef.h>

#include "track/edge.h"

struct pulse {
    double at;        /* time of the chosen edge at half height, or at the given level, samples */
    double high, low; /* how long the signal stayed beyond the edge, and before it, samples */
    double top;       /* the height beyond the edge, and */
    double bottom;    /* the one before it, both in the edge's direction (negated for falling) */
};

#define PULSE_MEMORY 8 /* pulses whose extremes set the level */

struct pulse_finder {
    float sign;   /* +1 rising edge, -1 falling */
    double level; /* NaN: found from the signal */
    float rest; /* where it rests between the two sides of its pulses, share of the range; 0: one */
    float below, middle, above; /* levels of the comparator in the edge's direction */
    float tops[PULSE_MEMORY], bottoms[PULSE_MEMORY];
    size_t turn;           /* next place in tops and bottoms */
    int state;             /* 0: not started, 1: below, 2: above, 3: above since the start */
    float extreme, bottom; /* running extreme of the state; the one of the state before */
    double fell, rose;     /* when the signal went below, rose through the middle */
    double low;            /* how long it was below before it rose */
    bool live;             /* levels are known */
    struct edge edge;      /* the shape of the pulses so far */
};

/* `edge` +1 rising or -1 falling; `level` in the signal's unit, NaN to find it. */
void pulse_init(struct pulse_finder *finder, int edge, double level);

/* Finds the first levels from n samples. False where the signal is constant or not finite: then
 * pulse_find finds nothing until a later call succeeds. */
bool pulse_levels(struct pulse_finder *finder, const float *x, size_t n)
    __attribute__((warn_unused_result));

/* For when no pulse has come for long: takes the levels anew from the last n samples, unless what
 * is there is less than a tenth of what the pulses were (a tacho that fell silent). True where they
 * were; false leaves the finder as it was, so the result may be ignored. */
bool pulse_renew(struct pulse_finder *finder, const float *x, size_t n);

/* Looks through x[0..n-1], whose first sample has the time `start`; `back` samples before x[0] can
 * still be read. `pulses` has room for n/2 + 1. Returns how many pulses ended in this chunk. */
size_t pulse_find(struct pulse_finder *finder, const float *x, size_t n, size_t back, double start,
                  struct pulse *pulses);

/* The pulse that is under way at the end (time `end`), if any: 0 or 1. */
size_t pulse_finish(struct pulse_finder *finder, double end, struct pulse *pulse);

#endif
