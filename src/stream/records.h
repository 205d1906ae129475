/* records.h - the records between the stages, as structs with their printer and parser.
 *
 * Names, units and signs are the stream's contract. Each X_print builds a line (line_begin to
 * line_end) to be handed to stream_write; each X_parse fills the struct from JSON and returns 0, or
 * -1 with *why (static text) where a field is missing or of the wrong type: the stage then says
 * "malformed record" with it and ends with 2. Sensors and planes are indices into the job; where a
 * record holds arrays, X_release frees them. Absent optional numbers are NaN.
 */
#ifndef LOPSIDE_STREAM_RECORDS_H
#define LOPSIDE_STREAM_RECORDS_H

#include <complex.h>
#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"
#include "stream/line.h"

struct file_record {
    char *path;       /* owned; relative to the sheet's folder, as in the sheet */
    char sha256[65];
    long long frames;
    double rate_hz;
};

struct run_record {
    char run[NAME_ROOM];
    char condition[NAME_ROOM];
    const struct job_run *job_run; /* its weights are printed from here; NULL for an audited recording */
    char when[NAME_ROOM];
    struct file_record *files;     /* owned; none for hand readings */
    size_t file_count;
};
void run_print(const struct run_record *r, const struct job *job, struct line *line);
int run_parse(struct run_record *r, const struct job *job, const json_t *json, const char **why)
    __attribute__((warn_unused_result));
void run_release(struct run_record *r);

struct wave_column {
    char name[NAME_ROOM];      /* the sensor's name; "tacho" for the tacho */
    enum quantity quantity;    /* QUANTITY_TACHO marks the tacho column (V, or CSV units) */
    double rail;               /* |value| at full scale; NaN: unknown (CSV) */
};
struct wave_record {
    char run[NAME_ROOM];
    double rate_hz;
    struct wave_column *columns; /* owned */
    size_t column_count;
};
void wave_print(const struct wave_record *r, struct line *line);
int wave_parse(struct wave_record *r, const json_t *json, const char **why)
    __attribute__((warn_unused_result));
void wave_release(struct wave_record *r);

void block_print(const char *run, long frames, struct line *line);
int block_parse(char run[NAME_ROOM], long *frames, const json_t *json, const char **why)
    __attribute__((warn_unused_result));

struct channel_record {
    char run[NAME_ROOM];
    int sensor;                /* -1: the tacho (printed as "tacho") */
    double min, max;           /* SI */
    double resolution;         /* smallest step between two different values; 0: constant */
    long long railed;          /* samples at full scale, or in held extremes (see the check `clipping`) */
    long long samples;
    int same_as;               /* index of the sensor with the same signal; -1: none; -2: the tacho */
};
void channel_print(const struct channel_record *r, const struct job *job, struct line *line);
int channel_parse(struct channel_record *r, const struct job *job, const json_t *json,
                  const char **why) __attribute__((warn_unused_result));

struct turns_record {          /* one block of whole turns */
    char run[NAME_ROOM];
    double t_s;                /* middle of the block, from the start of the recording */
    long turns;
    double speed_rpm;
    size_t count;              /* of the sensors present */
    int *sensors;              /* owned arrays, by position */
    double complex *vectors;   /* 1x, SI peak, argument is lag; NaN where there is no phase */
    double *rest;              /* rms of what is not 1x (the constant taken off), SI */
    double *amplitudes;        /* owned; 1x amplitude, SI peak, where no mark carries phase: then `vectors`
                                * are NaN and the line has an object `amplitudes`. NaN each, or NULL, otherwise */
};
void turns_print(const struct turns_record *r, const struct job *job, struct line *line);
int turns_parse(struct turns_record *r, const struct job *job, const json_t *json,
                const char **why) __attribute__((warn_unused_result));
void turns_release(struct turns_record *r);

struct tacho_record {
    char run[NAME_ROOM];
    long marks, missed, extra; /* marks used; marks that did not come; pulses set aside */
    double jitter_deg;         /* standard deviation of marks about the smooth shaft angle */
    double speed_rpm;          /* mean over the run */
    bool pulses;               /* the signal has pulses; false: it is spread as vibration is */
    bool reference;            /* phase may be read: one mark a turn, or one that can be told apart */
    double scatter_rpm;        /* standard deviation of turn speeds about the mean; slow and fast */
};
void tacho_print(const struct tacho_record *r, struct line *line);
int tacho_parse(struct tacho_record *r, const json_t *json, const char **why)
    __attribute__((warn_unused_result));

struct spectrum_record {
    char run[NAME_ROOM];
    int sensor;
    double *orders, *amplitude; /* owned; amplitude peak, SI of the sensor's quantity */
    size_t count;
    /* Owned; the largest lines that do not turn with the shaft (at no multiple of half an order), largest
     * first: each two numbers, hz and amplitude (as above). Printed where `lines_known`: an empty list says that
     * there is none, an absent one that nobody looked. */
    double *lines;
    size_t line_count;
    bool lines_known;
};
void spectrum_print(const struct spectrum_record *r, const struct job *job, struct line *line);
int spectrum_parse(struct spectrum_record *r, const struct job *job, const json_t *json,
                   const char **why) __attribute__((warn_unused_result));
void spectrum_release(struct spectrum_record *r);

/* The 1x vector of a coast-down over speed, one record per sensor: a point per block, in order of time.
 * The readings at the listed speeds are made of it by local fits (src/average/sweep.h). */
struct curve_record {
    char run[NAME_ROOM];
    int sensor;
    double *speed_rpm;          /* owned, as `vectors`; NaN vectors are printed null */
    double complex *vectors;    /* SI peak, argument is lag */
    size_t count;
};
void curve_print(const struct curve_record *r, const struct job *job, struct line *line);
int curve_parse(struct curve_record *r, const struct job *job, const json_t *json, const char **why)
    __attribute__((warn_unused_result));
void curve_release(struct curve_record *r);

struct steady {                 /* how steady a reading was; NaN: not known. Percentages of the mean amplitude */
    double amplitude_pct;       /* standard deviation of block amplitudes */
    double phase_deg;           /* circular standard deviation of block lags (Mardia & Jupp 2000) */
    double resultant;           /* mean resultant length of block lags */
    double drift_pct;           /* trend of the vector over the run, end to end; 0 where not significant */
    double speed_pct;           /* spread of speed, standard deviation, % of the mean */
    double independent;         /* effective number of independent blocks */
    long set_aside;             /* outlier blocks not used */
    long turns;                 /* turns used */
    /* A swing of the block vectors with one period, slower than two blocks and faster than half the run.
     * Everything faster is averaged away within a block or cannot be told from its alias; everything
     * slower is drift or wander. */
    double beat_pct;            /* its amplitude; 0 where not significant */
    double beat_s;              /* its period; NaN where beat_pct is 0, as the next */
    double neighbour_hz;        /* the frequency that makes it, where it is one beside 1x (the vector turns
                                 * about its mean); NaN where the machine's own 1x swings, or not known */
    double step_pct;            /* largest lasting jump of the mean; 0 where not significant */
    double step_s;              /* when, s from the start of the recording; NaN where step_pct is 0 */
    double wander_pct;          /* standard deviation of slow wander, both components; 0 where not significant */
};
struct steady steady_unknown(void); /* nothing known: NaN, no blocks set aside, no turns */

struct overall {                /* of everything in a band, in the quantity that is shown */
    double rms;                 /* SI; NaN: none */
    enum quantity quantity;
    double from_hz, to_hz;
};

/* A run has one reading per sensor, told apart by (run, sensor), but a coast-down has one per sensor and
 * listed speed, told apart by (run, sensor, condition): its conditions are "<condition> @ 900 rpm"
 * (job_speed_condition) and speed_rpm is the listed speed. A listed speed outside of what was
 * recorded has no reading, but a finding of the stage `average` (check `coast-down`).
 *
 * The readings of a runout run (job_run.role) keep the run's own condition and are not corrected with
 * anything; `average` takes them off nowhere, since runs may be averaged apart. `solve` subtracts the
 * 1x vector of a runout run from the baseline of displacement sensors. */
struct reading_record {
    char run[NAME_ROOM];
    char condition[NAME_ROOM];
    int sensor;
    double speed_rpm;
    bool has_phase;
    double complex vector;      /* SI peak, argument is lag */
    double amplitude;           /* SI peak; |vector| where there is phase */
    double cov[3];              /* of the mean: var re, cov, var im */
    long blocks;                /* 0: by hand */
    struct steady steady;
    struct overall overall;
};
void reading_print(const struct reading_record *r, const struct job *job, struct line *line);
int reading_parse(struct reading_record *r, const struct job *job, const json_t *json,
                  const char **why) __attribute__((warn_unused_result));

struct vetted_record {
    char run[NAME_ROOM];
    char condition[NAME_ROOM];  /* of a coast-down's reading, and printed only there; "" otherwise */
    int sensor;
    bool use;
    double widen[3];            /* like cov; added to it by solve */
    double by_speed;            /* of widen, both components: for speeds that differ between runs; 0, and not printed: none */
};
void vetted_print(const struct vetted_record *r, const struct job *job, struct line *line);
int vetted_parse(struct vetted_record *r, const struct job *job, const json_t *json,
                 const char **why) __attribute__((warn_unused_result));

/* True where the ruling is about that reading: run and sensor alike, and the condition where the
 * ruling names one. */
bool vetted_is_of(const struct vetted_record *v, const struct reading_record *r);

enum verdict { VERDICT_OK, VERDICT_CAUTION, VERDICT_REFUSE };

struct finding_record {
    char stage[16];             /* "read", "average", "vet", "solve" */
    char check[NAME_ROOM];      /* as in the table of checks */
    enum verdict verdict;
    char run[NAME_ROOM];        /* "": not about one run (printed null) */
    int sensor;                 /* -1: not about one sensor */
    double value, limit;        /* NaN: none. limit: the one crossed, else the caution limit */
    char unit[16];              /* "%", "deg", "turns", "s.e.", "" */
    char basis[120];            /* source, or "common practice" */
    char text[400];             /* one sentence for people: what was seen and what to do */
};
void finding_print(const struct finding_record *r, const struct job *job, struct line *line);
int finding_parse(struct finding_record *r, const struct job *job, const json_t *json,
                  const char **why) __attribute__((warn_unused_result));

struct response_record {
    char condition[NAME_ROOM];
    int sensor, plane;
    double complex vector;      /* SI peak per kg at the plane's radius */
    double cov[3];
    double speed_rpm;
    /* printed besides, from the job: quantity, radius_m, tacho_channel, tacho_edge */
};
void response_print(const struct response_record *r, const struct job *job, struct line *line);
int response_parse(struct response_record *r, const struct job *job, const json_t *json,
                   const char **why) __attribute__((warn_unused_result));

struct correction_record {      /* the ideal weight of one plane */
    int plane;
    double mass, angle_deg;     /* kg at the plane's radius; against rotation. sheet_deg and sense are printed besides */
    char relative_to[NAME_ROOM];/* name of the run whose weights stay on, or "as found" */
    double least_squares[2];    /* mass kg, angle_deg */
    double ellipse[3];          /* covariance of the least-squares weight: var re, cov, var im, kg^2 */
};
void correction_print(const struct correction_record *r, const struct job *job, struct line *line);
int correction_parse(struct correction_record *r, const struct job *job, const json_t *json,
                     const char **why) __attribute__((warn_unused_result));

#define PIECES_MOST 64
struct placement_record {       /* what to fit now at one position of one plane */
    int plane;
    int position;               /* number; 0: any angle (printed null) */
    double angle_deg;           /* against rotation */
    double mass;                /* kg, total at this position */
    double pieces[PIECES_MOST]; /* kg each */
    size_t piece_count;
    double depths_m[PIECES_MOST]; /* of each piece's hole, removed with a drill; NaN, or 0: none */
    double force_n;             /* at service speed and the plane's radius; NaN: no speed known */
    bool sits;                  /* something stays mounted at this position: the two below are printed */
    double total_mass;          /* kg, of all that then sits there, as bolted on; negative: removed */
    double total_force_n;       /* of that; NaN: no speed known */
    char relative_to[NAME_ROOM];
};
void placement_print(const struct placement_record *r, const struct job *job, struct line *line);
int placement_parse(struct placement_record *r, const struct job *job, const json_t *json,
                    const char **why) __attribute__((warn_unused_result));

struct forecast_record {
    int sensor;
    char condition[NAME_ROOM];
    double complex before, after; /* SI peak, argument is lag */
    double after_95[2];         /* amplitude range of the next reading, SI peak */
    double target;              /* SI peak in the sensor's own quantity; NaN: none */
    double chance;              /* of meeting it; NaN without a target */
    double speed_rpm;
};
void forecast_print(const struct forecast_record *r, const struct job *job, struct line *line);
int forecast_parse(struct forecast_record *r, const struct job *job, const json_t *json,
                   const char **why) __attribute__((warn_unused_result));

struct residual_record {        /* kind `residual`: estimated residual unbalance against the tolerance */
    int plane;
    double before, after;       /* kg m; after the placement; NaN: not known */
    double after_95;            /* kg m, upper end */
    double permissible;         /* kg m, this plane's share */
    char basis[120];
};
void residual_print(const struct residual_record *r, const struct job *job, struct line *line);
int residual_parse(struct residual_record *r, const struct job *job, const json_t *json,
                   const char **why) __attribute__((warn_unused_result));

/* `next`: step and text are parsed for everybody; the figures of a step are free fields that the
 * producing stage adds between next_begin and line_end. */
struct next_record {
    char step[16];              /* "trial", "correct", "trim", "repeat", "done" */
    char text[400];
};
void next_begin(const struct next_record *r, struct line *line);
int next_parse(struct next_record *r, const json_t *json, const char **why)
    __attribute__((warn_unused_result));

#endif
