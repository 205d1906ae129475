/* place_region.h - convex sets of complex weights: what one plane can reach when pieces may be cut.
 *
 * With unit vectors e_i at the allowed positions the set is { sum m_i e_i : 0 <= m_i <= cap_i, sum m_i <= total },
 * a convex polygon. Where any angle is allowed it is the disc of radius `total`.
 */
#ifndef LOPSIDE_SOLVE_PLACE_REGION_H
#define LOPSIDE_SOLVE_PLACE_REGION_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

struct place_region {
    bool disc;
    double radius;           /* disc, about 0; kg */
    double complex *corners; /* polygon, counter-clockwise; owned */
    size_t count;            /* 1: a point; 2: a segment */
};

/* The disc of that radius (>= 0, finite). */
void place_region_disc(struct place_region *region, double radius);

/* The polygon of `count` unit vectors `e` (complex, length 1), cap[count] and `total` finite and >= 0, kg.
 * count 0 gives the point 0. Returns 0, or -1 when memory is short. Release it in any case. */
int place_region_polygon(struct place_region *region, const double complex *e, size_t count,
                         const double *cap, double total) __attribute__((warn_unused_result));

/* The least Re(conj(g) x) over x in the region; 0 vectors give 0. */
double place_region_least(const struct place_region *region, double complex g);

/* Whether x lies inside; points and segments have no inside. */
bool place_region_holds(const struct place_region *region, double complex x);

/* Splits w into masses m[count] (kg, written) at the positions e with the least sum, 0 <= m_i <=
 * cap[i] (which may be INFINITY), at most two of them neither 0 nor cap[i] (a basic solution of the linear programme). Returns whether that is
 * possible to 1e-9 of |w|. The two-position case is the usual split of a weight between two blades. */
bool place_region_split(const double complex *e, size_t count, const double *cap, double complex w,
                        double *m);

void place_region_release(struct place_region *region);

#endif
