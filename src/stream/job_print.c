/* The `job` record: printing. job_parse.c reads back what stands here, field by field. */
#include "stream/job.h"

#include <math.h>
#include <stdio.h>

#include "stream/line.h"

static const char *const sense_names[] = {NULL, "against rotation", "with rotation"};
static const char *const phase_names[] = {NULL, "lag", "lead"};
static const char *const unit_names[] = {"metric", "US"};
static const char *const turning_names[] = {NULL, "clockwise", "counter-clockwise"};
static const char *const support_names[] = {NULL, "between bearings", "overhung"};
static const char *const minimise_names[] = {"total", "worst", "static first"};
static const char *const tolerance_names[] = {NULL, "grade", "API 4W/N"};

static const char *text_or_null(const char *text)
{
    return text[0] ? text : NULL;
}

static void print_rotor(const struct job *job, struct line *l)
{
    line_open(l, "rotor", '{');
    line_real(l, "mass", job->rotor_mass);
    line_real(l, "service_speed_rpm", job->service_rpm);
    line_text(l, "rotation", turning_names[job->turning]);
    line_text(l, "seen_from", text_or_null(job->seen_from));
    line_real(l, "grade", job->grade);
    line_text(l, "support", support_names[job->support]);
    line_real(l, "bearing_span", job->span_m);
    line_real(l, "mass_centre", job->centre_m);
    line_close(l, '}');
}

static void print_tacho(const struct job *job, struct line *l)
{
    if (!job->has_tacho) {
        line_null(l, "tacho");
        return;
    }
    line_open(l, "tacho", '{');
    line_text(l, "channel", job->tacho_channel);
    line_text(l, "edge", job->tacho_edge < 0 ? "falling" : "rising");
    line_integer(l, "marks", job->tacho_marks);
    line_real(l, "level", job->tacho_level);
    line_close(l, '}');
}

static void print_sensors(const struct job *job, struct line *l)
{
    line_open(l, "sensors", '[');
    for (size_t i = 0; i < job->sensor_count; i++) {
        const struct job_sensor *s = &job->sensors[i];
        char show[32];
        snprintf(show, sizeof show, "%s %s", s->show.unit, detection_text(s->show.detection));
        line_open(l, NULL, '{');
        line_text(l, "name", s->name);
        line_text(l, "channel", text_or_null(s->channel));
        line_text(l, "quantity", quantity_text(s->quantity));
        line_text(l, "show", show);
        line_text(l, "show_quantity", quantity_text(s->show.quantity));
        line_real(l, "show_si", s->show.si);
        line_real(l, "at_deg", s->at_deg);
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_positions(const struct job_plane *p, struct line *l)
{
    if (p->any_position) {
        line_text(l, "positions", "any");
        return;
    }
    line_open(l, "positions", '[');
    for (size_t i = 0; i < p->position_count; i++) {
        line_open(l, NULL, '{');
        line_integer(l, "number", p->positions[i].number);
        line_real(l, "angle_deg", p->positions[i].angle_deg);
        line_boolean(l, "taken", p->positions[i].taken);
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_planes(const struct job *job, struct line *l)
{
    line_open(l, "planes", '[');
    for (size_t i = 0; i < job->plane_count; i++) {
        const struct job_plane *p = &job->planes[i];
        line_open(l, NULL, '{');
        line_text(l, "name", p->name);
        line_real(l, "radius_m", p->radius_m);
        print_positions(p, l);
        if (p->stock) {
            line_open(l, "stock", '[');
            for (size_t k = 0; k < p->stock_count; k++) {
                line_open(l, NULL, '{');
                line_real(l, "mass", p->stock[k].mass);
                if (p->stock[k].count < 0)
                    line_null(l, "count");
                else
                    line_integer(l, "count", p->stock[k].count);
                line_close(l, '}');
            }
            line_close(l, ']');
        } else {
            line_null(l, "stock");
        }
        line_integer(l, "pieces", p->pieces);
        line_real(l, "most", p->most);
        line_real(l, "most_in_all", p->most_in_all);
        line_text(l, "work", p->work == WORK_REMOVE ? "remove" : "add");
        if (p->hole_m > 0) {
            line_real(l, "hole_m", p->hole_m);
            line_real(l, "density", p->density);
            line_real(l, "depth_m", p->depth_m);
        }
        line_close(l, '}');
    }
    line_close(l, ']');
}

void job_print_weights(const struct job *job, const struct job_run *run, struct line *l)
{
    line_open(l, "weights", '[');
    for (size_t i = 0; run && i < run->weight_count; i++) {
        const struct job_weight *w = &run->weights[i];
        line_open(l, NULL, '{');
        line_text(l, "plane", job->planes[w->plane].name);
        line_real(l, "mass", w->mass);
        line_real(l, "angle_deg", w->angle_deg);
        line_real(l, "mounted_mass", w->mounted_mass);
        line_real(l, "radius_m", w->radius_m);
        if (w->position)
            line_integer(l, "position", w->position);
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_hand(const struct job *job, const struct job_run *run, struct line *l)
{
    line_open(l, "by_hand", '[');
    for (size_t i = 0; i < run->hand_count; i++) {
        const struct job_hand *h = &run->hand[i];
        line_open(l, NULL, '{');
        line_text(l, "sensor", job->sensors[h->sensor].name);
        line_vector(l, "vector", h->has_phase ? h->vector : CMPLX(NAN, NAN));
        line_real(l, "amplitude", h->amplitude);
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_runs(const struct job *job, struct line *l)
{
    line_open(l, "runs", '[');
    for (size_t i = 0; i < job->run_count; i++) {
        const struct job_run *r = &job->runs[i];
        line_open(l, NULL, '{');
        line_text(l, "run", r->name);
        line_text(l, "condition", r->condition);
        line_text(l, "role", text_or_null(r->role));
        if (r->speed_count > 0)
            line_reals(l, "speeds_rpm", r->speeds_rpm, r->speed_count);
        line_text(l, "when", text_or_null(r->when));
        job_print_weights(job, r, l);
        line_real(l, "speed_rpm", r->speed_rpm);
        print_hand(job, r, l);
        line_open(l, "without", '[');
        for (size_t s = 0; r->without && s < job->sensor_count; s++)
            if (r->without[s])
                line_text(l, NULL, job->sensors[s].name);
        line_close(l, ']');
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_aim(const struct job *job, struct line *l)
{
    const struct job_aim *a = &job->aim;
    line_open(l, "aim", '{');
    line_open(l, "targets", '[');
    for (size_t s = 0; a->targets && s < job->sensor_count; s++) {
        line_open(l, NULL, '{');
        line_text(l, "sensor", job->sensors[s].name);
        line_real(l, "amplitude", a->targets[s].amplitude);
        line_text(l, "quantity", quantity_text(a->targets[s].quantity));
        line_boolean(l, "in_aim", a->targets[s].in_aim);
        line_close(l, '}');
    }
    line_close(l, ']');
    line_boolean(l, "named", a->named);
    line_text(l, "minimise", minimise_names[a->minimise]);
    line_text(l, "mounted", a->mounted >= 0 ? job->runs[a->mounted].name : NULL);
    line_real(l, "repeatability", a->repeatability);
    line_boolean(l, "repeatability_given", a->repeatability_given);
    line_text(l, "tolerance", tolerance_names[a->tolerance]);
    if (a->zone_group > 0) {
        line_open(l, "zones", '{');
        line_integer(l, "group", a->zone_group);
        line_boolean(l, "flexible", a->zone_flexible);
        line_close(l, '}');
    }
    if (a->importance_count > 0) {
        line_open(l, "importances", '[');
        for (size_t i = 0; i < a->importance_count; i++) {
            line_open(l, NULL, '{');
            line_text(l, "condition", a->importances[i].condition);
            line_real(l, "factor", a->importances[i].factor);
            line_close(l, '}');
        }
        line_close(l, ']');
    }
    line_close(l, '}');
}

/* Stored responses, as the sheet's file has them; nothing where it names none. */
static void print_responses(const struct job *job, struct line *l)
{
    if (job->response_count == 0)
        return;
    line_open(l, "responses", '[');
    for (size_t i = 0; i < job->response_count; i++) {
        const struct job_response *r = &job->responses[i];
        line_open(l, NULL, '{');
        line_text(l, "condition", r->condition);
        line_text(l, "sensor", job->sensors[r->sensor].name);
        line_text(l, "plane", job->planes[r->plane].name);
        line_vector(l, "vector", r->vector);
        line_covariance(l, "cov", r->cov);
        line_real(l, "speed_rpm", r->speed_rpm);
        line_close(l, '}');
    }
    line_close(l, ']');
}

static void print_limits(const struct job *job, struct line *l)
{
    line_open(l, "limits", '[');
    for (size_t i = 0; i < job->limit_count; i++) {
        line_open(l, NULL, '{');
        line_text(l, "check", job->limits[i].check);
        line_boolean(l, "off", job->limits[i].off);
        line_real(l, "caution", job->limits[i].caution);
        line_real(l, "refuse", job->limits[i].refuse);
        line_close(l, '}');
    }
    line_close(l, ']');
}

int job_print(const struct job *job, struct buffer *out)
{
    struct line l = LINE_INIT;
    line_begin(&l, "job");
    line_integer(&l, "lopside", 1);
    line_text(&l, "title", job->title);
    line_text(&l, "angles", sense_names[job->angles]);
    line_text(&l, "phase", phase_names[job->phase]);
    line_text(&l, "units", unit_names[job->units]);
    if (job->audit)
        line_boolean(&l, "audit", true);
    print_rotor(job, &l);
    print_tacho(job, &l);
    print_sensors(job, &l);
    print_planes(job, &l);
    print_runs(job, &l);
    print_aim(job, &l);
    print_limits(job, &l);
    print_responses(job, &l);
    line_end(&l);
    if (!l.text.failed)
        buffer_add(out, l.text.bytes, l.text.length);
    int failed = l.text.failed || out->failed;
    line_release(&l);
    return failed ? -1 : 0;
}
