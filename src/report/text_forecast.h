/* text_forecast.h - what the answer will leave: 1x before and after, and the next reading. */
#ifndef LOPSIDE_REPORT_TEXT_FORECAST_H
#define LOPSIDE_REPORT_TEXT_FORECAST_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/table.h"

void text_forecast_write(const struct dossier *dossier, struct buffer *out);

/* The table alone, to be printed and released by the caller. */
void text_forecast_table(const struct dossier *dossier, struct table *table);

/* What a forecast is not about, and what its figure "after" is. */
extern const char text_forecast_1x_only[], text_forecast_after[];

/* Where the figure "before", which is fitted to all runs, differs visibly from the reading itself:
 * what was read; and which targets were converted to what their sensors show. Else nothing. */
void text_forecast_fitted(const struct dossier *dossier, struct buffer *text);

/* What "not forecast" in that table means; NULL where it is not in it. Static text. */
const char *text_forecast_blind(const struct table *table);

/* "This will not meet the target at DE-H: 5.22 expected, target 1.8 mm/s rms." of that forecast;
 * nothing where it has no target, or even odds to meet it. */
void text_forecast_missed(const struct dossier *dossier, size_t forecast, struct buffer *text);

#endif
