/* The records of the answer: response, correction, placement, forecast, residual, next. */
#include "stream/records.h"

#include <math.h>
#include <string.h>

#include "stream/fields.h"

/* What people read stands beside every angle: the angle in the sheet's sense, and that sense. */
static void print_angle(double angle_deg, const struct job *job, struct line *line)
{
    line_real(line, "angle_deg", angle_deg);
    line_real(line, "sheet_deg", job_sheet_angle(job, angle_deg));
    line_text(line, "sense", job_sense_text(job));
}

void response_print(const struct response_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "response");
    line_text(line, "condition", r->condition);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_text(line, "plane", job->planes[r->plane].name);
    line_vector(line, "vector", r->vector);
    line_covariance(line, "cov", r->cov);
    line_real(line, "speed_rpm", r->speed_rpm);
    line_text(line, "quantity", quantity_text(job->sensors[r->sensor].quantity));
    line_real(line, "radius_m", job->planes[r->plane].radius_m);
    line_text(line, "tacho_channel", job->has_tacho ? job->tacho_channel : NULL);
    line_text(line, "tacho_edge",
              job->has_tacho ? (job->tacho_edge < 0 ? "falling" : "rising") : NULL);
    line_end(line);
}

int response_parse(struct response_record *r, const struct job *job, const json_t *json,
                   const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct response_record){0};
    fields_name(&f, "condition", r->condition);
    r->sensor = fields_sensor(&f, "sensor", job);
    r->plane = fields_plane(&f, "plane", job);
    r->vector = fields_vector(&f, "vector");
    fields_covariance(&f, "cov", r->cov);
    r->speed_rpm = fields_real(&f, "speed_rpm");
    return fields_done(&f, why);
}

void correction_print(const struct correction_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "correction");
    line_text(line, "plane", job->planes[r->plane].name);
    line_real(line, "mass", r->mass);
    print_angle(r->angle_deg, job, line);
    line_text(line, "relative_to", r->relative_to);
    line_reals(line, "least_squares", r->least_squares, 2);
    line_covariance(line, "ellipse", r->ellipse);
    line_end(line);
}

int correction_parse(struct correction_record *r, const struct job *job, const json_t *json,
                     const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct correction_record){0};
    r->plane = fields_plane(&f, "plane", job);
    r->mass = fields_need_real(&f, "mass");
    r->angle_deg = fields_need_real(&f, "angle_deg");
    fields_copy(&f, "relative_to", r->relative_to, sizeof r->relative_to);
    fields_reals(&f, "least_squares", r->least_squares, 2);
    fields_covariance(&f, "ellipse", r->ellipse);
    return fields_done(&f, why);
}

void placement_print(const struct placement_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "placement");
    line_text(line, "plane", job->planes[r->plane].name);
    if (r->position)
        line_integer(line, "position", r->position);
    else
        line_null(line, "position");
    print_angle(r->angle_deg, job, line);
    line_real(line, "mass", r->mass);
    line_reals(line, "pieces", r->pieces, r->piece_count);
    if (r->piece_count > 0 && r->depths_m[0] > 0) {
        line_real(line, "hole_m", job->planes[r->plane].hole_m);
        line_reals(line, "depths_m", r->depths_m, r->piece_count);
    }
    line_real(line, "force_n", r->force_n);
    if (r->sits) {
        line_real(line, "total_mass", r->total_mass);
        line_real(line, "total_force_n", r->total_force_n);
    }
    line_text(line, "relative_to", r->relative_to);
    line_end(line);
}

int placement_parse(struct placement_record *r, const struct job *job, const json_t *json,
                    const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct placement_record){0};
    r->plane = fields_plane(&f, "plane", job);
    r->position = fields_int(&f, "position", 0, 1000000, 0);
    r->angle_deg = fields_need_real(&f, "angle_deg");
    r->mass = fields_need_real(&f, "mass");
    r->piece_count = json_array_size(fields_array(&f, "pieces"));
    if (r->piece_count > PIECES_MOST) {
        fields_fail(&f, "too many pieces");
        r->piece_count = 0;
    }
    if (r->piece_count)
        fields_reals(&f, "pieces", r->pieces, r->piece_count);
    if (r->piece_count && fields_has(&f, "depths_m"))
        fields_reals(&f, "depths_m", r->depths_m, r->piece_count);
    r->force_n = fields_real(&f, "force_n");
    r->sits = fields_has(&f, "total_mass");
    r->total_mass = fields_real(&f, "total_mass");
    r->total_force_n = fields_real(&f, "total_force_n");
    fields_copy(&f, "relative_to", r->relative_to, sizeof r->relative_to);
    return fields_done(&f, why);
}

void forecast_print(const struct forecast_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "forecast");
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_text(line, "condition", r->condition);
    line_vector(line, "before", r->before);
    line_vector(line, "after", r->after);
    line_reals(line, "after_95", r->after_95, 2);
    line_real(line, "target", r->target);
    line_real(line, "chance", r->chance);
    line_real(line, "speed_rpm", r->speed_rpm);
    line_end(line);
}

int forecast_parse(struct forecast_record *r, const struct job *job, const json_t *json,
                   const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct forecast_record){0};
    r->sensor = fields_sensor(&f, "sensor", job);
    fields_name(&f, "condition", r->condition);
    r->before = fields_vector(&f, "before");
    r->after = fields_vector(&f, "after");
    fields_reals(&f, "after_95", r->after_95, 2);
    r->target = fields_real(&f, "target");
    r->chance = fields_real(&f, "chance");
    r->speed_rpm = fields_real(&f, "speed_rpm");
    return fields_done(&f, why);
}

void residual_print(const struct residual_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "residual");
    line_text(line, "plane", job->planes[r->plane].name);
    line_real(line, "before", r->before);
    line_real(line, "after", r->after);
    line_real(line, "after_95", r->after_95);
    line_real(line, "permissible", r->permissible);
    line_text(line, "basis", r->basis);
    line_end(line);
}

int residual_parse(struct residual_record *r, const struct job *job, const json_t *json,
                   const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct residual_record){0};
    r->plane = fields_plane(&f, "plane", job);
    r->before = fields_real(&f, "before");
    r->after = fields_real(&f, "after");
    r->after_95 = fields_real(&f, "after_95");
    r->permissible = fields_real(&f, "permissible");
    fields_copy(&f, "basis", r->basis, sizeof r->basis);
    return fields_done(&f, why);
}

void next_begin(const struct next_record *r, struct line *line)
{
    line_begin(line, "next");
    line_text(line, "step", r->step);
    line_text(line, "text", r->text);
}

int next_parse(struct next_record *r, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    fields_copy(&f, "step", r->step, sizeof r->step);
    fields_copy(&f, "text", r->text, sizeof r->text);
    if (!f.why && !r->step[0])
        fields_fail(&f, "the step is missing");
    return fields_done(&f, why);
}
