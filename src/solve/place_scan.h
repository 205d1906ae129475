/* place_scan.h - the sums of one plane whose bound is small, out of trees of part sums. */
#ifndef LOPSIDE_SOLVE_PLACE_SCAN_H
#define LOPSIDE_SOLVE_PLACE_SCAN_H

#include "solve/place_branch.h"

struct place_aim { /* J >= base + 2 Re(conj(slope) (W - center)) + stiffness |W - center|^2 */
    double complex center, slope;
    double stiffness, base;
};

struct place_candidate {
    double bound;
    struct place_load load;
};

struct place_candidates {
    struct place_candidate *candidate; /* sorted by bound, then items; owned */
    size_t count, room;                /* about that many are kept at a time */
    double from, limit;                /* all with from <= bound < limit are in the list */
};

/* Fills the list with the sums from `from` on, lowering `limit` when there are too many. Stops early when the
 * hunt's nodes are used up (hunt->lost then knows). 0, or -1 when memory is short. */
int place_scan_list(struct place_hunt *hunt, const struct place_site *site,
                    const struct place_aim *aim, struct place_candidates *list)
    __attribute__((warn_unused_result));

/* The last plane: offers every sum that can be among the best; form has this one plane. */
void place_scan_last(struct place_hunt *hunt, size_t depth, const struct place_aim *aim,
                     const struct place_form *form);

#endif
