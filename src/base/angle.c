#include "base/angle.h"

#include <math.h>

double angle_wrap_360(double deg)
{
    double r = fmod(deg, 360.0);
    if (r < 0)
        r += 360.0;
    return r >= 360.0 ? 0.0 : r + 0.0; /* -1e-17 + 360 rounds up; -0 becomes 0 */
}

double angle_wrap_180(double deg)
{
    double r = angle_wrap_360(deg);
    return r > 180.0 ? r - 360.0 : r;
}

double angle_of(double complex z)
{
    if (z == 0)
        return 0.0;
    return angle_wrap_360(carg(z) * (180.0 / PI));
}

double complex angle_vector(double amplitude, double deg)
{
    double r = deg * (PI / 180.0);
    return CMPLX(amplitude * cos(r), amplitude * sin(r));
}
