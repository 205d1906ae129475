/* solve_campaign.h - jobs drawn from the model that the solver states, and how often what it says
 * holds.
 *
 * Shared by a slice in the unit tests and the full campaign of the bench.
 */
#ifndef LOPSIDE_TESTS_UNIT_SOLVE_CAMPAIGN_H
#define LOPSIDE_TESTS_UNIT_SOLVE_CAMPAIGN_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

struct solve_campaign {
    size_t planes;      /* 1 to 3; one sensor more than that */
    double least, most; /* effect of a trial on its strongest sensor, standard errors of a change */
    int repeats;        /* as-found runs besides the first, in every second job */
    bool stored;        /* one plane's responses are stored, its trial run is left out */
    int jobs;
    uint64_t seed;
};

struct solve_tally {
    int ranges, held;     /* forecasts of the next reading */
    int ellipses, inside; /* of the least-squares weight */
};

/* Draws the jobs, runs readings to forecast through the solver's kernels, adds to the tally. */
void solve_campaign_run(const struct solve_campaign *campaign, struct solve_tally *tally);

#endif
