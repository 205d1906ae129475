/* text_outcomes.h - what stands beside the answer, for the text report: static and couple parts,
 * vibration zones, a corrected run against what was predicted for it.
 *
 * Each appends nothing where the stream has no such record.
 */
#ifndef LOPSIDE_REPORT_TEXT_OUTCOMES_H
#define LOPSIDE_REPORT_TEXT_OUTCOMES_H

#include "base/buffer.h"
#include "report/dossier.h"

void text_outcomes_parts(const struct dossier *dossier, struct buffer *out);
void text_outcomes_zones(const struct dossier *dossier, struct buffer *out);
void text_outcomes_compared(const struct dossier *dossier, struct buffer *out);

#endif
