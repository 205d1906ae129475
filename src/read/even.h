/* even.h - is a column of times even, as far as it is printed? */
#ifndef LOPSIDE_READ_EVEN_H
#define LOPSIDE_READ_EVEN_H

#include "read/decimal.h"

enum even_result { EVEN_DONE, EVEN_BACKWARDS, EVEN_GAP, EVEN_DRIFT };

struct even {
    double first, step;      /* of the even grid, s */
    double last;             /* time of the last row */
    double last_grain;       /* resolution it was printed with */
    long long count;         /* rows so far */
    int fraction, significant; /* most digits seen in a row */
    double unit;             /* seconds per unit of the text */
};

/* A grid of `count` rows (>= 2) from time `first` to `last`, in s, later > first; `unit` seconds per unit
 * of the text. The grains are those of the two texts. */
void even_init(struct even *even, double first, double last, long long count, double unit,
               struct decimal_grain first_grain, struct decimal_grain last_grain);

/* The next row's time, in s, and how finely it was printed. */
int even_next(struct even *even, double time, struct decimal_grain grain)
    __attribute__((warn_unused_result));

#endif
