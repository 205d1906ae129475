/* csv.h - a comma-separated table after RFC 4180 that a spreadsheet cannot be made to run.
 *
 * A text cell that a spreadsheet would take for a formula (its first character, behind blanks, is
 * one of = + - @, tab or carriage return) gets an apostrophe in front.
 */
#ifndef LOPSIDE_REPORT_CSV_H
#define LOPSIDE_REPORT_CSV_H

#include "base/buffer.h"

struct csv {
    struct buffer *out; /* borrowed */
    int cells;          /* in the row so far */
};

void csv_text(struct csv *csv, const char *text);  /* from a file or a person; NULL: empty */
void csv_plain(struct csv *csv, const char *text); /* ours: a head; quoted, nothing else */
void csv_number(struct csv *csv, double value);    /* six significant digits; NaN: empty */
void csv_integer(struct csv *csv, long long value);
void csv_row(struct csv *csv);                            /* ends the row with CR LF */
void csv_head(struct csv *csv, const char *const *heads); /* NULL-terminated; a whole row */

#endif
