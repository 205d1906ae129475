/* html.h - the report as one page: no outside file, no script, made to be printed.
 *
 * Everything that comes from the stream passes svg_escape.
 */
#ifndef LOPSIDE_REPORT_HTML_H
#define LOPSIDE_REPORT_HTML_H

#include "base/buffer.h"
#include "report/dossier.h"

/* Appends the whole page of a closed dossier that kept its traces. job: the job record's line,
 * `length` bytes. Failure shows in out->failed. */
void html_write(const struct dossier *dossier, const char *job, size_t length, struct buffer *out);

#endif
