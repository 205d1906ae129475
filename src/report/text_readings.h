/* text_readings.h - the measured part of the text report: readings, responses, findings. */
#ifndef LOPSIDE_REPORT_TEXT_READINGS_H
#define LOPSIDE_REPORT_TEXT_READINGS_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/shown.h"

/* A reading as its sensor shows it, vet's widening included. */
struct shown text_readings_shown(const struct dossier *dossier,
                                 const struct dossier_reading *reading);

void text_readings_all(const struct dossier *dossier, struct buffer *out);
void text_readings_responses(const struct dossier *dossier, struct buffer *out);
/* Refusals, then cautions in full, then the count of what was in order. */
void text_readings_findings(const struct dossier *dossier, struct buffer *out);

#endif
