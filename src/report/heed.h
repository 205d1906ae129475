/* heed.h - what must be read before anything is done: it stands in the box at the answer, as well
 * as wherever it belongs. */
#ifndef LOPSIDE_REPORT_HEED_H
#define LOPSIDE_REPORT_HEED_H

#include "base/buffer.h"
#include "report/dossier.h"

#define HEED_COUNT 3

/* Line `which` of 0..HEED_COUNT-1: that a run already carries the answer, that these runs cannot
 * show a wrong counting sense, that the sheet's own tolerance is not met. Nothing where it does not
 * hold. */
void heed_line(struct buffer *out, const struct dossier *dossier, size_t which);

/* "met", "NOT MET", "not proven" or "not known": a residual against its tolerance. Static text. */
const char *heed_within(const struct residual_record *r);

#endif
