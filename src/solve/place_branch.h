/* place_branch.h - branch and bound over placements with at most so many pieces a plane.
 *
 * Planes with a stock come first and are settled one after another. For the plane at hand the relaxation
 * of what is left gives a point w^, a slope g and a stiffness s with
 *     J >= c + 2 Re(conj(g) (W - w^)) + s |W - w^|^2      for every W on this plane,
 * so its sums are taken nearest first, out of trees of part sums, until the bound passes the best known.
 * Then the planes with any mass: the relaxation is split on whether a position is used.
 */
#ifndef LOPSIDE_SOLVE_PLACE_BRANCH_H
#define LOPSIDE_SOLVE_PLACE_BRANCH_H

#include "solve/place.h"
#include "solve/place_form.h"
#include "solve/place_region.h"
#include "solve/place_sums.h"

#define PLACE_KEPT 3 /* the best and the two next best */

enum place_kind { PLACE_PIECES, PLACE_POSITIONS, PLACE_ANYWHERE };

/* What stands on one plane: items rising; unused ones PLACE_NO_ITEM. */
struct place_load {
    double complex w;
    uint32_t item[PLACE_PIECES_MOST]; /* PIECES: position*stock+piece; POSITIONS: position; ANYWHERE: 0 */
    double mass[PLACE_PIECES_MOST];
};

struct place_found {
    double value;
    int pieces, largest; /* in all; on one plane */
    struct place_load *load; /* planes, in the order of the hunt; owned */
};

struct place_site { /* one plane that has any influence */
    enum place_kind kind;
    size_t plane;            /* in the problem */
    size_t positions;
    double complex *e;       /* positions unit vectors with the plane's sign; owned */
    struct place_stock stock;
    double cap, total;       /* finite limits of the continuous masses: at one position, of all */
    double *caps;            /* positions, what each may still take; finite; owned */
    int pieces;              /* now allowed */
    struct place_region region;
    struct place_sums parts[2]; /* by depth: large and small */
    size_t part_count;       /* trees whose points are added */
    unsigned char part[PLACE_PIECES_MOST]; /* which of parts */
    unsigned char *state;    /* POSITIONS: open, in, out; owned */
};

struct place_hunt {
    size_t sites;
    struct place_site *site;    /* PIECES first, then POSITIONS, then ANYWHERE; owned */
    struct place_form form;     /* of the sites, in their order */
    double norm;                /* J of nothing added, > 0 */
    bool fine;                  /* sums so dense or continuous that 1e-9 norm counts as equal */
    long nodes;                 /* left */
    double lost;                /* least bound of what was left unexplored; INFINITY: all was explored */
    struct place_found kept[PLACE_KEPT];
    size_t count;
    struct place_load *load;    /* of the sites settled so far; owned */
};

/* Improves hunt->kept (which holds valid placements) over all placements allowed by the sites' present
 * `pieces`. Sets lost. Returns 0, or -1 when memory is short. */
int place_branch(struct place_hunt *hunt) __attribute__((warn_unused_result));

#endif
