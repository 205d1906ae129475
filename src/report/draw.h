/* draw.h - the drawings of a report, each one SVG element.
 *
 * A drawing looks at the rotor from the side that the sheet names (rotor.seen_from): the mark on top,
 * and angles against rotation counter-clockwise where the rotor turns clockwise as seen, clockwise
 * where it turns counter-clockwise. Where the sheet names no rotation it is drawn as if that were clockwise, without
 * an arrow and without a word which way angles run, and says that it may be the mirror image of the machine.
 */
#ifndef LOPSIDE_REPORT_DRAW_H
#define LOPSIDE_REPORT_DRAW_H

#include <stdbool.h>

#include "report/dossier.h"
#include "report/svg.h"

enum draw_what { DRAW_POLAR, DRAW_PLANE, DRAW_TIME, DRAW_SPECTRUM, DRAW_SPEED };
extern const char *const draw_names[]; /* in that order, NULL at the end */

/* Where an angle against rotation (deg) lies at radius r about (x, y). */
struct svg_point draw_plane_at(const struct job *job, double x, double y, double r, double angle_deg);

/* Each appends one picture at height y and gives its height (0: nothing to draw). */
double draw_plane(const struct dossier *d, size_t plane, double y, struct buffer *out);
double draw_polar(const struct dossier *d, size_t sensor, const char *condition, double y,
                  struct buffer *out);
/* Amplitude, lag and speed over time of one run and sensor. small: lag alone, as one of many. */
double draw_lines_time(const struct dossier *d, size_t run, size_t sensor, bool small, double y,
                 struct buffer *out);
double draw_spectrum(const struct dossier *d, size_t spectrum, double y, struct buffer *out);
double draw_lines_speed(const struct dossier *d, size_t curve, double y, struct buffer *out);

/* True where reading i is the first of its sensor and condition: each pair has one polar plot. */
bool draw_polar_begins(const struct dossier *d, size_t i);

/* All pictures of one sort, as a file of its own. */
void draw_file(const struct dossier *d, enum draw_what what, struct buffer *out);

#endif
