/* ruling.h - can what is left of the readings still answer? */
#ifndef LOPSIDE_VET_RULING_H
#define LOPSIDE_VET_RULING_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

/* The readings of a job as the regression sees them: one row a run, [1, weights]. */
struct ruling_set {
    size_t run_count, sensor_count, plane_count;
    const int *condition;          /* [run]: runs with equal numbers belong together */
    const double complex *weights; /* [run * plane_count + plane], kg; may be NULL without planes */
    const bool *expected; /* [run * sensor_count + sensor]: the sheet lets a reading be there */
    const bool *usable;   /* the same shape: it is there, and it is not refused */
    const bool *in_aim;   /* [sensor] */
    bool named;           /* the aim names its sensors: none of them may be lost */
};

/* A sensor is lost in a condition where its usable readings give [1, weights] less rank than all
 * expected ones would, so that a run the regression needs is missing. 1 where no sensor that the
 * aim names is lost and, where it names none, no condition has lost all of its sensors: the job
 * goes on without those that are; 0 otherwise (`run_lost` and `sensor_lost`, may be NULL, receive
 * the first run, in their order, that is expected and missed, and the sensor); -1 when memory is
 * out. A refused run whose weights a usable one repeats is no loss. */
int ruling_can_answer(const struct ruling_set *set, size_t *run_lost, size_t *sensor_lost)
    __attribute__((warn_unused_result));

/* Rank of a rows x columns matrix (row-major, destroyed) by elimination with full pivoting; pivots
 * under 1e-6 are rounding, so columns should be scaled to about 1. */
size_t ruling_rank(double complex *matrix, size_t rows, size_t columns);

#endif
