/* html_others.h - what a page says of weights besides the placement: the ideal weight, other
 * placements, static and couple parts, the trial's figures. */
#ifndef LOPSIDE_REPORT_HTML_OTHERS_H
#define LOPSIDE_REPORT_HTML_OTHERS_H

#include "base/buffer.h"
#include "report/dossier.h"

/* A table of trial weights, from the figures of the step `trial`; nothing where it has none. */
void html_others_trial(const struct dossier *dossier, struct buffer *out);

/* Ideal weight and its least-squares twin, alternatives, the answer with the other weights on or
 * off, parts: each as far as the stream has it. */
void html_others_write(const struct dossier *dossier, struct buffer *out);

#endif
