/* The `job` record: parsing what job_print.c prints. */
#include "stream/job.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "stream/fields.h"

#define PIECES_LIMIT 1000 /* no plane takes more; the placement search has its own bound */

/* Index of the text among `count` names; absent: 0; unknown: an error. */
static int choice(struct fields *f, const char *key, const char *const *names, int count)
{
    const char *text = fields_text(f, key);
    if (!text[0])
        return 0;
    for (int i = 0; i < count; i++)
        if (names[i] && !strcmp(names[i], text))
            return i;
    fields_fail(f, "a choice that this version does not know");
    return 0;
}

/* A new zeroed array for the elements of `array`; NULL with count 0 when there are none. */
static void *new_items(struct fields *f, const json_t *array, size_t size, size_t *count)
{
    *count = json_array_size(array);
    if (!*count)
        return NULL;
    void *items = calloc(*count, size);
    if (!items) {
        fields_fail(f, fields_no_memory);
        *count = 0;
    }
    return items;
}

static void keep(struct fields *outer, const struct fields *inner)
{
    if (inner->why)
        fields_fail(outer, inner->why);
}

static void parse_rotor(struct job *job, struct fields *outer)
{
    static const char *const turning[] = {NULL, "clockwise", "counter-clockwise"};
    static const char *const support[] = {NULL, "between bearings", "overhung"};
    const json_t *json = fields_object(outer, "rotor");
    if (!json)
        return;
    struct fields f = fields_of(json);
    job->rotor_mass = fields_real(&f, "mass");
    job->service_rpm = fields_real(&f, "service_speed_rpm");
    job->turning = (enum turning)choice(&f, "rotation", turning, 3);
    fields_copy(&f, "seen_from", job->seen_from, sizeof job->seen_from);
    job->grade = fields_real(&f, "grade");
    job->support = (enum support)choice(&f, "support", support, 3);
    job->span_m = fields_real(&f, "bearing_span");
    job->centre_m = fields_real(&f, "mass_centre");
    keep(outer, &f);
}

static void parse_tacho(struct job *job, struct fields *outer)
{
    static const char *const edges[] = {"rising", "falling"};
    const json_t *json = fields_object(outer, "tacho");
    job->has_tacho = json != NULL;
    if (!json)
        return;
    struct fields f = fields_of(json);
    fields_copy(&f, "channel", job->tacho_channel, sizeof job->tacho_channel);
    job->tacho_edge = choice(&f, "edge", edges, 2) ? -1 : 1;
    job->tacho_marks = fields_int(&f, "marks", 1, 4096, 1);
    job->tacho_level = fields_real(&f, "level");
    keep(outer, &f);
}

static void parse_show(struct job_sensor *s, struct fields *f)
{
    static const char *const units[] = {"g",   "m/s2", "mm/s", "in/s", "um",
                                        "mil", "m/s",  "m",    "mm",   "in"};
    const char *text = fields_text(f, "show");
    const char *blank = strchr(text, ' ');
    int quantity = quantity_parse(fields_text(f, "show_quantity"));
    s->show.unit = NULL;
    for (size_t i = 0; blank && i < sizeof units / sizeof *units; i++)
        if (strlen(units[i]) == (size_t)(blank - text) &&
            !strncmp(units[i], text, strlen(units[i])))
            s->show.unit = units[i];
    int detection = -1;
    for (int d = 0; blank && d < 3; d++)
        if (!strcmp(blank + 1, detection_text((enum detection)d)))
            detection = d;
    s->show.si = fields_need_real(f, "show_si");
    if (!s->show.unit || detection < 0 || quantity < 0 || !(s->show.si > 0)) {
        fields_fail(f, "a unit to show that this version does not know");
        return;
    }
    s->show.detection = (enum detection)detection;
    s->show.quantity = (enum quantity)quantity;
}

static void parse_sensors(struct job *job, struct fields *outer)
{
    const json_t *array = fields_array(outer, "sensors");
    job->sensors = new_items(outer, array, sizeof *job->sensors, &job->sensor_count);
    for (size_t i = 0; i < job->sensor_count; i++) {
        struct job_sensor *s = &job->sensors[i];
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "name", s->name);
        fields_copy(&f, "channel", s->channel, sizeof s->channel);
        int quantity = quantity_parse(fields_text(&f, "quantity"));
        if (quantity < 0)
            fields_fail(&f, "a quantity that this version does not know");
        else
            s->quantity = (enum quantity)quantity;
        parse_show(s, &f);
        s->at_deg = fields_real(&f, "at_deg");
        keep(outer, &f);
    }
}

static void parse_positions(struct job_plane *p, struct fields *f)
{
    const json_t *value = json_object_get(f->json, "positions");
    p->any_position = json_is_string(value) && !strcmp(json_string_value(value), "any");
    if (!p->any_position && !json_is_array(value))
        fields_fail(f, "the positions of a plane are missing");
    p->positions =
        new_items(f, p->any_position ? NULL : value, sizeof *p->positions, &p->position_count);
    for (size_t i = 0; i < p->position_count; i++) {
        struct fields g = fields_of(json_array_get(value, i));
        p->positions[i].number = fields_int(&g, "number", 1, 1000000, 0);
        p->positions[i].angle_deg = fields_need_real(&g, "angle_deg");
        p->positions[i].taken = fields_boolean(&g, "taken", false);
        keep(f, &g);
    }
}

static void parse_stock(struct job_plane *p, struct fields *f)
{
    const json_t *array = fields_array(f, "stock");
    p->stock = new_items(f, array, sizeof *p->stock, &p->stock_count);
    for (size_t i = 0; i < p->stock_count; i++) {
        struct fields g = fields_of(json_array_get(array, i));
        p->stock[i].mass = fields_above_zero(&g, "mass");
        p->stock[i].count = fields_int(&g, "count", 0, 1000000, -1);
        keep(f, &g);
    }
}

static double limit_or_infinity(struct fields *f, const char *key)
{
    double value = fields_real(f, key);
    return isnan(value) ? INFINITY : value;
}

static void parse_planes(struct job *job, struct fields *outer)
{
    static const char *const works[] = {"add", "remove"};
    const json_t *array = fields_array(outer, "planes");
    job->planes = new_items(outer, array, sizeof *job->planes, &job->plane_count);
    for (size_t i = 0; i < job->plane_count; i++) {
        struct job_plane *p = &job->planes[i];
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "name", p->name);
        p->radius_m = fields_above_zero(&f, "radius_m");
        parse_positions(p, &f);
        parse_stock(p, &f);
        p->pieces = fields_int(&f, "pieces", 1, PIECES_LIMIT, 4);
        p->most = limit_or_infinity(&f, "most");
        p->most_in_all = limit_or_infinity(&f, "most_in_all");
        p->work = (enum work)choice(&f, "work", works, 2);
        p->hole_m = fields_real(&f, "hole_m");
        p->density = fields_real(&f, "density");
        p->depth_m = fields_real(&f, "depth_m");
        keep(outer, &f);
    }
}

static void parse_weights(const struct job *job, struct job_run *r, struct fields *f)
{
    const json_t *array = fields_array(f, "weights");
    r->weights = new_items(f, array, sizeof *r->weights, &r->weight_count);
    for (size_t i = 0; i < r->weight_count; i++) {
        struct job_weight *w = &r->weights[i];
        struct fields g = fields_of(json_array_get(array, i));
        int plane = fields_plane(&g, "plane", job);
        w->plane = plane < 0 ? 0 : (size_t)plane;
        w->mass = fields_need_real(&g, "mass");
        w->angle_deg = fields_need_real(&g, "angle_deg");
        w->mounted_mass = fields_need_real(&g, "mounted_mass");
        w->radius_m = fields_above_zero(&g, "radius_m");
        w->position = fields_int(&g, "position", 0, 1000000, 0);
        keep(f, &g);
    }
    if (f->why) /* no weight with a plane that does not exist survives */
        r->weight_count = 0;
}

static void parse_hand(const struct job *job, struct job_run *r, struct fields *f)
{
    const json_t *array = fields_array(f, "by_hand");
    r->hand = new_items(f, array, sizeof *r->hand, &r->hand_count);
    for (size_t i = 0; i < r->hand_count; i++) {
        struct fields g = fields_of(json_array_get(array, i));
        int sensor = fields_sensor(&g, "sensor", job);
        r->hand[i].sensor = sensor < 0 ? 0 : (size_t)sensor;
        r->hand[i].has_phase = fields_has(&g, "vector");
        r->hand[i].vector = fields_vector(&g, "vector");
        r->hand[i].amplitude = fields_need_real(&g, "amplitude");
        keep(f, &g);
    }
}

static void parse_speeds(struct job_run *r, struct fields *f)
{
    r->speeds_rpm = fields_new_reals(f, "speeds_rpm", &r->speed_count);
    for (size_t i = 0; i < r->speed_count; i++)
        if (!(r->speeds_rpm[i] > (i ? r->speeds_rpm[i - 1] : 0)))
            fields_fail(f, "the speeds of a coast-down do not ascend from zero");
}

static void parse_runs(struct job *job, struct fields *outer)
{
    const json_t *array = fields_array(outer, "runs");
    job->runs = new_items(outer, array, sizeof *job->runs, &job->run_count);
    for (size_t i = 0; i < job->run_count; i++) {
        struct job_run *r = &job->runs[i];
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "run", r->name);
        fields_name(&f, "condition", r->condition);
        fields_copy(&f, "role", r->role, sizeof r->role);
        fields_copy(&f, "when", r->when, sizeof r->when);
        r->speed_rpm = fields_real(&f, "speed_rpm");
        parse_speeds(r, &f);
        parse_weights(job, r, &f);
        parse_hand(job, r, &f);
        const json_t *without = fields_array(&f, "without");
        r->without = calloc(job->sensor_count + 1, sizeof *r->without);
        if (!r->without)
            fields_fail(&f, fields_no_memory);
        for (size_t k = 0; r->without && k < json_array_size(without); k++) {
            const char *name = json_string_value(json_array_get(without, k));
            int sensor = name ? job_find_sensor(job, name) : -1;
            if (sensor < 0)
                fields_fail(&f, "a sensor that the job does not name");
            else
                r->without[sensor] = true;
        }
        keep(outer, &f);
    }
}

static void parse_targets(struct job *job, struct fields *f)
{
    const json_t *array = fields_array(f, "targets");
    job->aim.targets = calloc(job->sensor_count + 1, sizeof *job->aim.targets);
    if (!job->aim.targets) {
        fields_fail(f, fields_no_memory);
        return;
    }
    for (size_t s = 0; s < job->sensor_count; s++)
        job->aim.targets[s] = (struct job_target){NAN, job->sensors[s].show.quantity, true};
    for (size_t i = 0; i < json_array_size(array); i++) {
        struct fields g = fields_of(json_array_get(array, i));
        int sensor = fields_sensor(&g, "sensor", job);
        int quantity = quantity_parse(fields_text(&g, "quantity"));
        double amplitude = fields_real(&g, "amplitude");
        bool in_aim = fields_boolean(&g, "in_aim", true);
        if (quantity < 0)
            fields_fail(&g, "a quantity that this version does not know");
        if (!g.why)
            job->aim.targets[sensor] =
                (struct job_target){amplitude, (enum quantity)quantity, in_aim};
        keep(f, &g);
    }
}

static void parse_zones(struct job *job, struct fields *outer)
{
    const json_t *json = fields_object(outer, "zones");
    if (!json)
        return;
    struct fields f = fields_of(json);
    job->aim.zone_group = (int)fields_integer(&f, "group", 0);
    job->aim.zone_flexible = fields_boolean(&f, "flexible", false);
    if (job->aim.zone_group < 1 || job->aim.zone_group > 2)
        fields_fail(&f, "a group of zones that this version does not know");
    keep(outer, &f);
}

static void parse_importances(struct job *job, struct fields *outer)
{
    struct job_aim *aim = &job->aim;
    const json_t *array = fields_array(outer, "importances");
    aim->importances = new_items(outer, array, sizeof *aim->importances, &aim->importance_count);
    for (size_t i = 0; i < aim->importance_count; i++) {
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "condition", aim->importances[i].condition);
        aim->importances[i].factor = fields_need_real(&f, "factor");
        keep(outer, &f);
    }
}

static void parse_aim(struct job *job, struct fields *outer)
{
    static const char *const minimise[] = {"total", "worst", "static first"};
    static const char *const tolerance[] = {NULL, "grade", "API 4W/N"};
    const json_t *json = fields_object(outer, "aim");
    if (!json) {
        fields_fail(outer, "the aim is missing");
        return;
    }
    struct fields f = fields_of(json);
    parse_targets(job, &f);
    job->aim.named = fields_boolean(&f, "named", false);
    job->aim.minimise = (enum minimise)choice(&f, "minimise", minimise, 3);
    const char *mounted = fields_text(&f, "mounted");
    job->aim.mounted = mounted[0] ? job_find_run(job, mounted) : -1;
    if (mounted[0] && job->aim.mounted < 0)
        fields_fail(&f, "the mounted run is not one of the runs");
    job->aim.repeatability = fields_need_real(&f, "repeatability");
    if (!(job->aim.repeatability >= 0))
        fields_fail(&f, "the repeatability is below zero");
    job->aim.repeatability_given = fields_boolean(&f, "repeatability_given", false);
    job->aim.tolerance = (enum tolerance)choice(&f, "tolerance", tolerance, 3);
    parse_zones(job, &f);
    parse_importances(job, &f);
    keep(outer, &f);
}

static void parse_responses(struct job *job, struct fields *outer)
{
    const json_t *array = fields_array(outer, "responses");
    job->responses = new_items(outer, array, sizeof *job->responses, &job->response_count);
    for (size_t i = 0; i < job->response_count; i++) {
        struct job_response *r = &job->responses[i];
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "condition", r->condition);
        int sensor = fields_sensor(&f, "sensor", job), plane = fields_plane(&f, "plane", job);
        r->sensor = sensor < 0 ? 0 : (size_t)sensor;
        r->plane = plane < 0 ? 0 : (size_t)plane;
        r->vector = fields_vector(&f, "vector");
        fields_covariance(&f, "cov", r->cov);
        r->speed_rpm = fields_real(&f, "speed_rpm");
        keep(outer, &f);
    }
    if (outer->why) /* none of a sensor or plane that does not exist survives */
        job->response_count = 0;
}

static void parse_limits(struct job *job, struct fields *outer)
{
    const json_t *array = fields_array(outer, "limits");
    job->limits = new_items(outer, array, sizeof *job->limits, &job->limit_count);
    for (size_t i = 0; i < job->limit_count; i++) {
        struct fields f = fields_of(json_array_get(array, i));
        fields_name(&f, "check", job->limits[i].check);
        job->limits[i].off = fields_boolean(&f, "off", false);
        job->limits[i].caution = fields_real(&f, "caution");
        job->limits[i].refuse = fields_real(&f, "refuse");
        keep(outer, &f);
    }
}

/* Names are unique, and nothing that needs the sense of angles goes without it. */
static void check_whole(const struct job *job, struct fields *f)
{
    bool angles = false;
    for (size_t i = 0; i < job->sensor_count; i++)
        if (job_find_sensor(job, job->sensors[i].name) != (int)i)
            fields_fail(f, "a sensor appears twice");
    for (size_t i = 0; i < job->plane_count; i++) {
        if (job_find_plane(job, job->planes[i].name) != (int)i)
            fields_fail(f, "a plane appears twice");
        angles = angles || job->planes[i].position_count > 0;
    }
    for (size_t i = 0; i < job->run_count; i++) {
        if (job_find_run(job, job->runs[i].name) != (int)i)
            fields_fail(f, "a run appears twice");
        angles = angles || job->runs[i].weight_count > 0;
    }
    if (angles && !job->audit && job->angles == SENSE_NONE)
        fields_fail(f, "the sense of angles is missing");
}

int job_parse(struct job *job, const json_t *record, const char **why)
{
    static const char *const sense[] = {NULL, "against rotation", "with rotation"};
    static const char *const phase[] = {NULL, "lag", "lead"};
    static const char *const units[] = {"metric", "US"};
    struct fields f = fields_of(record);

    if (fields_integer(&f, "lopside", 0) != 1)
        fields_fail(&f, "not a stream of version 1");
    fields_copy(&f, "title", job->title, sizeof job->title);
    job->angles = (enum sense)choice(&f, "angles", sense, 3);
    job->phase = (enum phase_sign)choice(&f, "phase", phase, 3);
    job->units = (enum unit_system)choice(&f, "units", units, 2);
    job->audit = fields_boolean(&f, "audit", false);
    parse_rotor(job, &f);
    parse_tacho(job, &f);
    parse_sensors(job, &f);
    parse_planes(job, &f);
    parse_runs(job, &f);
    parse_aim(job, &f);
    parse_limits(job, &f);
    parse_responses(job, &f);
    check_whole(job, &f);
    if (fields_done(&f, why) < 0)
        return *why == fields_no_memory ? -2 : -1;
    return 0;
}
