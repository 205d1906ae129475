/* html_judged.h - what a page says of the readings' worth: findings, zones, predicted against
 * measured. */
#ifndef LOPSIDE_REPORT_HTML_JUDGED_H
#define LOPSIDE_REPORT_HTML_JUDGED_H

#include "base/buffer.h"
#include "report/dossier.h"

/* Refusals, then cautions in full, then the count of what was in order. */
void html_judged_findings(const struct dossier *dossier, struct buffer *out);
/* Every check that was made, one a row. */
void html_judged_checks(const struct dossier *dossier, struct buffer *out);
/* The records `zone` and `compared`; nothing where there are none. */
void html_judged_outcomes(const struct dossier *dossier, struct buffer *out);

#endif
