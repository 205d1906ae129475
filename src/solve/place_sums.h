/* place_sums.h - every sum of up to a few pieces on one plane, in a tree that finds the near ones.
 *
 * An item is one piece at one position, number position * stock + piece. A sum holds up to `depth` items
 * (several may be equal) that on their own keep the plane's limits. The tree halves the points along the
 * longer side of their box (Bentley's k-d tree, CACM 18 (1975) 509-517).
 */
#ifndef LOPSIDE_SOLVE_PLACE_SUMS_H
#define LOPSIDE_SOLVE_PLACE_SUMS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

/* The stock on one plane with positions resolved (any angle: whole degrees). */
struct place_stock {
    size_t positions, stock;
    const double complex *e; /* positions unit vectors, the plane's sign in them; borrowed */
    const double *masses;    /* stock; borrowed */
    const int *counts;       /* stock; -1: any number; borrowed */
    double most, most_in_all;
    const double *held;      /* positions: kg that `most` counts besides; NULL: none; borrowed */
};

struct place_sum {
    double complex w;
    double mass;
    uint32_t first; /* its items start here in `items`, `depth` of them, UINT32_MAX where none */
};

struct place_node {
    double complex low, high; /* corners of the box */
    double mass;              /* least mass of a sum in it */
    uint32_t begin, end;      /* its sums */
    uint32_t left, right;     /* 0: a leaf */
};

struct place_sums {
    size_t depth, count, nodes;
    struct place_sum *sum;   /* owned */
    uint32_t *items;         /* owned */
    struct place_node *node; /* owned; node[0] is the root */
};

#define PLACE_NO_ITEM UINT32_MAX

/* How many sums of up to `depth` of `items` items there are; SIZE_MAX beyond 2^40. */
size_t place_sums_size(size_t items, size_t depth);

/* Whether these items (unused: PLACE_NO_ITEM) together keep counts, most and most_in_all (to 1e-12). */
bool place_sums_allowed(const struct place_stock *stock, const uint32_t *items, size_t count);

/* Builds all sums of up to `depth` items. 0, or -1 when memory is short; release in any case. */
int place_sums_init(struct place_sums *sums, const struct place_stock *stock, size_t depth)
    __attribute__((warn_unused_result));
void place_sums_release(struct place_sums *sums);

#endif
