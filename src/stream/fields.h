/* fields.h - typed access to the fields of a JSON record, with one error for all of them.
 *
 *     struct fields f = fields_of(json);
 *     fields_name(&f, "run", r->run);
 *     r->rate_hz = fields_real(&f, "rate_hz");
 *     return fields_done(&f, why);
 *
 * The first missing or ill-typed field wins; later calls return harmless values. */
#ifndef LOPSIDE_STREAM_FIELDS_H
#define LOPSIDE_STREAM_FIELDS_H

#include <complex.h>
#include <jansson.h>
#include <stdbool.h>

#include "stream/job.h"

struct fields {
    const json_t *json;
    const char *why; /* static text of the first error; NULL: none */
};

struct fields fields_of(const json_t *json);
int fields_done(const struct fields *f, const char **why); /* 0, or -1 with *why */

/* The text of *why where it is memory and not the record that is to blame. */
extern const char fields_no_memory[];
void fields_fail(struct fields *f, const char *why);

bool fields_has(const struct fields *f, const char *key);  /* present and not null */
double fields_real(struct fields *f, const char *key);     /* null or absent: NaN; other type: error */
double fields_need_real(struct fields *f, const char *key); /* must be a number */
long long fields_integer(struct fields *f, const char *key, long long fallback);
/* A whole number within [least, most], anything else is an error; null or absent: fallback. */
int fields_int(struct fields *f, const char *key, int least, int most, int fallback);
double fields_above_zero(struct fields *f, const char *key); /* must be a number above zero */
/* [var re, cov, var im], a covariance: no negative variance, cov^2 <= product (to rounding). */
void fields_covariance(struct fields *f, const char *key, double to[3]);
bool fields_boolean(struct fields *f, const char *key, bool fallback);
const char *fields_text(struct fields *f, const char *key); /* borrowed; null or absent: "" */
/* Copies text into an array of `room` bytes; too long is an error. */
void fields_copy(struct fields *f, const char *key, char *to, size_t room);
void fields_name(struct fields *f, const char *key, char to[NAME_ROOM]); /* must be there */
double complex fields_vector(struct fields *f, const char *key); /* null or absent: NaN */
void fields_reals(struct fields *f, const char *key, double *to, size_t count); /* exactly count */
const json_t *fields_array(struct fields *f, const char *key);  /* null or absent: NULL */
const json_t *fields_object(struct fields *f, const char *key); /* null or absent: NULL */
int fields_sensor(struct fields *f, const char *key, const struct job *job); /* an index; unknown: error */
int fields_plane(struct fields *f, const char *key, const struct job *job);
/* A new array of all numbers of an array field (null elements NaN), to be freed; NULL if empty. */
double *fields_new_reals(struct fields *f, const char *key, size_t *count);

#endif
