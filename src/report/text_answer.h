/* text_answer.h - the first part of the text report: what to do now, and what it will leave. */
#ifndef LOPSIDE_REPORT_TEXT_ANSWER_H
#define LOPSIDE_REPORT_TEXT_ANSWER_H

#include "base/buffer.h"
#include "report/dossier.h"

void text_answer_now(const struct dossier *dossier,
                     struct buffer *out); /* WHAT TO DO NOW, or why not */
void text_answer_safety(const struct dossier *dossier,
                        struct buffer *out); /* where a weight is fitted */
void text_answer_ideal(const struct dossier *dossier, struct buffer *out); /* corrections */
void text_answer_forecast(const struct dossier *dossier, struct buffer *out);
void text_answer_tolerance(const struct dossier *dossier, struct buffer *out);

#endif
