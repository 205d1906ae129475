/* The records from samples to findings. Those of the answer are in answers.c. */
#include "stream/records.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "stream/fields.h"

static const char *sensor_text(const struct job *job, int sensor)
{
    return sensor < 0 ? "tacho" : job->sensors[sensor].name;
}

static const char *text_or_null(const char *text)
{
    return text[0] ? text : NULL;
}

/* ---- run, wave, block ---- */

void run_print(const struct run_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "run");
    line_text(line, "run", r->run);
    line_text(line, "condition", r->condition);
    job_print_weights(job, r->job_run, line);
    line_open(line, "files", '[');
    for (size_t i = 0; i < r->file_count; i++) {
        line_open(line, NULL, '{');
        line_text(line, "path", r->files[i].path);
        line_text(line, "sha256", r->files[i].sha256);
        line_integer(line, "frames", r->files[i].frames);
        line_real(line, "rate_hz", r->files[i].rate_hz);
        line_close(line, '}');
    }
    line_close(line, ']');
    line_text(line, "when", text_or_null(r->when));
    line_end(line);
}

static void parse_file(struct file_record *file, const json_t *json, struct fields *outer)
{
    struct fields f = fields_of(json);
    const char *path = fields_text(&f, "path");
    file->path = malloc(strlen(path) + 1);
    if (file->path)
        memcpy(file->path, path, strlen(path) + 1);
    else
        fields_fail(&f, fields_no_memory);
    fields_copy(&f, "sha256", file->sha256, sizeof file->sha256);
    file->frames = fields_integer(&f, "frames", 0);
    file->rate_hz = fields_real(&f, "rate_hz");
    if (f.why)
        fields_fail(outer, f.why);
}

int run_parse(struct run_record *r, const struct job *job, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct run_record){0};
    fields_name(&f, "run", r->run);
    fields_name(&f, "condition", r->condition);
    fields_copy(&f, "when", r->when, sizeof r->when);
    int index = job_find_run(job, r->run);
    r->job_run = index < 0 ? NULL : &job->runs[index];
    const json_t *files = fields_array(&f, "files");
    size_t count = json_array_size(files);
    r->files = count ? calloc(count, sizeof *r->files) : NULL;
    if (count && !r->files)
        fields_fail(&f, fields_no_memory);
    r->file_count = r->files ? count : 0;
    for (size_t i = 0; i < r->file_count; i++)
        parse_file(&r->files[i], json_array_get(files, i), &f);
    if (f.why)
        run_release(r);
    return fields_done(&f, why);
}

void run_release(struct run_record *r)
{
    for (size_t i = 0; i < r->file_count; i++)
        free(r->files[i].path);
    free(r->files);
    r->files = NULL;
    r->file_count = 0;
}

void wave_print(const struct wave_record *r, struct line *line)
{
    line_begin(line, "wave");
    line_text(line, "run", r->run);
    line_real(line, "rate_hz", r->rate_hz);
    line_open(line, "columns", '[');
    for (size_t i = 0; i < r->column_count; i++) {
        line_open(line, NULL, '{');
        line_text(line, "name", r->columns[i].name);
        line_text(line, "quantity", quantity_text(r->columns[i].quantity));
        line_real(line, "rail", r->columns[i].rail);
        line_close(line, '}');
    }
    line_close(line, ']');
    line_end(line);
}

int wave_parse(struct wave_record *r, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct wave_record){0};
    fields_name(&f, "run", r->run);
    r->rate_hz = fields_need_real(&f, "rate_hz");
    if (!(r->rate_hz > 0))
        fields_fail(&f, "the rate is not above zero");
    const json_t *columns = fields_array(&f, "columns");
    size_t count = json_array_size(columns);
    if (count < 1 || count > 1024)
        fields_fail(&f, "the number of columns is out of range");
    r->columns = f.why ? NULL : calloc(count, sizeof *r->columns);
    if (!r->columns)
        fields_fail(&f, fields_no_memory);
    r->column_count = r->columns ? count : 0;
    for (size_t i = 0; i < r->column_count; i++) {
        struct fields g = fields_of(json_array_get(columns, i));
        fields_name(&g, "name", r->columns[i].name);
        int quantity = quantity_parse(fields_text(&g, "quantity"));
        if (quantity < 0)
            fields_fail(&g, "a quantity that this version does not know");
        else
            r->columns[i].quantity = (enum quantity)quantity;
        r->columns[i].rail = fields_real(&g, "rail");
        if (g.why)
            fields_fail(&f, g.why);
    }
    if (f.why)
        wave_release(r);
    return fields_done(&f, why);
}

void wave_release(struct wave_record *r)
{
    free(r->columns);
    r->columns = NULL;
    r->column_count = 0;
}

void block_print(const char *run, long frames, struct line *line)
{
    line_begin(line, "block");
    line_text(line, "run", run);
    line_integer(line, "frames", frames);
    line_end(line);
}

int block_parse(char run[NAME_ROOM], long *frames, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    fields_name(&f, "run", run);
    *frames = (long)fields_integer(&f, "frames", -1);
    if (*frames < 0 || *frames > 1L << 32)
        fields_fail(&f, "the number of frames is out of range");
    return fields_done(&f, why);
}

/* ---- channel, turns, tacho, spectrum ---- */

void channel_print(const struct channel_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "channel");
    line_text(line, "run", r->run);
    line_text(line, "sensor", sensor_text(job, r->sensor));
    line_real(line, "min", r->min);
    line_real(line, "max", r->max);
    line_real(line, "resolution", r->resolution);
    line_integer(line, "railed", r->railed);
    if (r->same_as == -1)
        line_null(line, "same_as");
    else
        line_text(line, "same_as", sensor_text(job, r->same_as));
    line_integer(line, "samples", r->samples);
    line_boolean(line, "tacho", r->sensor < 0);
    line_end(line);
}

int channel_parse(struct channel_record *r, const struct job *job, const json_t *json,
                  const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct channel_record){.sensor = -1, .same_as = -1};
    fields_name(&f, "run", r->run);
    if (!fields_boolean(&f, "tacho", false))
        r->sensor = fields_sensor(&f, "sensor", job);
    r->min = fields_real(&f, "min");
    r->max = fields_real(&f, "max");
    r->resolution = fields_real(&f, "resolution");
    r->railed = fields_integer(&f, "railed", 0);
    r->samples = fields_integer(&f, "samples", 0);
    const char *same = fields_text(&f, "same_as");
    if (same[0]) {
        int sensor = job_find_sensor(job, same);
        r->same_as = sensor < 0 ? -2 : sensor;
    }
    return fields_done(&f, why);
}

static bool turns_without_phase(const struct turns_record *r)
{
    for (size_t i = 0; r->amplitudes && i < r->count; i++)
        if (!isnan(r->amplitudes[i]))
            return true;
    return false;
}

void turns_print(const struct turns_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "turns");
    line_text(line, "run", r->run);
    line_real(line, "t_s", r->t_s);
    line_integer(line, "turns", r->turns);
    line_real(line, "speed_rpm", r->speed_rpm);
    line_open(line, "vectors", '{');
    for (size_t i = 0; i < r->count; i++)
        line_vector(line, job->sensors[r->sensors[i]].name, r->vectors[i]);
    line_close(line, '}');
    line_open(line, "rest", '{');
    for (size_t i = 0; i < r->count; i++)
        line_real(line, job->sensors[r->sensors[i]].name, r->rest[i]);
    line_close(line, '}');
    if (turns_without_phase(r)) {
        line_open(line, "amplitudes", '{');
        for (size_t i = 0; i < r->count; i++)
            line_real(line, job->sensors[r->sensors[i]].name, r->amplitudes[i]);
        line_close(line, '}');
    }
    line_end(line);
}

static int turns_arrays(struct turns_record *r, size_t count)
{
    r->sensors = calloc(count + 1, sizeof *r->sensors);
    r->vectors = calloc(count + 1, sizeof *r->vectors);
    r->rest = calloc(count + 1, sizeof *r->rest);
    r->amplitudes = calloc(count + 1, sizeof *r->amplitudes);
    r->count = count;
    return r->sensors && r->vectors && r->rest && r->amplitudes ? 0 : -1;
}

int turns_parse(struct turns_record *r, const struct job *job, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct turns_record){0};
    fields_name(&f, "run", r->run);
    r->t_s = fields_need_real(&f, "t_s");
    r->turns = (long)fields_integer(&f, "turns", 0);
    r->speed_rpm = fields_need_real(&f, "speed_rpm");
    const json_t *vectors = fields_object(&f, "vectors"), *rest = fields_object(&f, "rest"),
                 *amplitudes = fields_object(&f, "amplitudes");
    size_t count = json_object_size(vectors);
    if (turns_arrays(r, count) < 0)
        fields_fail(&f, fields_no_memory);
    struct fields v = fields_of(vectors ? vectors : json), e = fields_of(rest ? rest : json),
                  a = fields_of(amplitudes ? amplitudes : json);
    const char *name;
    json_t *value;
    size_t i = 0;
    json_object_foreach((json_t *)vectors, name, value)
    {
        if (f.why)
            break;
        r->sensors[i] = job_find_sensor(job, name);
        if (r->sensors[i] < 0)
            fields_fail(&f, "a sensor that the job does not name");
        r->vectors[i] = fields_vector(&v, name);
        r->rest[i] = fields_real(&e, name);
        r->amplitudes[i++] = amplitudes ? fields_real(&a, name) : NAN;
    }
    if (v.why)
        fields_fail(&f, v.why);
    if (e.why)
        fields_fail(&f, e.why);
    if (a.why)
        fields_fail(&f, a.why);
    if (f.why)
        turns_release(r);
    return fields_done(&f, why);
}

void turns_release(struct turns_record *r)
{
    free(r->sensors);
    free(r->vectors);
    free(r->rest);
    free(r->amplitudes);
    *r = (struct turns_record){0};
}

void tacho_print(const struct tacho_record *r, struct line *line)
{
    line_begin(line, "tacho");
    line_text(line, "run", r->run);
    line_integer(line, "marks", r->marks);
    line_integer(line, "missed", r->missed);
    line_integer(line, "extra", r->extra);
    line_real(line, "jitter_deg", r->jitter_deg);
    line_real(line, "speed_rpm", r->speed_rpm);
    line_boolean(line, "reference", r->reference);
    line_boolean(line, "pulses", r->pulses);
    line_real(line, "scatter_rpm", r->scatter_rpm);
    line_end(line);
}

int tacho_parse(struct tacho_record *r, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct tacho_record){0};
    fields_name(&f, "run", r->run);
    r->marks = (long)fields_integer(&f, "marks", 0);
    r->missed = (long)fields_integer(&f, "missed", 0);
    r->extra = (long)fields_integer(&f, "extra", 0);
    r->jitter_deg = fields_real(&f, "jitter_deg");
    r->speed_rpm = fields_real(&f, "speed_rpm");
    r->reference = fields_boolean(&f, "reference", true);
    r->pulses = fields_boolean(&f, "pulses", true);
    r->scatter_rpm = fields_real(&f, "scatter_rpm");
    return fields_done(&f, why);
}

void spectrum_print(const struct spectrum_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "spectrum");
    line_text(line, "run", r->run);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_reals(line, "orders", r->orders, r->count);
    line_reals(line, "amplitude", r->amplitude, r->count);
    if (r->lines_known) {
        line_open(line, "lines", '[');
        for (size_t i = 0; i < r->line_count; i++)
            line_reals(line, NULL, r->lines + 2 * i, 2);
        line_close(line, ']');
    }
    line_end(line);
}

/* [[hz, amplitude] ...] to pairs of numbers. */
static void spectrum_lines_parse(struct fields *f, struct spectrum_record *r)
{
    const json_t *lines = fields_array(f, "lines");
    size_t count = json_array_size(lines);

    r->lines_known = lines;
    r->lines = count ? malloc(2 * count * sizeof *r->lines) : NULL;
    if (count && !r->lines) {
        fields_fail(f, fields_no_memory);
        return;
    }
    for (size_t i = 0; i < count; i++) {
        const json_t *line = json_array_get(lines, i);

        for (size_t k = 0; k < 2; k++) {
            const json_t *number = json_array_get(line, k);

            if (json_array_size(line) != 2 || !json_is_number(number)) {
                fields_fail(f, "a line is not a frequency and an amplitude");
                return;
            }
            r->lines[2 * i + k] = json_number_value(number);
        }
    }
    r->line_count = count;
}

int spectrum_parse(struct spectrum_record *r, const struct job *job, const json_t *json,
                   const char **why)
{
    struct fields f = fields_of(json);
    size_t count = 0;
    *r = (struct spectrum_record){0};
    fields_name(&f, "run", r->run);
    r->sensor = fields_sensor(&f, "sensor", job);
    r->orders = fields_new_reals(&f, "orders", &r->count);
    r->amplitude = fields_new_reals(&f, "amplitude", &count);
    if (count != r->count)
        fields_fail(&f, "orders and amplitudes differ in number");
    spectrum_lines_parse(&f, r);
    if (f.why)
        spectrum_release(r);
    return fields_done(&f, why);
}

void spectrum_release(struct spectrum_record *r)
{
    free(r->orders);
    free(r->amplitude);
    free(r->lines);
    r->orders = r->amplitude = r->lines = NULL;
    r->count = r->line_count = 0;
}

/* ---- curve ---- */

void curve_print(const struct curve_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "curve");
    line_text(line, "run", r->run);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_reals(line, "speed_rpm", r->speed_rpm, r->count);
    line_open(line, "vector", '[');
    for (size_t i = 0; i < r->count; i++)
        line_vector(line, NULL, r->vectors[i]);
    line_close(line, ']');
    line_end(line);
}

static double complex curve_point(const json_t *point, struct fields *f)
{
    if (json_is_null(point))
        return CMPLX(NAN, NAN);
    if (json_array_size(point) != 2 || !json_is_number(json_array_get(point, 0)) ||
        !json_is_number(json_array_get(point, 1))) {
        fields_fail(f, "a vector is not two numbers");
        return CMPLX(NAN, NAN);
    }
    return CMPLX(json_number_value(json_array_get(point, 0)),
                 json_number_value(json_array_get(point, 1)));
}

int curve_parse(struct curve_record *r, const struct job *job, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct curve_record){0};
    fields_name(&f, "run", r->run);
    r->sensor = fields_sensor(&f, "sensor", job);
    r->speed_rpm = fields_new_reals(&f, "speed_rpm", &r->count);
    const json_t *points = fields_array(&f, "vector");
    if (json_array_size(points) != r->count)
        fields_fail(&f, "speeds and vectors differ in number");
    r->vectors = f.why ? NULL : calloc(r->count + 1, sizeof *r->vectors);
    if (!r->vectors)
        fields_fail(&f, fields_no_memory);
    for (size_t i = 0; r->vectors && i < r->count; i++)
        r->vectors[i] = curve_point(json_array_get(points, i), &f);
    if (f.why)
        curve_release(r);
    return fields_done(&f, why);
}

void curve_release(struct curve_record *r)
{
    free(r->speed_rpm);
    free(r->vectors);
    r->speed_rpm = NULL;
    r->vectors = NULL;
    r->count = 0;
}
