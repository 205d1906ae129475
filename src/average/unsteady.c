#include "average/unsteady.h"

#include <math.h>
#include <stdlib.h>

#include "average/longrun.h"
#include "average/step.h"
#include "average/swing.h"

/* Takes the step off. */
static void level(double complex *z, size_t count, const struct step *step)
{
    for (size_t i = 0; i < count; i++)
        z[i] -= i < step->at ? step->before : step->after;
}

/* Takes the swing off, and then the straight line that is left. */
static void flatten(double complex *z, const double *t, size_t count, const struct swing *swing)
{
    double complex mean = 0, slope = 0;
    double middle = 0, spread = 0, n = (double)count;

    for (size_t i = 0; i < count; i++) {
        z[i] -= swing_at(swing, t[i]);
        mean += z[i] / n;
        middle += t[i] / n;
    }
    for (size_t i = 0; i < count; i++) {
        spread += (t[i] - middle) * (t[i] - middle);
        slope += (z[i] - mean) * (t[i] - middle);
    }
    for (size_t i = 0; i < count; i++)
        z[i] -= mean + (spread > 0 ? slope / spread * (t[i] - middle) : 0);
}

int unsteady_of_blocks(const double complex *vectors, const double *t, size_t count,
                       struct unsteady *out)
{
    struct step step = step_find(vectors, t, count);
    struct swing swing;
    double complex *z = malloc((count + 1) * sizeof *z);
    int result = z ? swing_find(vectors, t, count, &swing) : -1;

    if (result) {
        free(z);
        return -1;
    }
    for (size_t i = 0; i < count; i++)
        z[i] = vectors[i];
    if (step.size > 0 && swing.size > 0 && swing.residual < step.residual) {
        step.size = 0;
        step.t = NAN;
    }
    if (step.size > 0) {
        level(z, count, &step);
        result = swing_find(z, t, count, &swing);
    }
    if (result == 0) {
        flatten(z, t, count, &swing);
        *out = (struct unsteady){.beat = swing.size,
                                 .beat_s = swing.period_s,
                                 .turning_hz = swing.turning_hz,
                                 .step = step.size,
                                 .step_s = step.t,
                                 .wander = longrun_wander(z, count)};
    }
    free(z);
    return result;
}
