/* A slice of bench_solve: what readings become, from the model to the forecast, holds as often as
 * it says. Bars of the pooled slice: 93 to 97 %; the seeds are fixed, so that the slice is the same
 * everywhere. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <cmocka.h>

#include "solve_campaign.h"

#define JOBS 24 /* of each kind */

static struct solve_tally pooled(double least, double most)
{
    struct solve_tally t = {0};
    for (size_t planes = 1; planes <= 3; planes++)
        for (int kind = 0; kind < 3; kind++) {
            struct solve_campaign c = {planes,
                                       least,
                                       most,
                                       kind == 1 ? 2 : 0,
                                       kind == 2,
                                       JOBS,
                                       70 * planes + (size_t)kind};
            solve_campaign_run(&c, &t);
        }
    print_message("ranges %d of %d, ellipses %d of %d\n", t.held, t.ranges, t.inside, t.ellipses);
    return t;
}

static void test_large_effects(void **state)
{
    (void)state;
    struct solve_tally t = pooled(20, 50);
    assert_true(t.held > 0.93 * t.ranges && t.held < 0.97 * t.ranges);
    assert_true(t.inside > 0.93 * t.ellipses && t.inside < 0.97 * t.ellipses);
}

static void test_small_effects(void **state)
{
    (void)state;
    struct solve_tally t = pooled(5, 20);
    assert_true(t.held > 0.93 * t.ranges && t.held < 0.97 * t.ranges);
    assert_true(t.inside > 0.93 * t.ellipses);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_large_effects),
                                       cmocka_unit_test(test_small_effects)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
