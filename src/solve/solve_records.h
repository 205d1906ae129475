/* solve_records.h - the records of the stage `solve`: what comes in as the model's input, what is
 * found as records.
 *
 * Beside solve.c the only file of this folder that sees the stream. It holds no numerics and makes
 * no decisions: solve.c says what is written, in which order. All functions that give an int give
 * STATUS_DONE or an exit code (base/status.h) whose message has been printed.
 */
#ifndef LOPSIDE_SOLVE_SOLVE_RECORDS_H
#define LOPSIDE_SOLVE_SOLVE_RECORDS_H

#include <stdbool.h>
#include <stddef.h>

#include "base/options.h"
#include "solve/remedy.h"
#include "solve/advice.h"
#include "solve/answer.h"
#include "solve/lookback.h"
#include "solve/model.h"
#include "solve/slope.h"
#include "stream/records.h"
#include "stream/stream.h"

struct solve_records {
    struct stream stream;
    struct model_reading *readings; /* owned */
    size_t count, room;
    struct vetted_record *ruled; /* owned: vet's rulings, as they came */
    size_t ruled_count, ruled_room;
    struct slope *slopes;        /* owned, runs x sensors: vectors over speed within the runs */
    struct slope_match *matches; /* owned: readings that were brought to one speed */
    size_t match_count, match_room;
    struct remedy_cause *causes; /* owned: findings above a limit, all stages' */
    size_t cause_count, cause_room;
    struct line line;
    long dropped;    /* readings that the regression refused and does without */
    char first[200]; /* of them, the first: what the line on standard error says */
    bool said;       /* a refusal of ours says already why there is no correction */
    int status;      /* the exit code that the answer calls for */
};

/* Begins with the job record of the first file (standard input where there is none); `s` is to be
 * released whatever comes back. */
int solve_records_open(struct solve_records *s, const struct option_list *files)
    __attribute__((warn_unused_result));
void solve_records_release(struct solve_records *s);

/* Passes all records on and keeps readings (SI peak, vet's widening added to their covariance,
 * vet's use) and slopes. A reading without a ruling is STATUS_USAGE. */
int solve_records_read(struct solve_records *s) __attribute__((warn_unused_result));

/* Readings of slightly different speeds become readings of one, where that helps; `matches` says
 * which. */
int solve_records_bring(struct solve_records *s) __attribute__((warn_unused_result));

/* What the regression knows of each plane's effect; nothing from amplitudes, whose phase is none.
 */
int solve_records_responses(struct solve_records *s, const struct model *m)
    __attribute__((warn_unused_result));
int solve_records_finding(struct solve_records *s, const struct advice_finding *f)
    __attribute__((warn_unused_result));
/* A reading that the regression refused and does without: the finding, and the line on standard
 * error. */
int solve_records_dropped(struct solve_records *s, const struct advice_finding *f)
    __attribute__((warn_unused_result));
/* A corrected run's reading of one row (sensor and condition) against what the runs before it
 * predict. */
int solve_records_compared(struct solve_records *s, const struct model *m,
                           const struct model_row *row, int run, const struct lookback *look)
    __attribute__((warn_unused_result));

/* Of an answer: the ideal weights, the parts of two planes' ideal weight, what to fit now, and
 * (after the outlook is filled) forecasts with their zones and residuals. */
int solve_records_corrections(struct solve_records *s, const struct answer *a)
    __attribute__((warn_unused_result));
int solve_records_parts(struct solve_records *s, const struct answer *a)
    __attribute__((warn_unused_result));
int solve_records_placements(struct solve_records *s, const struct answer *a)
    __attribute__((warn_unused_result));
int solve_records_outlook(struct solve_records *s, const struct answer *a)
    __attribute__((warn_unused_result));

/* The closing record with the figures of its step, and for a `status` other than STATUS_DONE the
 * line on standard error. `a` is NULL where there is no answer. The stage's exit code becomes
 * `status`. */
int solve_records_next(struct solve_records *s, const struct advice_next *next,
                       const struct answer *a, int status) __attribute__((warn_unused_result));

#endif
