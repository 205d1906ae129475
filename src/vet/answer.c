#include "vet/answer.h"

#include <stdlib.h>
#include <string.h>

#include "vet/ruling.h"

static bool is_expected(const struct job_run *run, size_t sensor)
{
    if (run->without && run->without[sensor])
        return false;
    for (size_t i = 0; i < run->hand_count; i++)
        if (run->hand[i].sensor == sensor)
            return true;
    return run->hand_count == 0;
}

/* Fills what the ruling looks at; arrays as in struct ruling_set, rows in the order of `order`. */
static size_t fill_set(const struct vet_runs *runs, const size_t *order, const struct job *job,
                       int *condition, double complex *weights, bool *expected, bool *usable,
                       size_t *positions)
{
    size_t rows = 0;

    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = &runs->items[order[k]];
        if (run->index < 0 || facts_role(run, job)[0])
            continue;
        condition[rows] = (int)rows;
        for (size_t q = rows; q-- > 0;)
            if (!strcmp(runs->items[positions[q]].condition, run->condition))
                condition[rows] = condition[q];
        for (size_t p = 0; p < job->plane_count; p++)
            weights[rows * job->plane_count + p] = job_run_weight(job, (size_t)run->index, p);
        for (size_t i = 0; i < job->sensor_count; i++) {
            expected[rows * job->sensor_count + i] = is_expected(&job->runs[run->index], i);
            usable[rows * job->sensor_count + i] = run->readings[i].present && run->readings[i].use;
        }
        positions[rows++] = order[k];
    }
    return rows;
}

static bool in_aim(const struct job *job, size_t sensor)
{
    return !job->aim.named || !job->aim.targets || job->aim.targets[sensor].in_aim;
}

/* True where no slow roll gave a usable vector for the sensor, though there is one; *first: it. */
static bool is_unrolled(const struct vet_runs *runs, const size_t *order, const struct job *job,
                        size_t sensor, size_t *first)
{
    bool slow = false, read = false;

    for (size_t k = runs->count; k-- > 0;) {
        const struct vet_run *run = &runs->items[order[k]];
        const struct vet_reading *r = &run->readings[sensor];
        if (!strcmp(facts_role(run, job), "runout")) {
            slow = true;
            *first = order[k];
            if (r->present && r->use && r->has_phase)
                return false;
        } else if (run->index >= 0) {
            read = read || r->present;
        }
    }
    return slow && read;
}

/* A probe of the aim is lost where its runout cannot be taken off. */
static bool runout_lost(const struct vet_runs *runs, const size_t *order, const struct job *job,
                        size_t *run_lost, size_t *sensor_lost)
{
    for (size_t i = 0; i < job->sensor_count; i++)
        if (job->sensors[i].quantity == QUANTITY_DISPLACEMENT && in_aim(job, i) &&
            is_unrolled(runs, order, job, i, run_lost)) {
            *sensor_lost = i;
            return true;
        }
    return false;
}

int answer_possible(const struct vet_runs *runs, const size_t *order, const struct job *job,
                    size_t *run_lost, size_t *sensor_lost)
{
    size_t n = runs->count + 1, row = 0;
    int *condition = calloc(n, sizeof *condition);
    double complex *weights = calloc(n * (job->plane_count + 1), sizeof *weights);
    bool *expected = calloc(n * (job->sensor_count + 1), sizeof *expected);
    bool *usable = calloc(n * (job->sensor_count + 1), sizeof *usable);
    bool *aim = calloc(job->sensor_count + 1, sizeof *aim);
    size_t *positions = calloc(n, sizeof *positions);
    int answer = -1;

    if (condition && weights && expected && usable && aim && positions) {
        struct ruling_set set = {
            0,   job->sensor_count, job->plane_count, condition, weights, expected, usable,
            aim, job->aim.named};
        set.run_count = fill_set(runs, order, job, condition, weights, expected, usable, positions);
        for (size_t i = 0; i < job->sensor_count; i++)
            aim[i] = in_aim(job, i);
        answer = ruling_can_answer(&set, &row, sensor_lost);
        *run_lost = positions[row];
        if (answer == 1 && runout_lost(runs, order, job, run_lost, sensor_lost))
            answer = 0;
    }
    free(positions);
    free(aim);
    free(usable);
    free(expected);
    free(weights);
    free(condition);
    return answer;
}
