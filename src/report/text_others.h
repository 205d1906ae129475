/* text_others.h - the figures of the next step, for the text report: other placements, trial
 * weights, the answer with other weights on.
 *
 * Each appends nothing where the step has no such figures.
 */
#ifndef LOPSIDE_REPORT_TEXT_OTHERS_H
#define LOPSIDE_REPORT_TEXT_OTHERS_H

#include "base/buffer.h"
#include "report/dossier.h"

/* What solve found second and third best. */
void text_others_write(const struct dossier *dossier, struct buffer *out);

/* For each trial weight, where stored responses tell it, the sensor that will change most and by
 * how much. */
void text_others_trials(const struct dossier *dossier, struct buffer *out);

/* The ideal weight with what is mounted left on or taken off; one weight a plane for all that will
 * be on. */
void text_others_same(const struct dossier *dossier, struct buffer *out);

#endif
