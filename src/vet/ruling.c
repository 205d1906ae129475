#include "vet/ruling.h"

#include <stdlib.h>

/* Columns are scaled to 1, so that this tells rounding from weights that differ. */
static const double PIVOT_LEAST = 1e-9;

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
            double largest = 0; /* of this plane over all runs: the scale of the column */
            for (size_t q = 0; q < s->run_count; q++) {
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

int ruling_can_answer(const struct ruling_set *s, size_t *run_lost, size_t *sensor_lost)
{
    double complex *room = malloc((s->run_count * (s->plane_count + 1) + 1) * sizeof *room);
    int answer = 1;

    if (!room)
        return -1;
    for (size_t r = 0; answer == 1 && r < s->run_count; r++) {
        for (size_t i = 0; answer == 1 && i < s->sensor_count; i++) {
            size_t at = r * s->sensor_count + i;
            if (!s->in_aim[i] || !s->expected[at] || s->usable[at] || !is_missed(s, r, i, room))
                continue;
            answer = 0;
            if (run_lost)
                *run_lost = r;
            if (sensor_lost)
                *sensor_lost = i;
        }
    }
    free(room);
    return answer;
}
