#include "solve/tolerance.h"

#include <math.h>

#include "base/angle.h"

double tolerance_grade(double grade_mm_s, double mass, double rpm)
{
    return grade_mm_s * 1e-3 * mass / (rpm * PI / 30);
}

double tolerance_api_4wn(double journal_load, double rpm)
{
    return 6350e-6 * journal_load / rpm; /* 1 g mm = 1e-6 kg m */
}

void tolerance_loads(double span, double centre, double share[2])
{
    share[0] = (span - centre) / span;
    share[1] = centre / span;
}

void tolerance_shares(double span, double centre, bool overhung, double share[2])
{
    double most = overhung ? 1.3 : 0.7, least = 0.3;
    tolerance_loads(span, centre, share);
    for (int i = 0; i < 2; i++)
        share[i] = fmin(most, fmax(least, fabs(share[i])));
}
