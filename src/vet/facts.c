#include "vet/facts.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const int MULTIPLE_MOST = 8;      /* marks a turn that somebody may have overlooked */
static const double MULTIPLE_OFF = 0.05; /* of the speed: slip and load are less, common practice */

int facts_add(struct vet_runs *runs, size_t sensor_count)
{
    struct vet_run *run;

    if (runs->count == runs->room) {
        size_t room = runs->room ? 2 * runs->room : 16;
        struct vet_run *more = realloc(runs->items, room * sizeof *more);
        if (!more)
            return -1;
        runs->items = more;
        runs->room = room;
    }
    run = &runs->items[runs->count];
    *run = (struct vet_run){
        .index = -1, .parent = -1, .pulses = true, .jitter_deg = NAN, .tacho_rpm = NAN};
    run->readings = calloc(sensor_count + 1, sizeof *run->readings);
    run->channels = calloc(sensor_count + 1, sizeof *run->channels);
    if (!run->readings || !run->channels) {
        free(run->readings);
        free(run->channels);
        return -1;
    }
    for (size_t i = 0; i < sensor_count; i++) {
        struct vet_reading *r = &run->readings[i];
        r->amplitude = r->two_x = r->half_order = r->neighbour = r->neighbour_order = NAN;
        r->resonance = resonance_unknown();
        r->reason = -1;
        run->channels[i].same_as = -1;
    }
    return (int)runs->count++;
}

int facts_at_condition(struct vet_runs *runs, int parent, const char *condition,
                       size_t sensor_count)
{
    int position;

    if (!strcmp(runs->items[parent].condition, condition))
        return parent;
    for (size_t k = (size_t)parent + 1; k < runs->count; k++)
        if (runs->items[k].parent == parent && !strcmp(runs->items[k].condition, condition))
            return (int)k;
    position = facts_add(runs, sensor_count);
    if (position < 0)
        return -1;
    struct vet_run *run = &runs->items[position], *from = &runs->items[parent];
    memcpy(run->name, from->name, sizeof run->name);
    strncpy(run->condition, condition, sizeof run->condition - 1);
    run->index = from->index;
    run->parent = parent;
    return position;
}

void facts_hand_down(struct vet_runs *runs, int parent, size_t sensor_count)
{
    for (size_t k = (size_t)parent + 1; k < runs->count; k++) {
        if (runs->items[k].parent != parent)
            continue;
        runs->items[k].refused = runs->items[parent].refused;
        for (size_t i = 0; i < sensor_count; i++)
            runs->items[k].readings[i].use &= runs->items[parent].readings[i].use;
    }
}

void facts_release(struct vet_runs *runs)
{
    for (size_t k = 0; k < runs->count; k++) {
        free(runs->items[k].hashes);
        free(runs->items[k].readings);
        free(runs->items[k].channels);
    }
    free(runs->items);
    *runs = (struct vet_runs){0};
}

const char *facts_role(const struct vet_run *run, const struct job *job)
{
    return run->index < 0 || run->parent >= 0 ? "" : job->runs[run->index].role;
}

double facts_speed(const struct vet_run *run, const struct job *job, bool used)
{
    for (size_t i = 0; i < job->sensor_count; i++)
        if (run->readings[i].present && (run->readings[i].use || !used))
            return run->readings[i].speed_rpm;
    return NAN;
}

int facts_marks(const struct vet_run *run, const struct job *job)
{
    double ratio = run->tacho_rpm / job->service_rpm;
    int given = job->tacho_marks > 1 ? job->tacho_marks : 1;

    if (run->hand || !run->has_tacho || run->marks == 0 || !(ratio > 0) || !isfinite(ratio))
        return 0;
    for (int k = 2; k <= MULTIPLE_MOST; k++) {
        if (fabs(ratio / k - 1) < MULTIPLE_OFF)
            return given * k;
        if (fabs(ratio * k - 1) < MULTIPLE_OFF && given % k == 0)
            return given / k;
    }
    return 0;
}
