/* runout.h - slow rolls in a report: readings are shown as they were read, and what is left of them
 * without the runout beside that.
 *
 * As `solve` does it: the mean 1x vector of a displacement probe over the runs of role runout whose
 * reading is used and has phase is taken off that probe's other readings, in every condition. On
 * other sensors, and on readings without phase, a slow roll has no effect.
 */
#ifndef LOPSIDE_REPORT_RUNOUT_H
#define LOPSIDE_REPORT_RUNOUT_H

#include <stdbool.h>

#include "base/buffer.h"
#include "report/dossier.h"

/* True where slow rolls are taken off readings of that sensor: where it is a displacement probe. */
bool runout_has_effect(const struct dossier *d, int sensor);

/* The reading without its probe's runout, with the covariance of both in `widen`; as it is where
 * none is taken off it, and itself where it is of a slow roll. */
struct dossier_reading runout_off(const struct dossier *d, const struct dossier_reading *reading);

/* True where runout_off changes that reading. */
bool runout_comes_off(const struct dossier *d, const struct dossier_reading *reading);

/* Below the readings `first` up to `end` of one run: of a slow roll what it is for; of another run
 * "Without runout: A 80.1 um pk-pk at 57.3 deg lag."; nothing where no runout comes in. */
void runout_words(const struct dossier *d, size_t first, size_t end, struct buffer *text);

/* Below a forecast: that it is of the vibration without runout; NULL where none is taken off.
 * Static text. */
const char *runout_forecast(const struct dossier *d);

#endif
