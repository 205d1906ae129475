/* text_readings.h - the measured part of the text report: readings, responses, findings. */
#ifndef LOPSIDE_REPORT_TEXT_READINGS_H
#define LOPSIDE_REPORT_TEXT_READINGS_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/shown.h"
#include "report/table.h"

/* A reading as its sensor shows it, vet's widening included. */
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
void text_readings_responses(const struct dossier *dossier, struct buffer *out);
/* Refusals, then cautions in full, then the count of what was in order. */
void text_readings_findings(const struct dossier *dossier, struct buffer *out);

#endif
