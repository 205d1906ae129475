/* outcomes.h - what stands beside the answer: static and couple parts, vibration zones, predicted
 * against measured, and the figures of a `next` record that are weights.
 *
 * Kinds of their own that every stage but the report passes on. Each X_parse is as in records.h.
 * Masses are kg at the plane's radius, angles degrees against rotation, with the angle in the
 * sheet's sense printed beside.
 */
#ifndef LOPSIDE_STREAM_OUTCOMES_H
#define LOPSIDE_STREAM_OUTCOMES_H

#include <complex.h>
#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"
#include "stream/line.h"

/* kind `parts`: the ideal weight of two planes as unbalance (kg m, argument against rotation). */
struct parts_record {
    double complex static_part; /* on both planes alike */
    double complex couple_part; /* on the first plane; its opposite on the second */
    double complex
        static_alone;        /* the best that both planes alike can do, cross effects included */
    double left_alone, left; /* root of the expected squared vibration over that of now: with
                              * static_alone, with both parts */
};
void parts_print(const struct parts_record *r, const struct job *job, struct line *line);
int parts_parse(struct parts_record *r, const struct job *job, const json_t *json, const char **why)
    __attribute__((warn_unused_result));

/* kind `zone`: a sensor's overall vibration against the boundaries A/B, B/C, C/D. */
struct zone_record {
    int sensor;
    char condition[NAME_ROOM];
    enum quantity quantity;
    double before, after; /* rms, SI; after: expected */
    char zone_before, zone_after;
    double limits[3]; /* rms, SI */
    bool overall;     /* false: of 1x alone, hence at least */
    char basis[120];
};
void zone_print(const struct zone_record *r, const struct job *job, struct line *line);
int zone_parse(struct zone_record *r, const struct job *job, const json_t *json, const char **why)
    __attribute__((warn_unused_result));

/* kind `compared`: a corrected run's reading against what the runs before it predict. */
struct compared_record {
    int run, sensor;
    char condition[NAME_ROOM];
    double complex predicted, measured; /* SI peak, argument is lag */
    double se;                          /* distance over its standard error */
};
void compared_print(const struct compared_record *r, const struct job *job, struct line *line);
int compared_parse(struct compared_record *r, const struct job *job, const json_t *json,
                   const char **why) __attribute__((warn_unused_result));

struct outcome_weight {
    size_t plane;
    int position; /* its number; 0: given by its angle alone */
    double mass;  /* kg; negative: removed */
    double angle_deg;
};
/* A list of weights under `key`: plane, position (null where 0), mass, angle_deg, sheet_deg, sense,
 * and the unbalance (kg m), for any other radius. */
void outcomes_weights(struct line *line, const char *key, const struct job *job,
                      const struct outcome_weight *items, size_t count);

#endif
