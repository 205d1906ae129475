/* blocks.h - the blocks of one sensor in one run, in memory that does not grow with the recording. */
#ifndef LOPSIDE_AVERAGE_BLOCKS_H
#define LOPSIDE_AVERAGE_BLOCKS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#define BLOCKS_MOST 8192 /* a block of a second each: 2.3 hours. What is longer has coarser blocks */

struct block {
    double complex vector; /* NaN: none */
    double turns, t, speed_rpm;
};

struct blocks {
    double complex *vectors; /* owned, as the three below; by time */
    double *turns, *t, *speed;
    size_t count, room;
    bool amplitudes;     /* the blocks brought amplitudes only; they stand in `vectors` */
    size_t pack, packed; /* as many blocks become one; so many are in `open` */
    struct block open;   /* sums of the one that is being packed */
};

/* Adds a block behind the others, or to the one that is being packed. Where BLOCKS_MOST is reached neighbours
 * become one, their means weighted by turns, and from then on twice as many are packed. A block without a
 * vector takes no part in a mean with one that has. Returns 0; -1 when memory is out. */
int blocks_add(struct blocks *blocks, const struct block *block) __attribute__((warn_unused_result));

/* No more come: the block that is being packed is dropped if it is less than half of the others. */
void blocks_end(struct blocks *blocks);

/* Takes out the blocks that have no vector; where none has one, all stay. */
void blocks_drop_empty(struct blocks *blocks);

/* True where there is no block with a vector; after blocks_drop_empty. */
bool blocks_empty(const struct blocks *blocks);

void blocks_clear(struct blocks *blocks);   /* no blocks; the memory stays */
void blocks_release(struct blocks *blocks); /* frees what is owned */

#endif
