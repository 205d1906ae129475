/* bench_track_table.c - the acceptance table of tracking with more recordings than the suite has
 * time for.
 *
 *     bench_track_table [RECORDINGS [ROW]]        default 1000 a row, all rows; rows count from 0
 *
 * Columns: shape of the tacho, samples a turn, noise; bias of clean recordings (harmonics to 10x,
 * speed wander of 2 %), efficiency against the Cramer-Rao bound, how often the 95 % region holds
 * the truth. */
#include "unit/track_campaign.h"

int main(int argc, char **argv)
{
    int recordings = argc > 1 ? atoi(argv[1]) : 1000;
    long only = argc > 2 ? atol(argv[2]) : -1;

    for (size_t i = 0; recordings > 0 && i < CAMPAIGN_ROWS; i++) {
        if (only >= 0 && (size_t)only != i) {
            continue;
        }
        struct campaign_result result = campaign_run(&campaign_rows[i], recordings);

        campaign_print(&campaign_rows[i], &result);
    }
    return 0;
}
