#include "average/overall.h"

#include <math.h>

#include "base/angle.h"

void overall_band(double speed_rpm, double *from_hz, double *to_hz)
{
    double half = speed_rpm / 120;

    *from_hz = half < 10 ? half : 10;
    *to_hz = 1000;
}

/* How often `from` must be differentiated to become `to`: acceleration 2, velocity 1. */
static int derivatives(enum quantity from, enum quantity to)
{
    return (int)from - (int)to; /* the enum runs acceleration, velocity, displacement */
}

double overall_rms(const double *orders, const double *amplitude, size_t count, double speed_rpm,
                   enum quantity from, enum quantity to)
{
    double from_hz, to_hz, sum = 0;
    size_t used = 0;

    if (!(speed_rpm > 0))
        return NAN;
    overall_band(speed_rpm, &from_hz, &to_hz);
    for (size_t i = 0; i < count; i++) {
        double hz = orders[i] * speed_rpm / 60, a;
        if (hz < from_hz || hz > to_hz)
            continue;
        a = amplitude[i] * pow(2 * PI * hz, derivatives(from, to));
        sum += a * a / 2;
        used++;
    }
    return used ? sqrt(sum) : NAN;
}

double overall_one_x(const double *orders, const double *amplitude, size_t count)
{
    double best = NAN, nearest = 0.5;

    for (size_t i = 0; i < count; i++) {
        if (fabs(orders[i] - 1) < nearest) {
            nearest = fabs(orders[i] - 1);
            best = amplitude[i];
        }
    }
    return best;
}
