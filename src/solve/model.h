/* model.h - the readings of a job as rows of regressions.
 *
 * A row is one sensor in one condition: its usable readings in the sheet's order of runs, the
 * scatter they carry, and the posterior of its vibration and responses.
 */
#ifndef LOPSIDE_SOLVE_MODEL_H
#define LOPSIDE_SOLVE_MODEL_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "solve/posterior.h"
#include "stream/job.h"

struct model_reading { /* what the stage hands over; any order */
    size_t run, sensor;
    char condition[NAME_ROOM];
    double speed_rpm;      /* NaN: not known */
    bool phase;            /* there is a vector */
    bool use;              /* vet's ruling */
    double complex vector; /* SI peak, argument is lag */
    double amplitude;      /* SI peak, where there is no phase */
    double cov[3];         /* of the mean, widened */
    double by_speed;       /* of it, both components: for a speed that is not the others' */
    size_t place;          /* model_init's own: the order they came in */
    double overall;        /* rms, SI, of everything in a band; NaN or 0: not known */
    enum quantity overall_quantity;
};

/* From so many standard errors of misfit on, the scatter between the runs stands for what they are
 * known by (the caution limit of `linearity`). */
#define MODEL_MISFIT 3.0

/* Below so many a changed reading of the sheet explains what did not fit; common practice. */
#define MODEL_EXPLAINED 2.0

enum model_state {
    MODEL_GOOD, /* the usable readings determine everything */
    MODEL_LOST, /* they would, had none been refused */
    MODEL_SHORT /* a run is missing */
};

enum model_stored {
    MODEL_STORED_NONE,   /* there are none, or they could not be used */
    MODEL_STORED_HELD,   /* they agree with the runs, or nothing tells */
    MODEL_STORED_LEFT,   /* set aside: the runs alone tell all, and differ */
    MODEL_STORED_WIDENED /* they differ from the runs, which cannot do without: taken as less sure
                          */
};

struct model_row {
    size_t condition, sensor;
    bool in_aim;
    enum model_state state;
    size_t count;          /* usable readings */
    size_t *runs;          /* owned, their runs in the sheet's order */
    double complex *y, *x; /* owned: readings; count x planes equivalent weights, kg */
    double (*cov)[3];      /* owned: of each reading */
    double (*total)[3];    /* owned: with the scatter from run to run */
    double *overall;       /* owned: rms, SI, of each reading's band; NaN: not known */
    enum quantity overall_quantity;
    double as_found;   /* SI peak amplitude with nothing added, as read; > 0 */
    double speed_rpm;  /* mean of the usable readings; the service speed where unknown; or NaN */
    double sigma;      /* SI, scatter from run to run per component */
    double typical[3]; /* mean covariance of the readings */
    double target;     /* SI peak in the sensor's own quantity; NaN: none */
    struct posterior posterior; /* relative to as found; zeroed where nothing was read */
    double misfit;              /* s.e.; NaN: no run is spare */
    double widened; /* variances of posterior and next reading count so many times; 1: they fit */
    size_t misfit_run; /* furthest off */
    bool *possible;    /* owned, count: from MODEL_MISFIT on, the readings of which any one may be
                          wrong */
    int culprit; /* the run that is the only one of them, the others agreeing; -1: cannot be told */
    int left_on,
        left_in;    /* runs: all would fit, had the first's weights been on in the second; -1 */
    bool torn;      /* lost, since its readings contradict each other and no culprit can be told */
    bool lacks;     /* refused readings would determine more than the usable ones do */
    bool ambiguous; /* amplitudes alone leave more than one answer */
    double complex
        either[2]; /* amplitudes alone: the two weights (kg) that fit alike; NaN: no such pair */
    int lost_run;  /* the first run whose reading of this row was refused; -1: none */
    const struct job_response *
        *stored; /* owned array, planes; borrowed responses in use; NULL: none */
    const struct job_response *apart; /* borrowed: one of another speed, hence not used; or NULL */
    double changed;                   /* s.e. between stored and new; NaN: nothing to compare */
    int changed_plane;                /* whose response; -1: of no plane alone */
    enum model_stored kept;           /* what became of the stored responses */
    bool runout;                      /* the slow-roll vector is taken off the readings */
    bool unrolled; /* a probe whose slow-roll vector could not be read though the sheet has a runout
                      run: its readings hold an unknown part; always MODEL_LOST */
};

struct model_runout {      /* of a sensor */
    size_t count;          /* usable slow-roll readings */
    double complex vector; /* their mean, SI peak */
    double cov[3];         /* of it */
    double speed_rpm;
};

struct model {
    const struct job *job;         /* borrowed */
    char (*conditions)[NAME_ROOM]; /* owned; sheet's order */
    size_t condition_count;
    struct model_row *rows; /* owned; by condition, then sensor */
    size_t row_count;
    double repeatability; /* fraction of the as-found amplitude per component */
    double dof;           /* of it; INFINITY: from the sheet */
    double repeats;       /* degrees of freedom that repeated runs gave */
    bool amplitudes; /* no usable reading has phase, one plane: rows hold amplitudes and relative
                        phases only (amplitude.h) */
    bool *present;   /* owned, one per run: it has readings, usable or not */
    struct model_runout *runout; /* owned, one per sensor */
    int runout_run;              /* the first runout run of the sheet; -1: none */
    bool *held;   /* owned, planes: a stored response of that plane is in use in some row */
    int last_run; /* last run of the sheet that has usable readings; -1: none */
};

enum model_error { MODEL_OK = 0, MODEL_NO_MEMORY = -1, MODEL_FAILED = -2, MODEL_NAN = -3 };

/* Builds the rows and fits each. `readings` is borrowed for the call and sorted in place, by run,
 * sensor, and the order they came in. */
int model_init(struct model *model, const struct job *job, struct model_reading *readings,
               size_t count) __attribute__((warn_unused_result));
void model_release(struct model *model); /* safe on a zeroed struct */

/* True where no run of the job carries a weight on any plane. */
bool model_is_bare(const struct model *model);

/* Rank of [1, weights] over the job's runs of the same condition before run `end` (readings or
 * not), roles left out; planes + 1 is a full one. Negative: no memory. */
int model_rank_before(const struct model *model, size_t end) __attribute__((warn_unused_result));

/* True where a usable reading of that run, sensor and condition is among the row's readings that
 * model_init was given; it is then out of use: the model is to be made anew. */
bool model_refuse(const struct model *model, const struct model_row *row, int run,
                  struct model_reading *readings, size_t count);

/* The reading of run `run` in a row, or NULL. */
const double complex *model_find(const struct model_row *row, size_t run);

#endif
