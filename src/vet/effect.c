#include "vet/effect.h"

#include <math.h>

#include "base/angle.h"

struct effect effect_of(double complex before, const double before_cov[3], double complex after,
                        const double after_cov[3], double repeatability)
{
    double variance = before_cov[0] + before_cov[2] + after_cov[0] + after_cov[2] +
                      4 * repeatability * repeatability;
    double size = cabs(after - before);
    struct effect effect;

    effect.errors = size > 0 || isnan(size) ? size / sqrt(variance) : 0;
    effect.amplitude_pct =
        size > 0 || isnan(size) ? 100 * fabs(cabs(after) - cabs(before)) / cabs(before) : 0;
    effect.lag_deg = fabs(angle_wrap_180((carg(after) - carg(before)) * 180 / PI));
    if (cabs(before) == 0 || cabs(after) == 0) /* what is nothing has no lag */
        effect.lag_deg = 0;
    return effect;
}
