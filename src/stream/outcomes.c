#include "stream/outcomes.h"

#include <math.h>
#include <string.h>

#include "base/angle.h"

static void print_angle(struct line *line, const struct job *job, double angle_deg)
{
    line_real(line, "angle_deg", angle_deg);
    line_real(line, "sheet_deg", job_sheet_angle(job, angle_deg));
    line_text(line, "sense", job_sense_text(job));
}

static void print_part(struct line *line, const char *key, const struct job *job, double complex u)
{
    double masses[2] = {cabs(u) / job->planes[0].radius_m, cabs(u) / job->planes[1].radius_m};
    line_open(line, key, '{');
    line_real(line, "unbalance", cabs(u));
    line_reals(line, "masses", masses, 2);
    print_angle(line, job, angle_of(u));
    line_close(line, '}');
}

void parts_print(const struct parts_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "parts");
    line_open(line, "planes", '[');
    line_text(line, NULL, job->planes[0].name);
    line_text(line, NULL, job->planes[1].name);
    line_close(line, ']');
    print_part(line, "static", job, r->static_part);
    print_part(line, "couple", job, r->couple_part);
    print_part(line, "static_alone", job, r->static_alone);
    line_real(line, "left_static_alone", r->left_alone);
    line_real(line, "left", r->left);
    line_end(line);
}

void zone_print(const struct zone_record *r, const struct job *job, struct line *line)
{
    char before[2] = {r->zone_before, 0}, after[2] = {r->zone_after, 0};
    line_begin(line, "zone");
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_text(line, "condition", r->condition);
    line_text(line, "quantity", quantity_text(r->quantity));
    line_real(line, "before_rms", r->before);
    line_text(line, "before", before);
    line_real(line, "after_rms", r->after);
    line_text(line, "after", after);
    line_reals(line, "limits_rms", r->limits, 3);
    line_boolean(line, "overall", r->overall);
    line_text(line, "basis", r->basis);
    line_end(line);
}

void compared_print(const struct compared_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "compared");
    line_text(line, "run", job->runs[r->run].name);
    line_text(line, "condition", r->condition);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_vector(line, "predicted", r->predicted);
    line_vector(line, "measured", r->measured);
    line_real(line, "se", r->se);
    line_end(line);
}

void outcomes_weights(struct line *line, const char *key, const struct job *job,
                      const struct outcome_weight *items, size_t count)
{
    line_open(line, key, '[');
    for (size_t i = 0; i < count; i++) {
        const struct job_plane *plane = &job->planes[items[i].plane];
        line_open(line, NULL, '{');
        line_text(line, "plane", plane->name);
        if (items[i].position)
            line_integer(line, "position", items[i].position);
        else
            line_null(line, "position");
        line_real(line, "mass", items[i].mass);
        print_angle(line, job, items[i].angle_deg);
        line_real(line, "unbalance", fabs(items[i].mass) * plane->radius_m);
        line_close(line, '}');
    }
    line_close(line, ']');
}
