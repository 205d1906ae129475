#include "vet/orders.h"

#include <math.h>

static const double WIDTH = 1.5;        /* spacings on either side: a line between two bins */
static const double GUARD = 3;          /* spacings that a strong line's skirts may reach */
static const double SPACING_MOST = 0.1; /* orders */
static const double SKIRT = 1e-9;       /* rounding of orders printed and read */

static double line_at(const double *orders, const double *amplitude, size_t count, double order,
                      double reach, int derivatives)
{
    double best = NAN;

    for (size_t i = 0; i < count; i++) {
        double a = amplitude[i] * pow(orders[i], derivatives);
        if (fabs(orders[i] - order) <= reach + SKIRT && !(a <= best))
            best = a;
    }
    return best;
}

struct orders orders_of(const double *orders, const double *amplitude, size_t count,
                        int derivatives)
{
    struct orders out = {NAN, NAN, NAN, NAN};
    double spacing, reach, one, most = NAN;

    if (count < 4)
        return out;
    spacing = orders[1] - orders[0];
    reach = WIDTH * spacing;
    one = line_at(orders, amplitude, count, 1, reach, derivatives);
    if (!(one > 0) || !(spacing > 0))
        return out;
    out.two_x = 100 * line_at(orders, amplitude, count, 2, reach, derivatives) / one;
    if (spacing > 0.5 / (2 * WIDTH))
        return out; /* half orders run into whole ones */
    for (double order = 0.5; order < 3; order += 1)
        most = fmax(most, line_at(orders, amplitude, count, order, reach, derivatives));
    out.half_order = 100 * most / one;
    if (spacing > SPACING_MOST)
        return out;
    for (size_t i = 0; i < count; i++) {
        double a = amplitude[i] * pow(orders[i], derivatives);
        double off = fabs(orders[i] - round(2 * orders[i]) / 2);
        if (orders[i] < 0.5 || off <= fmin(GUARD * spacing, 0.2) || a <= out.neighbour)
            continue;
        out.neighbour = a;
        out.neighbour_order = orders[i];
    }
    out.neighbour *= 100 / one;
    return out;
}
