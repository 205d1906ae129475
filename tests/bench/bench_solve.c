/* bench_solve.c - coverage of forecasts and correction ellipses on jobs drawn from the stated
 * model.
 *
 * Prints, for each kind of job, how often the 95 % range of the forecast held the next reading and
 * the 95 % ellipse the true least-squares weight. Usage: bench_solve [JOBS], 2000 by default. Bars:
 * ranges 93 to 97 %; ellipses the same at 20 standard errors or more, 93 % or more below.
 */
#include <stdio.h>
#include <stdlib.h>

#include "solve_campaign.h"

int main(int argc, char **argv)
{
    int jobs = argc > 1 ? atoi(argv[1]) : 2000;
    static const double effects[][2] = {{5, 20}, {20, 50}};
    setvbuf(stdout, NULL, _IOLBF, 0);
    for (size_t planes = 1; planes <= 3; planes++)
        for (size_t e = 0; e < 2; e++)
            for (int kind = 0; kind < 3; kind++) {
                struct solve_campaign c = {planes,
                                           effects[e][0],
                                           effects[e][1],
                                           kind == 1 ? 2 : 0,
                                           kind == 2,
                                           jobs,
                                           1000 * planes + 10 * e + (size_t)kind};
                struct solve_tally t = {0};
                solve_campaign_run(&c, &t);
                printf("%zu planes, effects of %2.0f to %2.0f s.e., %-22s ranges %.1f %%, ellipses "
                       "%.1f %%\n",
                       planes, c.least, c.most,
                       kind == 1   ? "every second repeated:"
                       : kind == 2 ? "one plane stored:"
                                   : "no repeats:",
                       100.0 * t.held / t.ranges, 100.0 * t.inside / t.ellipses);
            }
    return 0;
}
