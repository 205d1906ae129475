/* text.h - the report as plain text of 80 columns: what an analyst reads at the machine. */
#ifndef LOPSIDE_REPORT_TEXT_H
#define LOPSIDE_REPORT_TEXT_H

#include "base/buffer.h"
#include "report/dossier.h"

/* Appends the whole report of a closed dossier; failure shows in out->failed. */
void text_write(const struct dossier *dossier, struct buffer *out);

#endif
