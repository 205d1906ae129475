/* limits.h - the table of checks: name, unit, limits, basis, and what to do where one trips. */
#ifndef LOPSIDE_VET_LIMITS_H
#define LOPSIDE_VET_LIMITS_H

#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"

enum check {
    CHECK_READABLE,
    CHECK_SAME_RECORDING,
    CHECK_LENGTH,
    CHECK_SERVICE_SPEED,
    CHECK_SPEED_STEADY,
    CHECK_SPEED_MATCH,
    CHECK_AMPLITUDE_STEADY,
    CHECK_PHASE_STEADY,
    CHECK_DRIFT,
    CHECK_BEAT,
    CHECK_ONE_X_SHARE,
    CHECK_TWO_X,
    CHECK_HALF_ORDER,
    CHECK_NEIGHBOUR,
    CHECK_CLIPPING,
    CHECK_SENSOR_DEAD,
    CHECK_TACHO,
    CHECK_PHASE_REFERENCE,
    CHECK_REPEAT,
    CHECK_TRIAL_EFFECT,
    CHECK_WEIGHT_FORCE,
    CHECK_TAPE_MOVED,
    CHECK_SENSOR_SWAPPED,
    CHECK_SENSOR_TURNED,
    CHECK_NEAR_RESONANCE,
    CHECK_LOW_LEVEL,
    CHECK_COUNT
};

enum ruling { RULING_OK, RULING_CAUTION, RULING_REFUSE };

struct check_row {
    const char *name, *unit;
    double caution, refuse; /* NaN: none. 0: any value above 0 trips */
    int worse;              /* +1: larger values are worse, -1: smaller */
    bool off;
    const char *basis;  /* a source, or "common practice" */
    const char *advice; /* what to do where it trips */
};

struct limits {
    struct check_row rows[CHECK_COUNT];
};

/* The defaults, overridden by the job's [limits]: `none` is off; a caution beyond the standing
 * refusal takes the refusal along. Names that are not vet's are left to their stage. */
void limits_init(struct limits *limits, const struct job *job);

/* Judges a value. A limit trips at it and beyond: value >= limit (and > 0) where larger is worse,
 * value < limit where smaller is. NaN is ok: nothing was measured. `crossed` receives the limit
 * that tripped, else the caution limit, else the refusal's. */
enum ruling limits_judge(const struct limits *limits, enum check check, double value,
                         double *crossed);

#endif
