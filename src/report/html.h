/* html.h - the report as one page: no outside file, no script, made to be printed.
 *
 * Everything that comes from the stream passes svg_escape.
 */
#ifndef LOPSIDE_REPORT_HTML_H
#define LOPSIDE_REPORT_HTML_H

#include "base/buffer.h"
#include "report/dossier.h"

/* Takes what is in the buffer (which may have failed) and leaves it empty. 0, or the failure's code, which
 * ends the writing. */
typedef int (*html_spill)(struct buffer *out);
#define HTML_SPILL 65536 /* bytes: a page of thousands of drawings is not held whole; our choice */

/* Makes the whole page of a closed dossier that kept its traces in `out` (empty), and spills it: at the end, and between
 * two recordings where it is long. job: the job record's line, `length` bytes. Gives what `spill` gave. */
int html_write(const struct dossier *dossier, const char *job, size_t length, struct buffer *out,
               html_spill spill) __attribute__((warn_unused_result));

#endif
