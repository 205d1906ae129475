/* text_audit.h - the table of many recordings: one line a recording and sensor, and what it amounts
 * to. */
#ifndef LOPSIDE_REPORT_TEXT_AUDIT_H
#define LOPSIDE_REPORT_TEXT_AUDIT_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/table.h"

void text_audit_summary(const struct dossier *dossier, struct buffer *out);
/* The table alone, to be printed and released by the caller. */
void text_audit_rows(const struct dossier *dossier, struct table *table);
void text_audit_table(const struct dossier *dossier, struct buffer *out);

#endif
