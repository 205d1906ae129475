/* text_others.h - the next best placements, for the text report. */
#ifndef LOPSIDE_REPORT_TEXT_OTHERS_H
#define LOPSIDE_REPORT_TEXT_OTHERS_H

#include "base/buffer.h"
#include "report/dossier.h"

/* Appends what solve found second and third best, from the figures of the next step; nothing where
 * it names none. */
void text_others_write(const struct dossier *dossier, struct buffer *out);

#endif
