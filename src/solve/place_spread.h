/* place_spread.h - planes where any mass may be used: at a few positions, or at any angle. */
#ifndef LOPSIDE_SOLVE_PLACE_SPREAD_H
#define LOPSIDE_SOLVE_PLACE_SPREAD_H

#include "solve/place_branch.h"

/* The sites from `depth` on (none with pieces) get their best masses; form is what is left for them.
 * Offers what it finds to hunt->kept. 0, or -1 when memory is short. */
int place_spread(struct place_hunt *hunt, size_t depth, const struct place_form *form)
    __attribute__((warn_unused_result));

#endif
