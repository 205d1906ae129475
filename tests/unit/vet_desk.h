/* vet_desk.h - an invented job on the desk, for the tests of vet. */
#ifndef LOPSIDE_TESTS_VET_DESK_H
#define LOPSIDE_TESTS_VET_DESK_H

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "close_to.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "vet/across.h"
#include "vet/answer.h"
#include "vet/beat.h"
#include "vet/limits.h"
#include "vet/trials.h"
#include "vet/within.h"

#define SENSORS 2
#define RUNS 4

/* An invented job: two sensors, two planes, runs as-found, trial A, trial B, and a repeat of trial
 * A. */
struct desk {
    struct job job;
    struct job_sensor sensors[SENSORS];
    struct job_plane planes[2];
    struct job_run job_runs[RUNS];
    struct job_weight weights[RUNS];
    struct job_target targets[SENSORS];
    struct job_limit limit;
    struct vet_run items[RUNS];
    struct vet_reading readings[RUNS][SENSORS];
    struct vet_channel channels[RUNS][SENSORS];
    char hashes[RUNS][1][65];
    struct vet_runs runs;
    size_t order[RUNS];
    struct limits limits;
    struct findings findings;
};

extern struct desk desk;

/* A figure of run 1, and what its check should say to it. */
struct figure {
    enum check check;
    double value;
    enum ruling expected;
};

void vet_desk_set(void); /* the good job, afresh */
void vet_desk_reading(int run, int sensor, double complex vector);
void vet_desk_weight(int run, size_t plane, double mass, double angle_deg);
void vet_desk_figure(enum check check, double value); /* gives run 1 that figure */

/* Make a run's own checks, or those of its vectors, afresh. */
void vet_desk_within(int run);
void vet_desk_vectors(int run);

/* The worst ruling of a check about a run (-2: any) and a sensor (-1: any); -1 where it found
 * nothing. */
int vet_desk_ruled(enum check check, int run, int sensor);
bool vet_desk_any_used(int run);
bool vet_desk_all_used(int run);

#endif
