/* dossier.h - everything a report rests on: the records of one whole stream, parsed, in the sheet's
 * order.
 *
 * Every writer (text, csv, json; pages and pictures later) works on this one model. Filled record
 * by record, closed once with dossier_close, then only read.
 */
#ifndef LOPSIDE_REPORT_DOSSIER_H
#define LOPSIDE_REPORT_DOSSIER_H

#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"
#include "stream/outcomes.h"
#include "stream/records.h"

/* A reading together with vet's ruling on it. */
struct dossier_reading {
    struct reading_record reading;
    bool judged;     /* a `vetted` record was seen */
    bool use;        /* vet's ruling, and not refused by solve; true where nothing was judged */
    double widen[3]; /* vet's addition to cov; zero where nothing was judged */
    size_t run;      /* rank of its run in the report */
    size_t arrival;  /* position in the stream */
};

struct dossier_run {
    struct run_record record;
    size_t arrival;
};

struct dossier_line { /* one record's original bytes, without its newline, in `text` */
    size_t at, length;
};

#define DOSSIER_LIST(type)                                                                         \
    struct {                                                                                       \
        struct type *items;                                                                        \
        size_t count, room;                                                                        \
    }

struct dossier {
    const struct job *job; /* borrowed */
    bool keep_lines;       /* set before the first record: keep the original bytes */
    bool keep_traces;      /* set before: keep turns, spectra and curves, for drawings */
    bool sparse;           /* set before: of an audit, which may have thousands of recordings, keep no
                            * spectra, and only count the findings that are in order */

    DOSSIER_LIST(dossier_run) runs;         /* the sheet's order, then that of arrival */
    DOSSIER_LIST(dossier_reading) readings; /* by run, then as they came */
    DOSSIER_LIST(tacho_record) tachos;
    DOSSIER_LIST(turns_record) turns;
    DOSSIER_LIST(spectrum_record) spectra;
    DOSSIER_LIST(curve_record) curves;
    DOSSIER_LIST(vetted_record) vetted;
    DOSSIER_LIST(finding_record) findings;
    size_t counted; /* findings in order that are not kept */
    DOSSIER_LIST(response_record) responses;
    DOSSIER_LIST(correction_record) corrections;
    DOSSIER_LIST(placement_record) placements;
    DOSSIER_LIST(forecast_record) forecasts;
    DOSSIER_LIST(residual_record) residuals;
    DOSSIER_LIST(parts_record) parts; /* one, of jobs with two planes */
    DOSSIER_LIST(zone_record) zones;
    DOSSIER_LIST(compared_record) compared; /* a corrected run against what was predicted */
    DOSSIER_LIST(dossier_line) lines;
    struct buffer text; /* the lines, ",\n" before each: the middle of a JSON array */
    bool has_next;
    struct next_record next;
    json_t *figures; /* owned: the whole `next` record with the figures of its step; NULL: none */
};

/* Empty; `job` is borrowed. */
void dossier_init(struct dossier *dossier, const struct job *job);
void dossier_release(struct dossier *dossier);

/* Adds one record (its JSON and the `length` bytes of its line). A kind that is not known is kept
 * as a line only. Returns 0; -1 with *why (static text) when the record is malformed; -2 when
 * memory is out. */
int dossier_add(struct dossier *dossier, const json_t *json, const char *bytes, size_t length,
                const char **why) __attribute__((warn_unused_result));

/* Joins rulings to readings and puts runs and readings in order. */
void dossier_close(struct dossier *dossier);

/* The widened covariance of a reading's mean. */
void dossier_cov(const struct dossier_reading *reading, double cov[3]);

/* True for a job that asks only whether readings can be trusted: no planes, hence nothing to fit.
 */
bool dossier_is_audit(const struct dossier *dossier);

/* The run that a record is relative to, whose weights stay on; -1: the rotor as found, also where a run
 * has just that name (the sheet does not let its weights stay on). */
int dossier_base(const struct job *job, const char *relative_to);

/* A figure of the step's own, in the unit its name says; NaN where it is absent or no number. */
double dossier_number(const json_t *object, const char *key);
/* A text of the step's own, borrowed from the object; "" where it is absent or no text. */
const char *dossier_string(const json_t *object, const char *key);

/* The ideal weight with what is mounted the other way, left on or taken off; NULL: none, or a run named
 * "as found" carries weights, so that it cannot be told which it is. Borrowed. */
const json_t *dossier_instead(const struct dossier *dossier);

/* Mean speed of a run, rpm, by its tacho or a reading; NaN: not known. */
double dossier_speed(const struct dossier *dossier, const char *run);

/* True where that run is a slow roll, whose readings are for every condition. */
bool dossier_is_runout(const struct dossier *dossier, const char *run);

/* True where something is forecast, but not that sensor in that condition: solve did without it. */
bool dossier_left_out(const struct dossier *dossier, int sensor, const char *condition);

/* True for the finding that a recording of an audit could not be read. */
bool dossier_is_unreadable(const struct finding_record *f);

/* The gravest verdict of any finding on that run and sensor (findings on the whole run included).
 */
enum verdict dossier_verdict(const struct dossier *dossier, const char *run, int sensor);

/* Name of a sensor or plane of the job; "" for an index that is none. */
const char *dossier_sensor(const struct dossier *dossier, int sensor);
const char *dossier_plane(const struct dossier *dossier, int plane);

/* What the records answer, as an exit code: 0, 4 (refused) or 5 (no correction). A placement is an
 * answer, and so are the steps done, correct and trim. Solve's refusals by the checks `correction`
 * and `correction-force` are 5. A trial step is 0 while no run of the sheet carries a weight, and 5
 * (a run is missing, or the planes cannot be told apart) once one does. To repeat is 4 where a
 * reading was refused or has no phase, or a regression was refused, 5 where nothing was. */
int dossier_answer(const struct dossier *dossier);

/* The exit code of the report: 3 where a recording could not be read, else the answer's. */
int dossier_status(const struct dossier *dossier);

#endif
