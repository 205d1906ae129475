/* place_kept.h - the few best placements known, in a fixed order. */
#ifndef LOPSIDE_SOLVE_PLACE_KEPT_H
#define LOPSIDE_SOLVE_PLACE_KEPT_H

#include "solve/place_branch.h"

/* What a bound must stay below to be worth a look; INFINITY while less than PLACE_KEPT are known. */
double place_kept_cutoff(const struct place_hunt *hunt);

/* Takes hunt->load (all sites) with value J in, if it is new and good enough. Order: J (to 1e-12 norm, then
 * fewest pieces, least mass, then lowest plane, position, piece). */
void place_kept_offer(struct place_hunt *hunt, double value);

#endif
