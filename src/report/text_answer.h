/* text_answer.h - the first part of the text report: what to do now, and what it will leave. */
#ifndef LOPSIDE_REPORT_TEXT_ANSWER_H
#define LOPSIDE_REPORT_TEXT_ANSWER_H

#include "base/buffer.h"
#include "report/dossier.h"
#include "report/table.h"

void text_answer_now(const struct dossier *dossier,
                     struct buffer *out); /* WHAT TO DO NOW, or why not */
void text_answer_safety(const struct dossier *dossier,
                        struct buffer *out); /* where a weight is fitted */
void text_answer_ideal(const struct dossier *dossier, struct buffer *out); /* corrections */
void text_answer_tolerance(const struct dossier *dossier, struct buffer *out);

/* What must be said wherever a weight is to be fitted or material removed, line `i` of it; NULL: no
 * such line. Static text. */
const char *text_answer_caution(const struct dossier *dossier, size_t i);

/* What the words in the table of the tolerance mean, as far as they are in it. */
void text_answer_tolerance_words(const struct dossier *dossier, struct buffer *text);

/* 95 % half width (kg) to which a placed mass is worth stating; NaN: pieces, nominal. */
double text_answer_free_half(const struct dossier *d, int plane);

/* The table alone, to be printed and released by the caller. */
void text_answer_tolerance_table(const struct dossier *dossier, struct table *table);

#endif
