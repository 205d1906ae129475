/* close_to.h - cmocka compares floats only; this compares doubles with a tolerance in their unit. */
#ifndef LOPSIDE_TESTS_CLOSE_TO_H
#define LOPSIDE_TESTS_CLOSE_TO_H

#include <math.h>

/* Fails with both values unless |actual - expected| <= tolerance; a NaN always fails. */
#define assert_close(actual, expected, tolerance)                                                  \
    do {                                                                                           \
        double close_to_a = (actual), close_to_e = (expected), close_to_t = (tolerance);           \
        if (!(fabs(close_to_a - close_to_e) <= close_to_t))                                        \
            fail_msg("%s is %.12g, not %.12g within %g", #actual, close_to_a, close_to_e,          \
                     close_to_t);                                                                  \
    } while (0)

#endif
