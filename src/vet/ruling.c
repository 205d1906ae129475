#include "vet/ruling.h"

#include <stdlib.h>

/* Columns are scaled to 1, so that this tells rounding from weights that differ. */
static const double PIVOT_LEAST = 1e-6; /* a weight is not known to six digits: as solve has it */

size_t ruling_rank(double complex *m, size_t rows, size_t columns)
{
    size_t rank = 0;

    while (rank < rows && rank < columns) {
        size_t row = rank, column = rank;
        for (size_t i = rank; i < rows; i++) {
            for (size_t j = rank; j < columns; j++) {
                if (cabs(m[i * columns + j]) > cabs(m[row * columns + column])) {
                    row = i;
                    column = j;
                }
            }
        }
        if (!(cabs(m[row * columns + column]) > PIVOT_LEAST))
            break;
        for (size_t j = 0; j < columns; j++) {
            double complex t = m[row * columns + j];
            m[row * columns + j] = m[rank * columns + j];
            m[rank * columns + j] = t;
        }
        for (size_t i = 0; i < rows; i++) {
            double complex t = m[i * columns + column];
            m[i * columns + column] = m[i * columns + rank];
            m[i * columns + rank] = t;
        }
        for (size_t i = rank + 1; i < rows; i++) {
            double complex f = m[i * columns + rank] / m[rank * columns + rank];
            for (size_t j = rank; j < columns; j++)
                m[i * columns + j] -= f * m[rank * columns + j];
        }
        rank++;
    }
    return rank;
}

/* Rank of [1, weights] over the runs of a condition that `take` has for the sensor, and run
 * `extra`. */
static size_t rank_for(const struct ruling_set *s, const bool *take, size_t extra, size_t sensor,
                       int condition, double complex *room)
{
    size_t columns = s->plane_count + 1, rows = 0;

    for (size_t r = 0; r < s->run_count; r++) {
        if (s->condition[r] != condition || (r != extra && !take[r * s->sensor_count + sensor]))
            continue;
        room[rows * columns] = 1;
        for (size_t p = 0; p < s->plane_count; p++) {
            double largest = 0; /* of this plane over these runs: the scale of the column */
            for (size_t q = 0; q < s->run_count; q++) {
                if (s->condition[q] != condition ||
                    (q != extra && !take[q * s->sensor_count + sensor]))
                    continue;
                double m = cabs(s->weights[q * s->plane_count + p]);
                largest = m > largest ? m : largest;
            }
            room[rows * columns + p + 1] =
                largest > 0 ? s->weights[r * s->plane_count + p] / largest : 0;
        }
        rows++;
    }
    return ruling_rank(room, rows, columns);
}

/* True where the sensor loses rank for want of run `run`: all that is expected would give more than
 * what is usable, and this run some of it. */
static bool is_missed(const struct ruling_set *s, size_t run, size_t sensor, double complex *room)
{
    int condition = s->condition[run];
    size_t left = rank_for(s, s->usable, s->run_count, sensor, condition, room);

    return left < rank_for(s, s->expected, s->run_count, sensor, condition, room) &&
           left < rank_for(s, s->usable, run, sensor, condition, room);
}

/* True where the sensor is lost in the condition; *run: the first that is missed. */
static bool is_lost(const struct ruling_set *s, size_t sensor, int condition, size_t *run,
                    double complex *room)
{
    for (*run = 0; *run < s->run_count; ++*run) {
        size_t at = *run * s->sensor_count + sensor;
        if (s->condition[*run] == condition && s->expected[at] && !s->usable[at] &&
            is_missed(s, *run, sensor, room))
            return true;
    }
    return false;
}

static bool is_expected_in(const struct ruling_set *s, size_t sensor, int condition)
{
    for (size_t r = 0; r < s->run_count; r++)
        if (s->condition[r] == condition && s->expected[r * s->sensor_count + sensor])
            return true;
    return false;
}

/* True where the condition cannot answer; *run and *sensor: what is missed first. */
static bool condition_lost(const struct ruling_set *s, int condition, size_t *run, size_t *sensor,
                           double complex *room)
{
    size_t lost = 0, kept = 0, at;

    *run = s->run_count;
    for (size_t i = 0; i < s->sensor_count; i++) {
        if (!s->in_aim[i] || !is_expected_in(s, i, condition))
            continue;
        if (!is_lost(s, i, condition, &at, room)) {
            kept++;
            continue;
        }
        lost++;
        if (at < *run) {
            *run = at;
            *sensor = i;
        }
    }
    return lost > 0 && (s->named || kept == 0);
}

int ruling_can_answer(const struct ruling_set *s, size_t *run_lost, size_t *sensor_lost)
{
    double complex *room = malloc((s->run_count * (s->plane_count + 1) + 1) * sizeof *room);
    size_t first = s->run_count, run, sensor = 0;

    if (!room)
        return -1;
    for (size_t r = 0; r < s->run_count; r++) {
        if (!condition_lost(s, s->condition[r], &run, &sensor, room) || run >= first)
            continue;
        first = run;
        if (run_lost)
            *run_lost = run;
        if (sensor_lost)
            *sensor_lost = sensor;
    }
    free(room);
    return first == s->run_count;
}
