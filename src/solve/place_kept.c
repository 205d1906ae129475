/* place_kept.c - see place_kept.h. */
#include "solve/place_kept.h"

#include <math.h>
#include <string.h>

#define TIE 1e-12  /* of norm: rounding of J */
#define FINE 1e-9  /* of norm: what place.h calls proven */

double place_kept_cutoff(const struct place_hunt *hunt)
{
    if (hunt->count < PLACE_KEPT) {
        return INFINITY;
    }
    return hunt->kept[PLACE_KEPT - 1].value + (hunt->fine ? -FINE : TIE) * hunt->norm;
}

/* By plane of the problem, then item; 0 when the same things stand in the same places. */
static int load_order(const struct place_hunt *hunt, const struct place_load *a,
                      const struct place_load *b)
{
    int order = 0;
    size_t first = SIZE_MAX;
    for (size_t s = 0; s < hunt->sites; s++) {
        for (size_t i = 0; i < PLACE_PIECES_MOST && hunt->site[s].plane < first; i++) {
            if (a[s].item[i] != b[s].item[i]) {
                order = a[s].item[i] < b[s].item[i] ? -1 : 1;
                first = hunt->site[s].plane;
            }
        }
    }
    return order;
}

static void count_pieces(const struct place_hunt *hunt, const struct place_load *load, int *all,
                         int *largest)
{
    *all = *largest = 0;
    for (size_t s = 0; s < hunt->sites; s++) {
        int here = 0;
        while (here < PLACE_PIECES_MOST && load[s].item[here] != PLACE_NO_ITEM) {
            here++;
        }
        *all += here;
        *largest = here > *largest ? here : *largest;
    }
}

static double mass_of(const struct place_hunt *hunt, const struct place_load *load)
{
    double mass = 0;
    for (size_t s = 0; s < hunt->sites; s++) {
        for (size_t i = 0; i < PLACE_PIECES_MOST; i++) {
            mass += load[s].item[i] != PLACE_NO_ITEM ? load[s].mass[i] : 0;
        }
    }
    return mass;
}

void place_kept_offer(struct place_hunt *hunt, double value)
{
    int all, largest;
    count_pieces(hunt, hunt->load, &all, &largest);
    size_t at = hunt->count;
    for (size_t i = hunt->count; i-- > 0;) {
        const struct place_found *found = &hunt->kept[i];
        int order = load_order(hunt, hunt->load, found->load);
        if (order == 0) {
            return;
        }
        double excess = value - found->value;
        if (fabs(excess) <= TIE * hunt->norm) {
            double more = mass_of(hunt, hunt->load) - mass_of(hunt, found->load);
            bool alike = fabs(more) <= 1e-9 * mass_of(hunt, found->load);
            excess = all != found->pieces ? all - found->pieces : alike ? order : more;
        }
        if (excess < 0) {
            at = i;
        }
    }
    if (at == PLACE_KEPT) {
        return;
    }
    size_t last = hunt->count < PLACE_KEPT ? hunt->count++ : PLACE_KEPT - 1;
    struct place_found spare = hunt->kept[last];
    memmove(&hunt->kept[at + 1], &hunt->kept[at], (last - at) * sizeof spare);
    memcpy(spare.load, hunt->load, hunt->sites * sizeof *spare.load);
    spare.value = value;
    spare.pieces = all;
    spare.largest = largest;
    hunt->kept[at] = spare;
}
