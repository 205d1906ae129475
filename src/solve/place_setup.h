/* place_setup.h - from the problem to the hunt: checks, the objective's rows, what each plane can carry. */
#ifndef LOPSIDE_SOLVE_PLACE_SETUP_H
#define LOPSIDE_SOLVE_PLACE_SETUP_H

#include "solve/place_branch.h"

/* Whether every number of the problem is finite and in its legal range. */
bool place_setup_legal(const struct place_problem *problem);

/* Sites, forms, and "nothing added" as the first kept placement. Planes without influence on any row get no
 * site: nothing is ever put there. Returns 0, or -1 when memory is short; release in any case. */
int place_setup_init(struct place_hunt *hunt, const struct place_problem *problem)
    __attribute__((warn_unused_result));

/* At most `most` pieces a plane from now on. Same returns. */
int place_setup_pieces(struct place_hunt *hunt, const struct place_problem *problem, int most)
    __attribute__((warn_unused_result));

void place_setup_release(struct place_hunt *hunt);

#endif
