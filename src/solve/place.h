/* place.h - which pieces to bolt on at which positions: exact search with proof.
 *
 * The objective. Let W[p] be the complex equivalent weight (kg at the plane's radius, argument = angle
 * against rotation) added on plane p, p = 0..P-1, and x = [1, W[0] ... W[P-1]]. Row r (a sensor in a
 * condition, scaled) has the expected squared vibration
 *     J_r(W) = x^H F_r x,   F_r Hermitian, positive semidefinite, (P+1) x (P+1), row-major,
 * of which x^H C_r x is the certain part (from the means alone) and the rest comes from what is not
 * known. total: J = sum_r J_r. worst: J = max_r J_r.
 *
 * The answer. For at most k = 0, 1, 2 ... `pieces` pieces a plane the best placement is found with a proof
 * (branch and bound; lower bounds from the convex relaxation); the smallest k whose best lies within
 * the noise of the best of all is chosen. Within the noise: an excess of J below 10 % of the uncertain
 * part at the best of all, or `floor` (sum or max over rows of (1 % of as found)^2), whichever is larger.
 * Nothing added (k = 0) is always a candidate.
 *
 * The next best: second and third least J among all placements of at most as many pieces a plane as allowed
 * the chosen one. Two placements differ when any piece or position differs; with any mass it is the set of
 * positions that counts, so two planes of any angle and any mass have no next best. Ties in J (1e-12 of `nothing`)
 * go to fewer pieces, then less mass, then the lowest plane, position, piece. A plane without
 * influence on any row stays empty. With any mass, or pieces at any angle, 1e-9 of `nothing` counts as equal.
 *
 * Determinism: the search is bounded by a number of nodes, never by time. When the bound is hit the
 * best so far is given with the gap that is left (gap > 0); gap == 0 is proof.
 */
#ifndef LOPSIDE_SOLVE_PLACE_H
#define LOPSIDE_SOLVE_PLACE_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#define PLACE_PIECES_MOST 16 /* pieces a plane that can be asked for */

struct place_plane {
    const double *angles_deg;   /* free positions, against rotation; borrowed */
    size_t positions;           /* 0: any angle (pieces then stand at whole degrees) */
    const double *masses;       /* kg, > 0, the pieces in stock; borrowed */
    const int *counts;          /* how many of each; -1: any number; borrowed */
    size_t stock;               /* 0: any mass */
    int pieces;                 /* at most on this plane, 1..PLACE_PIECES_MOST; several may share a position */
    double most;                /* kg at one position; INFINITY: no limit */
    double most_in_all;         /* kg on the plane (sum of magnitudes); INFINITY: no limit */
    double sign;                /* +1: added; -1: removed (a piece of mass m counts as W = -m exp(j angle)) */
    const double *held;         /* kg, >= 0, what stands at each position already (any angle: at each whole
                                 * degree): `most` counts it; NULL: nothing; borrowed. Not looked at where
                                 * any mass stands at any angle */
};

struct place_problem {
    size_t planes;
    const struct place_plane *plane;
    size_t rows;
    const double complex *forms;    /* rows x (P+1) x (P+1) */
    const double complex *certain;  /* the same shape */
    bool worst;
    double floor;                   /* J units; >= 0 */
    long nodes;                     /* most nodes to look at; 0: the default */
};

struct place_item {             /* what stands at one position */
    size_t plane;
    int position;               /* index into angles_deg; -1: any angle */
    double angle_deg;           /* against rotation */
    double mass;                /* kg, > 0: total here */
    double pieces[PLACE_PIECES_MOST]; /* kg each; one entry where any mass may be used */
    size_t piece_count;
};

struct place_choice {
    struct place_item *items;   /* owned by the result; sorted by plane, then position or angle */
    size_t count;               /* 0: nothing added */
    int pieces;                 /* largest number of pieces on one plane */
    double objective;           /* J of this placement */
};

struct place_result {
    struct place_choice best;   /* the one chosen */
    struct place_choice next[2]; /* next best placements that differ in where or what; count 0 and NaN objective: none */
    double nothing;             /* J of nothing added */
    double of_all;              /* J of the best of all, whatever its number of pieces */
    double bound;               /* proven lower bound of J over all allowed placements */
    double gap;                 /* of_all - bound; 0: proven (to 1e-9 of `nothing`) */
    bool cut;                   /* the node limit ended the search for some k: that no fewer pieces would
                                   do, and the next best, are then not proven */
};

enum place_error { PLACE_OK = 0, PLACE_NO_MEMORY = -1, PLACE_BAD_PROBLEM = -2 };

int place_search(const struct place_problem *problem, struct place_result *result)
    __attribute__((warn_unused_result));
void place_release(struct place_result *result);

#endif
