/* phrase.h - the phrases that every writer shares: weights, angles, masses, pieces, as people say
 * them.
 *
 * All append to a buffer. An angle of a weight never stands without the sense it is counted in.
 */
#ifndef LOPSIDE_REPORT_PHRASE_H
#define LOPSIDE_REPORT_PHRASE_H

#include "base/buffer.h"
#include "report/dossier.h"

/* "90 deg against rotation": an angle against rotation (deg) in the sheet's sense. half: 95 % half
 * width, deg; NaN: not known, or nominal. */
void phrase_angle(struct buffer *out, const struct job *job, double angle_deg, double half);

/* "60 g", to the digits that `half` (kg; NaN: nominal) supports, but two significant ones at least:
 * a weight that is badly known is still not 0 g. */
void phrase_mass(struct buffer *out, const struct job *job, double kg, double half);

/* The same, and "remove 60 g" of a negative mass. */
void phrase_signed(struct buffer *out, const struct job *job, double kg, double half);

/* True where a weight's 95 % half width (kg) is more than the weight itself, so that nothing can be
 * compared with it. NaN: false. */
bool phrase_weight_useless(double kg, double half);

/* "3 pieces: 50 + 10 + 10 g". One piece: "in one piece". */
void phrase_pieces(struct buffer *out, const struct job *job, const double *pieces, size_t count);

/* "drill 2 holes of 12 mm, 15.0 + 8.5 mm deep" for a placement; nothing where no drill is named. */
void phrase_holes(struct buffer *out, const struct job *job, const struct placement_record *p);

/* "; then 110 g sit there, 702 N", where something stays mounted at the placement's position. */
void phrase_sits(struct buffer *out, const struct job *job, const struct placement_record *p);

/* True where the placement takes material off. */
bool phrase_is_removed(const struct job *job, const struct placement_record *p);

/* True where something is placed, and all of it takes material off. */
bool phrase_only_removed(const struct dossier *d);

/* "with the weights above fitted", as forecasts are: or removed, or nothing at all. Static text. */
const char *phrase_fitted(const struct dossier *d);

/* "60 g at 30 deg against rotation on plane 'wheel', position 2", or "6 g removed at ...". */
void phrase_weight(struct buffer *out, const struct job *job, const struct job_weight *w);

/* What run `run` of the job carries: "60 g at 30 deg against rotation on plane 'wheel'", or "no
 * weights". */
void phrase_weights(struct buffer *out, const struct job *job, size_t run);

/* 95 % half widths of a weight's mass (kg) and angle (deg) from its covariance (kg^2); NaN where it
 * is zero. */
void phrase_weight_half(double mass, double angle_deg, const double cov[3], double half[2]);

/* " (drift, beat)": the checks that gave findings of that verdict, each once, four at most and then
 * "..."; nothing where there are none. */
void phrase_checks(struct buffer *out, const struct dossier *d, enum verdict verdict);

/* `text` as a sentence: its first letter (ASCII) a capital, a full stop at its end. */
void phrase_sentence(struct buffer *out, const char *text);

#endif
