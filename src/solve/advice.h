/* advice.h - the stage's own findings and the next step, in words. */
#ifndef LOPSIDE_SOLVE_ADVICE_H
#define LOPSIDE_SOLVE_ADVICE_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/answer.h"
#include "solve/judge.h"
#include "solve/ruling.h"

struct advice_finding {
    const char *check, *unit, *basis; /* static */
    enum judge_verdict verdict;
    int run, sensor; /* -1: none */
    double value, limit;
    char text[400];
};

struct advice_trial {           /* of one plane */
    double wanted, mass, force; /* kg: by the rule, and from stock; N. NaN: not known */
    int sensor; /* a stored response says that this sensor will change most, whatever its speed; -1
                 */
    double effect; /* by so much, SI peak in its own quantity */
};

struct advice_next {
    const char *step; /* static: "trial", "correct", "trim", "repeat", "done" */
    char text[400];   /* what a `next` record holds */
    char reason[300]; /* for standard error where there is no answer; else "" */
};

/* Condition number; names the planes that cannot be told apart and the run that would. False where
 * there is one plane only and nothing to say. */
bool advice_conditioning(const struct answer *answer, struct advice_finding *finding);

/* Force of what is placed on a plane against the static journal load. False: not known. */
bool advice_force(const struct answer *answer, size_t plane, struct advice_finding *finding);

/* Trial weights by the 10 % practice, one per plane. */
void advice_trials(const struct job *job, struct advice_trial *trials);

/* The run up to which the machine has been corrected: aim.mounted, else the last with readings, if
 * it carries weights and the runs of its condition before it could already be solved; -1: no
 * correction has run yet, -2: no memory. */
int advice_corrected_run(const struct model *model) __attribute__((warn_unused_result));

/* True where that run's readings meet every target of the aim or, without targets, the residual
 * meets the tolerance (needs outlook_fill with nothing placed). */
bool advice_is_done(const struct answer *answer, int run);

/* True for a refusal that by itself says why there is no correction. */
bool advice_is_final(const struct advice_finding *finding);

/* The refusal `correction`: why no correction exists, out of the reason of the next step. */
void advice_no_correction(const struct advice_next *next, struct advice_finding *finding);

/* The next step in each case. */
void advice_trial_step(const struct model *model, struct advice_next *next);
void advice_repeat_step(const struct model *model, const struct ruling *ruling,
                        struct advice_next *next);
void advice_missing_step(const struct model *model, const struct ruling *ruling,
                         struct advice_next *next);
void advice_refused_step(const struct advice_finding *finding, struct advice_next *next);
void advice_useless_step(const struct answer *answer, struct advice_next *next);
void advice_done_step(const struct answer *answer, int run, bool met, struct advice_next *next);

#endif
