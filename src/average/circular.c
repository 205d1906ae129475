#include "average/circular.h"

#include <math.h>

#include "base/angle.h"

/* Below this R the direction of the sum is rounding: far under any resultant of real readings. */
static const double RESULTANT_LEAST = 1e-12;

static struct circular from_sums(double c, double s, double total)
{
    struct circular out = {NAN, NAN, NAN, NAN, NAN};
    double r = hypot(c, s) / total;

    if (!(total > 0) || isnan(r))
        return out;
    if (r > 1) /* by rounding, where all directions are equal */
        r = 1;
    out.resultant = r;
    out.variance = 1 - r;
    out.deviation_deg = sqrt(2 * (1 - r)) * 180 / PI;
    out.sd_deg = sqrt(fabs(2 * log(r))) * 180 / PI;
    if (r > RESULTANT_LEAST)
        out.mean_deg = angle_wrap_360(atan2(s, c) * 180 / PI);
    return out;
}

struct circular circular_of_vectors(const double complex *vectors, size_t count)
{
    double c = 0, s = 0;

    for (size_t i = 0; i < count; i++) {
        double length = cabs(vectors[i]); /* 0: 0/0 is the NaN that is promised */
        c += creal(vectors[i]) / length;
        s += cimag(vectors[i]) / length;
    }
    return from_sums(c, s, (double)count);
}
