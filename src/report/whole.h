/* whole.h - the stream's records as one JSON document.
 *
 * An array of all records, one a line, each with its original bytes: first the job record, last an
 * `end` that counts them. The middle is the dossier's `text` as it stands (kept lines), so that
 * nothing is copied twice.
 */
#ifndef LOPSIDE_REPORT_WHOLE_H
#define LOPSIDE_REPORT_WHOLE_H

#include <stddef.h>

#include "base/buffer.h"
#include "report/dossier.h"

/* What stands before the dossier's text: `job` is the job record, `length` bytes, with or without
 * its newline. */
void whole_head(const char *job, size_t length, struct buffer *out);

/* What stands behind it. */
void whole_tail(const struct dossier *dossier, struct buffer *out);

#endif
