/* whole.h - the stream's records as one JSON document. */
#ifndef LOPSIDE_REPORT_WHOLE_H
#define LOPSIDE_REPORT_WHOLE_H

#include <stddef.h>

#include "base/buffer.h"
#include "report/dossier.h"

/* Appends an array of all records kept in the dossier, one a line, each with its original bytes:
 * first the job record (`length` bytes with its newline), last an `end` that counts them. Failure
 * shows in out->failed. */
void whole_write(const struct dossier *dossier, const char *job, size_t length, struct buffer *out);

#endif
