#include "solve_campaign.h"

#include <complex.h>
#include <lapacke.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "solve/answer.h"
#include "solve/forecast.h"
#include "solve/model.h"
#include "solve/outlook.h"

#define PLANES 3
#define SENSORS (PLANES + 1)
#define RUNS 8
#define SCATTER 0.03 /* of as found per component; the sheet says so, too */
#define RPM 1480

struct desk {
    struct job job;
    struct job_sensor sensors[SENSORS];
    struct job_target targets[SENSORS];
    struct job_plane planes[PLANES];
    struct job_run runs[RUNS];
    struct job_weight weights[RUNS];
    struct job_response stored[SENSORS];
    struct model_reading readings[RUNS * SENSORS];
    double complex truth[SENSORS][PLANES + 1];
    size_t count;
};

static void need(bool good)
{
    if (!good) {
        fprintf(stderr, "solve_campaign: a kernel failed\n");
        exit(1);
    }
}

static double uniform(uint64_t *seed) /* (0, 1); multiplier of Knuth's MMIX generator */
{
    *seed = *seed * 6364136223846793005u + 1442695040888963407u;
    return ((double)(*seed >> 12) + 0.5) / 4503599627370496.0;
}

static double complex normal(uint64_t *seed) /* Box & Muller 1958; variance 1 per component */
{
    double r = sqrt(-2 * log(uniform(seed)));
    return angle_vector(r, 360 * uniform(seed));
}

static double complex noise(const struct desk *d, size_t s, uint64_t *seed)
{
    return SCATTER * cabs(d->truth[s][0]) * normal(seed);
}

static void set_job(struct desk *d, size_t planes)
{
    memset(d, 0, sizeof *d);
    job_init(&d->job);
    d->job.aim.repeatability = SCATTER;
    d->job.aim.targets = d->targets;
    d->job.sensors = d->sensors;
    d->job.sensor_count = planes + 1;
    d->job.planes = d->planes;
    d->job.plane_count = planes;
    d->job.runs = d->runs;
    for (size_t s = 0; s <= planes; s++) {
        snprintf(d->sensors[s].name, NAME_ROOM, "S%zu", s);
        d->sensors[s].quantity = d->sensors[s].show.quantity = QUANTITY_VELOCITY;
        d->targets[s] = (struct job_target){NAN, QUANTITY_VELOCITY, true};
    }
    for (size_t p = 0; p < planes; p++) {
        d->planes[p] = (struct job_plane){.radius_m = 0.4,
                                          .any_position = true,
                                          .pieces = 4,
                                          .most = INFINITY,
                                          .most_in_all = INFINITY};
        snprintf(d->planes[p].name, NAME_ROOM, "P%zu", p);
    }
}

/* Plane p is felt most by sensor p, at 40 % by the others; the standard error of a change is that
 * of two readings, 2 SCATTER of as found (root of the complex variance). */
static void set_truth(struct desk *d, double effect, uint64_t *seed)
{
    for (size_t s = 0; s < d->job.sensor_count; s++) {
        d->truth[s][0] = angle_vector(1 + uniform(seed), 360 * uniform(seed));
        for (size_t p = 0; p < d->job.plane_count; p++)
            d->truth[s][p + 1] =
                angle_vector(effect * 2 * SCATTER * cabs(d->truth[s][0]) * (s == p ? 1 : 0.4),
                             360 * uniform(seed));
    }
}

static double complex response_at(const struct desk *d, size_t s, const double complex *w)
{
    double complex z = d->truth[s][0];
    for (size_t p = 0; p < d->job.plane_count; p++)
        z += d->truth[s][p + 1] * w[p];
    return z;
}

/* One more run; plane below 0: nothing mounted. */
static void add_run(struct desk *d, int plane, uint64_t *seed)
{
    size_t r = d->job.run_count++;
    struct job_run *run = &d->runs[r];
    double complex w[PLANES] = {0};
    snprintf(run->name, NAME_ROOM, "run %zu", r);
    strcpy(run->condition, "service");
    run->weights = &d->weights[r];
    if (plane >= 0) {
        double deg = 360 * uniform(seed);
        w[plane] = angle_vector(1, deg);
        run->weights[run->weight_count++] = (struct job_weight){(size_t)plane, 1, 0.4, 1, deg, 0};
    }
    for (size_t s = 0; s < d->job.sensor_count; s++) {
        struct model_reading *m = &d->readings[d->count++];
        *m = (struct model_reading){
            .run = r, .sensor = s, .speed_rpm = RPM, .phase = true, .use = true};
        strcpy(m->condition, "service");
        m->vector = response_at(d, s, w) + noise(d, s, seed);
        m->amplitude = cabs(m->vector);
    }
}

/* The last plane's responses as an earlier job found them: a change of two readings. */
static void store(struct desk *d, uint64_t *seed)
{
    size_t p = d->job.plane_count - 1;
    d->job.responses = d->stored;
    for (size_t s = 0; s < d->job.sensor_count; s++) {
        struct job_response *r = &d->stored[d->job.response_count++];
        double variance = 2 * pow(SCATTER * cabs(d->truth[s][0]), 2);
        *r = (struct job_response){
            .sensor = s, .plane = p, .cov = {variance, 0, variance}, .speed_rpm = RPM};
        strcpy(r->condition, "service");
        r->vector = d->truth[s][p + 1] + noise(d, s, seed) + noise(d, s, seed);
    }
}

/* The least-squares weight of the truth, in the solver's own scaling of the sensors. */
static void true_weights(const struct desk *d, const struct answer *a, double complex *w)
{
    double complex m[SENSORS * PLANES], b[SENSORS];
    size_t planes = d->job.plane_count;
    for (size_t s = 0; s <= planes; s++) {
        b[s] = -a->scale[s] * d->truth[s][0];
        for (size_t p = 0; p < planes; p++)
            m[s * planes + p] = a->scale[s] * d->truth[s][p + 1];
    }
    need(LAPACKE_zgels(LAPACK_ROW_MAJOR, 'N', (lapack_int)planes + 1, (lapack_int)planes, 1, m,
                       (lapack_int)planes, b, 1) == 0);
    memcpy(w, b, planes * sizeof *w);
}

static void count_ellipses(const struct desk *d, const struct answer *a, struct solve_tally *tally)
{
    double complex want[PLANES];
    size_t n = 2 * a->planes;
    true_weights(d, a, want);
    for (size_t p = 0; p < a->planes; p++) {
        const double *e = a->ellipse + 2 * p * n + 2 * p;
        double xx = e[0], xy = e[1], yy = e[n + 1];
        double re = creal(want[p] - a->classical[p]), im = cimag(want[p] - a->classical[p]);
        double d2 = (yy * re * re - 2 * xy * re * im + xx * im * im) / (xx * yy - xy * xy);
        tally->inside += d2 < 5.9915; /* chi-square, 2 degrees of freedom, 95 % (table) */
        tally->ellipses++;
    }
}

static void solve(struct desk *d, struct solve_tally *tally, uint64_t *seed)
{
    struct model model;
    struct answer a;
    need(model_init(&model, &d->job, d->readings, d->count) == MODEL_OK);
    need(answer_init(&a, &model) == ANSWER_OK && a.rows == d->job.sensor_count);
    need(answer_correct(&a) == ANSWER_OK && answer_place(&a) == ANSWER_OK);
    need(outlook_fill(&a) == ANSWER_OK);
    for (size_t i = 0; i < a.forecast_count; i++) {
        size_t s = a.forecasts[i].row->sensor;
        double next = cabs(response_at(d, s, a.placed_weights) + noise(d, s, seed));
        tally->held += next >= a.forecasts[i].range[0] && next <= a.forecasts[i].range[1];
        tally->ranges++;
    }
    count_ellipses(d, &a, tally);
    answer_release(&a);
    model_release(&model);
}

void solve_campaign_run(const struct solve_campaign *c, struct solve_tally *tally)
{
    struct desk *d = malloc(sizeof *d);
    uint64_t seed = c->seed;
    need(d != NULL);
    for (int i = 0; i < c->jobs; i++) {
        set_job(d, c->planes);
        set_truth(d, c->least + (c->most - c->least) * uniform(&seed), &seed);
        for (int k = 0; k <= (i % 2 ? c->repeats : 0); k++)
            add_run(d, -1, &seed);
        for (size_t p = 0; p + (c->stored ? 1 : 0) < c->planes; p++)
            add_run(d, (int)p, &seed);
        if (c->stored)
            store(d, &seed);
        solve(d, tally, &seed);
    }
    free(d);
}
