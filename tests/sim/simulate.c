/* simulate.c - writes a whole simulated job: job.ini, its recordings and truth.json.
 *
 *     simulate SPEC.json FOLDER
 *
 * The folder must exist. Same spec, same bytes. truth.json holds what the geometry says, measured
 * on the noise-free motion (see rotor_truth): the 1x vector of every run and sensor, the answer of
 * every sensor to 1 kg at each plane, and the weights that undo the heavy spots where these lie in
 * planes.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "spec.h"

static double sheet_angle(const struct spec *spec, double against)
{
    return spec->with_rotation ? fmod(360 - against, 360) : against;
}

static struct rotor_mass fitted(const struct spec *spec, const struct spec_weight *w)
{
    double against = spec->with_rotation ? -w->angle_deg : w->angle_deg;
    return rotor_weight(&spec->rotor, w->plane, w->mass, w->radius, against);
}

/* Everything unbalanced in that run; returns how many. */
static size_t masses_of(const struct spec *spec, const struct spec_run *run, struct rotor_mass *m)
{
    size_t n = 0;
    for (size_t i = 0; i < spec->heavy_count; i++)
        m[n++] = spec->heavy[i];
    for (size_t i = 0; i < run->weight_count; i++)
        m[n++] = fitted(spec, &run->weights[i]);
    for (size_t i = 0; i < run->moved_count; i++)
        m[n++] = run->moved[i];
    return n;
}

static struct rotor rotor_of(const struct spec *spec, const struct spec_run *run, size_t number)
{
    struct rotor rotor = spec->rotor;
    rotor.rpm = run->rpm;
    rotor.sweep_rpm_s = run->sweep_rpm_s;
    rotor.start_deg += 137.5 * (double)number; /* no two recordings start at the same place */
    return rotor;
}

static int write_run(const struct spec *spec, const char *folder, size_t number)
{
    const struct spec_run *run = &spec->runs[number];
    struct rotor rotor = rotor_of(spec, run, number);
    size_t sensors = rotor.sensor_count, columns = sensors + 1;
    size_t n = (size_t)lround(run->seconds * spec->rate_hz);
    double *motion = calloc(n * sensors, sizeof *motion), *data = calloc(n * columns, sizeof *data);
    int bad = -1;
    if (!motion || !data)
        goto done;
    struct rotor_mass masses[3 * SPEC_MASSES];
    size_t count = masses_of(spec, run, masses);
    rotor_run(&rotor, masses, count, spec->rate_hz, n, spec->oversample, motion);
    uint64_t seed = spec->seed * 1000003 + number * 101;
    for (size_t k = 0; k < sensors; k++) {
        const struct spec_sensor *s = &spec->sensors[k];
        for (size_t i = 0; i < n; i++)
            data[i * columns + k] = motion[i * sensors + k] / s->si_per_unit;
        noise_add(&s->noise, &rotor, seed + k, spec->rate_hz, n, data + k, columns);
        for (size_t i = 0; i < n && s->v_per_unit != 0; i++)
            data[i * columns + k] *= s->v_per_unit;
    }
    optical_run(&spec->optical, &rotor, seed + 99, spec->rate_hz, n, data + sensors, columns);
    struct recording recording = {data, n, columns, spec->rate_hz};
    char path[4096];
    snprintf(path, sizeof path, "%s/%s.%s", folder, run->file,
             strcmp(spec->format, "rf64") ? spec->format : "wav");
    bad = strcmp(spec->format, "csv")
              ? recording_sound(path, &recording, spec->format, spec->bits, spec->full_scale)
              : recording_text(path, &recording, &spec->csv);
    if (bad)
        fprintf(stderr, "simulate: cannot write: '%s'\n", path);
done:
    free(data);
    free(motion);
    return bad;
}

static void raw_lines(FILE *file, const json_t *lines)
{
    for (size_t i = 0; i < json_array_size(lines); i++)
        fprintf(file, "%s\n", json_string_value(json_array_get(lines, i)));
}

static void section(FILE *file, const struct spec *spec, const char *name)
{
    const json_t *lines = json_object_get(json_object_get(spec->json, "sheet"), name);
    if (!json_array_size(lines))
        return;
    fprintf(file, "\n[%s]\n", name);
    raw_lines(file, lines);
}

static void sheet_channels(FILE *file, const struct spec *spec)
{
    bool csv = !strcmp(spec->format, "csv"), named = csv && spec->csv.names[0];
    int first = csv && spec->csv.time_name ? 2 : 1; /* columns count the time column */
    size_t n = spec->rotor.sensor_count;
    if (named)
        fprintf(file, "\n[tacho]\nchannel = Tacho\n");
    else
        fprintf(file, "\n[tacho]\nchannel = %d\n", (int)n + first);
    if (spec->edge < 0)
        fprintf(file, "edge = falling\n");
    raw_lines(file, json_object_get(json_object_get(spec->json, "sheet"), "tacho"));
    for (size_t i = 0; i < n; i++) {
        const struct spec_sensor *s = &spec->sensors[i];
        fprintf(file, "\n[sensor %s]\n", s->name);
        if (named)
            fprintf(file, "channel = %s\n", s->name);
        else
            fprintf(file, "channel = %d\n", (int)i + first);
        fprintf(file, "unit = %s\n", s->unit);
        if (s->scale)
            fprintf(file, "scale = %s\n", s->scale);
        if (s->show)
            fprintf(file, "show = %s\n", s->show);
    }
}

static void sheet_run(FILE *file, const struct spec *spec, const struct spec_run *run)
{
    fprintf(file, "\n[run %s]\nfile = %s.%s\n", run->name, run->file,
            strcmp(spec->format, "rf64") ? spec->format : "wav");
    for (size_t i = 0; i < run->weight_count; i++) {
        const struct spec_weight *w = &run->weights[i];
        fprintf(file, "weight %s = %.10g g at ", spec->planes[w->plane].name, w->mass * 1000);
        if (w->position)
            fprintf(file, "position %d", w->position);
        else
            fprintf(file, "%.10g deg", w->angle_deg);
        if (w->radius != spec->planes[w->plane].radius)
            fprintf(file, " radius %.10g mm", w->radius * 1000);
        fputc('\n', file);
    }
    raw_lines(file, run->lines);
}

static int write_sheet(const struct spec *spec, const char *folder)
{
    char path[4096];
    snprintf(path, sizeof path, "%s/job.ini", folder);
    FILE *file = fopen(path, "wb");
    if (!file) {
        fprintf(stderr, "simulate: cannot write: '%s'\n", path);
        return -1;
    }
    fprintf(file, "[job]\ntitle = %s\nangles = %s rotation\n", spec->title,
            spec->with_rotation ? "with" : "against");
    raw_lines(file, json_object_get(json_object_get(spec->json, "sheet"), "job"));
    section(file, spec, "rotor");
    section(file, spec, "recording");
    sheet_channels(file, spec);
    for (size_t i = 0; i < spec->plane_count; i++) {
        fprintf(file, "\n[plane %s]\nradius = %.10g mm\n", spec->planes[i].name,
                spec->planes[i].radius * 1000);
        raw_lines(file, spec->planes[i].lines);
    }
    for (size_t i = 0; i < spec->run_count; i++)
        sheet_run(file, spec, &spec->runs[i]);
    section(file, spec, "aim");
    section(file, spec, "limits");
    int bad = ferror(file);
    if (fclose(file))
        bad = 1;
    return bad ? -1 : 0;
}

/* The edge of the tape that the sheet's edge is: a rising edge of an inverted pulse is its end. */
static int tape_edge(const struct spec *spec)
{
    return spec->optical.high_v > spec->optical.low_v ? spec->edge : -spec->edge;
}

static json_t *vector_of(const struct spec *spec, const struct rotor *rotor,
                         const struct rotor_mass *masses, size_t count, size_t sensor)
{
    struct rotor_vector z = rotor_truth(rotor, masses, count, sensor, tape_edge(spec));
    return json_pack("{s:f,s:f,s:[f,f]}", "amplitude", z.amplitude, "lag_deg", z.lag_deg, "vector",
                     z.re, z.im);
}

static json_t *truth_readings(const struct spec *spec)
{
    json_t *runs = json_object();
    for (size_t i = 0; i < spec->run_count; i++) {
        const struct spec_run *run = &spec->runs[i];
        struct rotor rotor = rotor_of(spec, run, i);
        struct rotor_mass masses[3 * SPEC_MASSES];
        size_t count = masses_of(spec, run, masses);
        json_t *sensors = json_object();
        for (size_t k = 0; k < rotor.sensor_count; k++)
            json_object_set_new(sensors, spec->sensors[k].name,
                                vector_of(spec, &rotor, masses, count, k));
        json_object_set_new(runs, run->name, sensors);
    }
    return runs;
}

/* What 1 kg alone at the mark of each plane makes each sensor show. */
static json_t *truth_responses(const struct spec *spec)
{
    json_t *planes = json_object();
    for (size_t p = 0; p < spec->plane_count; p++) {
        struct rotor_mass one = rotor_weight(&spec->rotor, p, 1, spec->planes[p].radius, 0);
        json_t *sensors = json_object();
        for (size_t k = 0; k < spec->rotor.sensor_count; k++)
            json_object_set_new(sensors, spec->sensors[k].name,
                                vector_of(spec, &spec->rotor, &one, 1, k));
        json_object_set_new(planes, spec->planes[p].name, sensors);
    }
    return planes;
}

/* Opposite to the sum of the heavy spots of each plane, at the plane's radius. */
static json_t *truth_corrections(const struct spec *spec)
{
    const double degree = 6.28318530717958647692 / 360;
    json_t *planes = json_object();
    for (size_t p = 0; p < spec->plane_count; p++) {
        double x = 0, y = 0;
        for (size_t i = 0; i < spec->heavy_count; i++) {
            const struct rotor_mass *m = &spec->heavy[i];
            x -= m->plane == p ? m->mass * m->radius * cos(m->body_deg * degree) : 0;
            y -= m->plane == p ? m->mass * m->radius * sin(m->body_deg * degree) : 0;
        }
        double against = rotor_against(&spec->rotor, atan2(y, x) / degree);
        json_object_set_new(planes, spec->planes[p].name,
                            json_pack("{s:f,s:f,s:f}", "mass", hypot(x, y) / spec->planes[p].radius,
                                      "angle_deg", against, "sheet_deg",
                                      sheet_angle(spec, against)));
    }
    return planes;
}

static int write_truth(const struct spec *spec, const char *folder)
{
    char path[4096];
    snprintf(path, sizeof path, "%s/truth.json", folder);
    json_t *truth = json_pack("{s:o,s:o,s:o}", "corrections", truth_corrections(spec), "readings",
                              truth_readings(spec), "responses", truth_responses(spec));
    /* ten digits: beyond what the last bit of a sine differs by between C libraries */
    int bad = json_dump_file(truth, path, JSON_INDENT(2) | JSON_REAL_PRECISION(10));
    json_decref(truth);
    if (bad)
        fprintf(stderr, "simulate: cannot write: '%s'\n", path);
    return bad ? -1 : 0;
}

int main(int argc, char **argv)
{
    static struct spec spec;
    if (argc != 3) {
        fprintf(stderr, "usage: simulate SPEC.json FOLDER\n");
        return 2;
    }
    if (spec_read(&spec, argv[1]))
        return 2;
    int bad = write_sheet(&spec, argv[2]) || write_truth(&spec, argv[2]);
    for (size_t i = 0; i < spec.run_count && !bad; i++)
        bad = write_run(&spec, argv[2], i);
    spec_release(&spec);
    return bad ? 1 : 0;
}
