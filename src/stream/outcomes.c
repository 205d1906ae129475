#include "stream/outcomes.h"

#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "stream/fields.h"

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

/* The vector of one part; its masses follow from the radii. */
static double complex parse_part(struct fields *f, const char *key)
{
    const json_t *object = fields_object(f, key);
    if (!object) {
        fields_fail(f, "a part is missing");
        return NAN;
    }
    struct fields part = fields_of(object);
    double complex u =
        angle_vector(fields_need_real(&part, "unbalance"), fields_real(&part, "angle_deg"));
    if (part.why)
        fields_fail(f, part.why);
    return u;
}

int parts_parse(struct parts_record *r, const struct job *job, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct parts_record){0};
    if (job->plane_count != 2)
        fields_fail(&f, "parts of planes that are not two");
    r->static_part = parse_part(&f, "static");
    r->couple_part = parse_part(&f, "couple");
    r->static_alone = parse_part(&f, "static_alone");
    r->left_alone = fields_real(&f, "left_static_alone");
    r->left = fields_real(&f, "left");
    return fields_done(&f, why);
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

/* A zone is one of 'A' to 'D', or '?'. */
static char parse_zone(struct fields *f, const char *key)
{
    const char *text = fields_text(f, key);
    if (strlen(text) == 1 && strchr("ABCD?", text[0]))
        return text[0];
    fields_fail(f, "a zone is not A, B, C or D");
    return '?';
}

int zone_parse(struct zone_record *r, const struct job *job, const json_t *json, const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct zone_record){0};
    r->sensor = fields_sensor(&f, "sensor", job);
    fields_name(&f, "condition", r->condition);
    int quantity = quantity_parse(fields_text(&f, "quantity"));
    if (quantity != QUANTITY_VELOCITY && quantity != QUANTITY_DISPLACEMENT)
        fields_fail(&f, "a zone of a quantity that has none");
    r->quantity = quantity == QUANTITY_DISPLACEMENT ? QUANTITY_DISPLACEMENT : QUANTITY_VELOCITY;
    r->before = fields_real(&f, "before_rms");
    r->zone_before = parse_zone(&f, "before");
    r->after = fields_real(&f, "after_rms");
    r->zone_after = parse_zone(&f, "after");
    fields_reals(&f, "limits_rms", r->limits, 3);
    r->overall = fields_boolean(&f, "overall", false);
    fields_copy(&f, "basis", r->basis, sizeof r->basis);
    return fields_done(&f, why);
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

int compared_parse(struct compared_record *r, const struct job *job, const json_t *json,
                   const char **why)
{
    struct fields f = fields_of(json);
    char run[NAME_ROOM];
    *r = (struct compared_record){0};
    fields_name(&f, "run", run);
    r->run = f.why ? -1 : job_find_run(job, run);
    if (r->run < 0)
        fields_fail(&f, "a run that the job does not have");
    fields_name(&f, "condition", r->condition);
    r->sensor = fields_sensor(&f, "sensor", job);
    r->predicted = fields_vector(&f, "predicted");
    r->measured = fields_vector(&f, "measured");
    r->se = fields_real(&f, "se");
    return fields_done(&f, why);
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
