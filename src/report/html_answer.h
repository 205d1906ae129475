/* html_answer.h - the first part of the page: what to do now, drawn and said. */
#ifndef LOPSIDE_REPORT_HTML_ANSWER_H
#define LOPSIDE_REPORT_HTML_ANSWER_H

#include "base/buffer.h"
#include "report/dossier.h"

void html_answer_write(const struct dossier *dossier, struct buffer *out);

#endif
