#include "average/alias.h"

#include <math.h>
#include <stdbool.h>

#include "base/angle.h"

#define SIDE 4   /* lines looked at on each side of 1x */
#define FLOOR 10 /* lines on each side, from the fifth on, whose least ones are the noise */
static const int FOLDS = 3;
static const double BETTER = 1.0 / 3, GOOD = 0.25; /* see the header */
static const double WEAKEST =
    0.03; /* of a beat that is left in the blocks; less demands any size */

static double sinc(double x)
{
    return fabs(x) < 1e-9 ? 1 : sin(PI * x) / (PI * x);
}

/* Index of the line at order 1 with SIDE + 1 lines on both sides; count: none. */
static size_t first_order(const double *orders, size_t count)
{
    for (size_t i = SIDE + 1; i + SIDE + 1 < count; i++)
        if (fabs(orders[i] - 1) < 1e-6)
            return i;
    return count;
}

/* The mean square of what is no line around 1x: of the lines from SIDE + 1 to FLOOR away, the lower
 * half. */
static double floor_around(const double *amplitude, size_t count, size_t one)
{
    double squares[2 * FLOOR], sum = 0;
    size_t used = 0;

    for (size_t i = one > FLOOR ? one - FLOOR : 1; i <= one + FLOOR && i < count; i++) {
        double square = amplitude[i] * amplitude[i];
        size_t k = used;
        if (i + SIDE >= one && i <= one + SIDE)
            continue;
        for (; k > 0 && squares[k - 1] > square; k--)
            squares[k] = squares[k - 1];
        squares[k] = square;
        used++;
    }
    for (size_t i = 0; i < (used + 1) / 2; i++)
        sum += squares[i] / (double)((used + 1) / 2);
    return sum;
}

/* Sum of squares between the lines beside 1x and those that a tone at `order` gives. */
static double misfit(const double *amplitude, size_t one, double spacing, double floor,
                     double order, double size)
{
    double sum = 0, place = (order - 1) / spacing;

    for (int i = -SIDE; i <= SIDE; i++) {
        double a = amplitude[(size_t)((long)one + i)];
        double line = sqrt(fmax(0, a * a - floor)), tone = size * fabs(sinc(place - i));
        if (i != 0)
            sum += (line - tone) * (line - tone);
    }
    return sum;
}

double alias_turning(const double *orders, const double *amplitude, size_t count, double speed_hz,
                     double block_s, double turning_hz, double size)
{
    size_t one = first_order(orders, count);
    double best = turning_hz, least = INFINITY, plain = INFINITY, spacing, floor, whole;

    if (one == count || isnan(turning_hz) || !(speed_hz > 0) || !(block_s > 0))
        return turning_hz;
    spacing = orders[one + 1] - orders[one];
    if (!(spacing > 0) || fabs(orders[one + SIDE] - 1 - SIDE * spacing) > 1e-6)
        return turning_hz;
    floor = floor_around(amplitude, count, one);
    whole = misfit(amplitude, one, spacing, floor, 1, 0);
    for (int k = -FOLDS; k <= FOLDS; k++) {
        double f = turning_hz + k / block_s, left = fabs(sinc(f * block_s)), m;
        if (left < WEAKEST)
            continue;
        m = misfit(amplitude, one, spacing, floor, 1 - f / speed_hz, size / left);
        if (k == 0)
            plain = m;
        if (m < least) {
            least = m;
            best = f;
        }
    }
    return least < BETTER * plain && least < GOOD * whole ? best : turning_hz;
}
