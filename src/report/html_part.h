/* html_part.h - headings, paragraphs and tables of a page. */
#ifndef LOPSIDE_REPORT_HTML_PART_H
#define LOPSIDE_REPORT_HTML_PART_H

#include "base/buffer.h"
#include "report/table.h"

void html_part_heading(struct buffer *out, const char *heading); /* ours: not escaped */
/* A paragraph of that class; the text is escaped. */
void html_part_say(struct buffer *out, const char *class, const char *format, ...)
    __attribute__((format(printf, 3, 4)));
/* What a phrase built as one element, escaped; releases `text` and takes over its failure. */
void html_part_take(struct buffer *out, const char *element, struct buffer *text);
/* All rows, escaped; nothing without rows. Releases the table. */
void html_part_table(struct buffer *out, struct table *table);

#endif
