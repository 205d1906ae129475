#include "vet/orders.h"

#include <math.h>

static const double WIDTH = 1.5;        /* spacings on either side: a line between two bins */
static const double WIDTH_MOST = 0.2;   /* orders, so that neighbouring half orders stay apart */
static const double GUARD = 1;          /* spacings beside a multiple of 1/2 that belong to it */
static const double SPACING_MOST = 0.1; /* orders */
static const double ROUNDING = 1e-9;    /* of orders printed and read */

static double line_at(const double *orders, const double *amplitude, size_t count, double order,
                      double reach, int derivatives)
{
    double best = NAN;

    for (size_t i = 0; i < count; i++) {
        double a = amplitude[i] * pow(orders[i], derivatives);
        if (fabs(orders[i] - order) <= reach + ROUNDING && !(a <= best))
            best = a;
    }
    return best;
}

/* The line i where it belongs to no multiple of half an order; else, and below half of 1x, 0. */
static double beside(const double *orders, const double *amplitude, size_t i, double spacing,
                     int derivatives)
{
    double off = fabs(orders[i] - round(2 * orders[i]) / 2);

    if (orders[i] < 0.5 || off <= GUARD * spacing + ROUNDING)
        return 0;
    return amplitude[i] * pow(orders[i], derivatives);
}

struct orders orders_of(const double *orders, const double *amplitude, size_t count,
                        int derivatives)
{
    struct orders out = {NAN, NAN, NAN, NAN};
    double spacing, reach, one, most = NAN;

    if (count < 4)
        return out;
    spacing = orders[1] - orders[0];
    reach = fmin(WIDTH * spacing, WIDTH_MOST);
    one = line_at(orders, amplitude, count, 1, reach, derivatives);
    if (!(one > 0) || !(spacing > 0))
        return out;
    out.two_x = 100 * line_at(orders, amplitude, count, 2, reach, derivatives) / one;
    if (spacing > 0.5 + ROUNDING)
        return out; /* half orders have no line of their own */
    for (double order = 0.5; order < 3; order += 1)
        most = fmax(most, line_at(orders, amplitude, count, order, reach, derivatives));
    out.half_order = 100 * most / one;
    if (spacing > SPACING_MOST)
        return out;
    for (size_t i = 1; i + 1 < count && orders[i + 1] - orders[i] < 2 * spacing; i++) {
        double a = beside(orders, amplitude, i - 1, spacing, derivatives);
        double b = beside(orders, amplitude, i, spacing, derivatives);
        double c = beside(orders, amplitude, i + 1, spacing, derivatives);
        double size = sqrt(a * a + b * b + c * c);
        if (b < a || b < c || !(b > 0) || size <= out.neighbour)
            continue;
        out.neighbour = size;
        out.neighbour_order = orders[i];
    }
    out.neighbour *= 100 / one;
    return out;
}

double orders_line(const double (*lines)[2], size_t count, double speed_hz, int derivatives,
                   double *hz)
{
    double most = 0;

    *hz = NAN;
    for (size_t i = 0; i < count; i++) {
        double order = lines[i][0] / speed_hz, size = lines[i][1] * pow(order, derivatives);
        if (order < 0.5 || !(size > most))
            continue;
        most = size;
        *hz = lines[i][0];
    }
    return most;
}
