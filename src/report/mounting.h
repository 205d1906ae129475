/* mounting.h - what must be on the rotor, and what off it, before the answer is fitted.
 *
 * The instruction names every weight that the runs list: whoever stands at the machine cannot know
 * which of them a report calls a trial weight.
 */
#ifndef LOPSIDE_REPORT_MOUNTING_H
#define LOPSIDE_REPORT_MOUNTING_H

#include "base/buffer.h"
#include "report/dossier.h"

/* What the answer takes as on the rotor, and what to do so that it is: "Relative to the rotor as
 * found: first take off all that the runs list, ...", what to put back where a run removed
 * material, or the weights that stay and those that come off. `name`: a record's relative_to. */
void mounting_relative_to(struct buffer *out, const struct job *job, const char *name);

/* A run that was measured with more than the answer starts from and already carries just what is
 * placed, or whose used readings meet every target of the forecast: "Run 'trim' already carries
 * ...". Nothing where there is none, or nothing is placed. */
void mounting_carried(struct buffer *out, const struct dossier *dossier);

#endif
