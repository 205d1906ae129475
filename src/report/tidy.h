/* tidy.h - one tidy table of the dossier for a spreadsheet. */
#ifndef LOPSIDE_REPORT_TIDY_H
#define LOPSIDE_REPORT_TIDY_H

#include "base/buffer.h"
#include "report/dossier.h"

enum tidy_what {
    TIDY_READINGS,
    TIDY_RESPONSES,
    TIDY_CORRECTION,
    TIDY_PLACEMENT,
    TIDY_FORECAST,
    TIDY_FINDINGS,
    TIDY_SPECTRUM
};

/* The names of the tables in the enum's order, NULL-terminated. */
extern const char *const tidy_names[];

/* Appends the table, head first; the head alone where there is nothing. Failure shows in
 * out->failed. */
void tidy_write(const struct dossier *dossier, enum tidy_what what, struct buffer *out);

#endif
