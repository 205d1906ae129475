/* text_readings.h - the measured part of the text report: readings, responses, findings. */
#ifndef LOPSIDE_REPORT_TEXT_READINGS_H
#define LOPSIDE_REPORT_TEXT_READINGS_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/shown.h"
#include "report/table.h"

/* A reading as its sensor shows it, vet's widening included. Its half widths are 1.96 standard
 * deviations of `cov`, each of amplitude and lag by itself: `cov` is made to be read so, few blocks
 * and slow noise allowed for, and Student's t for its blocks would count these twice. */
struct shown text_readings_shown(const struct dossier *dossier,
                                 const struct dossier_reading *reading);

/* The readings of one run and condition from `i` on as a table (to be released by the caller), and what
 * stands above it. Gives the next group's first. */
size_t text_readings_group(const struct dossier *dossier, size_t i, struct table *table)
    __attribute__((warn_unused_result));
void text_readings_group_heading(const struct dossier *d, const struct reading_record *r,
                                 struct buffer *text);
/* Responses as a table (to be released by the caller); gives the mass (kg) they are stated for. */
double text_readings_response_table(const struct dossier *dossier, struct table *table)
    __attribute__((warn_unused_result));

void text_readings_all(const struct dossier *dossier, struct buffer *out);
/* What stands above the tables of readings. */
extern const char text_readings_note[];

/* What "not used" or "fit" in the tables of readings means; NULL where they are in none. Static text. */
const char *text_readings_words(const struct dossier *dossier);

void text_readings_responses(const struct dossier *dossier, struct buffer *out);
/* What everything in a band amounts to, beside 1x, of the readings from `first` up to `end`: "Overall,
 * 10 to 1000 Hz: DE-V 3.12 mm/s rms."; nothing where it is not known. */
void text_readings_overall(const struct dossier *dossier, size_t first, size_t end,
                           struct buffer *text);
/* True where a check could not be made at all, so that nothing is in order by it. */
bool text_readings_uncheckable(const struct finding_record *f);
/* "0 refused, 1 to be read with caution, 7 in order, 1 not checkable." */
void text_readings_count(const struct dossier *dossier, struct buffer *text);
/* Refusals, then cautions in full, then the count of what was in order. */
void text_readings_findings(const struct dossier *dossier, struct buffer *out);

#endif
