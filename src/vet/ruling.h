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
};

/* 1 where every sensor of the aim, in every condition that has expected readings, keeps with its
 * usable readings the rank of [1, weights] that all expected ones would give, so that no run the
 * regression needs is lost; 0 where one does not (`run_lost` and `sensor_lost`, may be NULL,
 * receive the first run, in their order, that is expected and not usable for such a sensor, and the
 * sensor); -1 when memory is out. A refused run whose weights a usable one repeats is no loss. */
int ruling_can_answer(const struct ruling_set *set, size_t *run_lost, size_t *sensor_lost)
    __attribute__((warn_unused_result));

/* Rank of a rows x columns matrix (row-major, destroyed) by elimination with full pivoting; pivots
 * under 1e-9 are rounding, so columns should be scaled to about 1. */
size_t ruling_rank(double complex *matrix, size_t rows, size_t columns);

#endif
