/* bench_track.c - how long the tracker takes: four columns, 512 samples a turn, no pipe.
 *
 *     bench_track [MILLION_FRAMES]        prints ns per frame and the bytes held */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#include "track/tracker.h"
#include "unit/track_signal.h"

#define COLUMNS 4
#define PERIOD 512
#define PART (PERIOD * 128)

static float *one_part(void)
{
    float *x = malloc(sizeof *x * PART * COLUMNS);
    uint64_t state = 88172645463325252ULL;

    for (size_t i = 0; x && i < PART; i++) {
        double theta = TAU * (double)i / PERIOD;

        for (size_t c = 0; c + 1 < COLUMNS; c++) {
            x[i * COLUMNS + c] = (float)(cos(theta - (double)c) + 0.3 * signal_normal(&state));
        }
        x[i * COLUMNS + COLUMNS - 1] = i % PERIOD > 16 && i % PERIOD < 40 ? 5.0f : 0.0f;
    }
    return x;
}

int main(int argc, char **argv)
{
    double million = argc > 1 ? atof(argv[1]) : 15.3;
    size_t parts = (size_t)(million * 1e6 / PART) + 1;
    double rail[COLUMNS] = {NAN, NAN, NAN, NAN};
    struct tracker_set_up set_up = {
        12800, (double)(parts * PART), COLUMNS, COLUMNS - 1, rail, 1, 1, NAN, NAN, NULL, false};
    struct tracker tracker;
    struct timespec from, to;
    float *x = one_part();

    if (!x || tracker_init(&tracker, &set_up)) {
        return 1;
    }
    clock_gettime(CLOCK_MONOTONIC, &from);
    for (size_t p = 0; p < parts; p++) {
        if (tracker_add(&tracker, x, PART)) {
            return 1;
        }
    }
    if (tracker_finish(&tracker)) {
        return 1;
    }
    clock_gettime(CLOCK_MONOTONIC, &to);
    double s = (double)(to.tv_sec - from.tv_sec) + 1e-9 * (double)(to.tv_nsec - from.tv_nsec);

    printf("%.1f million frames of %d columns: %.3f s, %.1f ns a frame; %.1f MiB held; %ld marks\n",
           1e-6 * (double)(parts * PART), COLUMNS, s, 1e9 * s / (double)(parts * PART),
           (double)(tracker.room * COLUMNS * sizeof(float)) / 1048576, tracker.marks.count);
    tracker_release(&tracker);
    free(x);
    return 0;
}
