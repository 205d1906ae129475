/* even.h - is a column of times even, as far as it is printed? */
#ifndef LOPSIDE_READ_EVEN_H
#define LOPSIDE_READ_EVEN_H

#include "read/decimal.h"

enum even_result { EVEN_DONE, EVEN_BACKWARDS, EVEN_GAP, EVEN_DRIFT };

struct even {
    double first, step;        /* of the even grid, s */
    double last;               /* time of the last row */
    double last_grain;         /* resolution it was printed with */
    long long count, rows;     /* rows so far; in all */
    int fraction, significant; /* most digits seen in a row */
    double unit;               /* seconds per unit of the text */
    double fine, low, high;    /* resolution of times from low to high, in units of the text */
    double usual;              /* the last step, s */
    long long equal;           /* steps up to it that were equal */
    long long drifted;         /* first row that is off the grid, from 1; 0: none */
};

/* Relative uncertainty of the rate that the grid gives: the resolution of its ends over its length.
 */
double even_uncertainty(struct even *even);

/* A grid of `count` rows (>= 2) from time `first` to `last`, in s, later > first; `unit` seconds
 * per unit of the text. The grains are those of the two texts. */
void even_init(struct even *even, double first, double last, long long count, double unit,
               struct decimal_grain first_grain, struct decimal_grain last_grain);

/* After the last row: EVEN_DRIFT where rows were off the grid though no step was (a lost row, too,
 * puts the rows before it off the grid; the row itself is what even_next names). */
int even_finish(const struct even *even) __attribute__((warn_unused_result));

/* The next row's time, in s, and how finely it was printed. A grid that is finer than the print
 * leaves room for a lost row; one is seen where many steps before it were all alike. */
int even_next(struct even *even, double time, struct decimal_grain grain)
    __attribute__((warn_unused_result));

#endif
