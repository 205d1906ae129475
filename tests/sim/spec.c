/* spec.c - reading the JSON description of a simulated job. */
#include "spec.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* First complaint wins; everything after it is skipped. */
static bool failed;

static void complain(const char *what, const char *name)
{
    if (!failed)
        fprintf(stderr, "simulate: %s: '%s'\n", what, name);
    failed = true;
}

/* Every key of the object stands in `known`, a list with blanks around each. */
static void only(const json_t *object, const char *known)
{
    const char *key;
    json_t *value;
    json_object_foreach((json_t *)object, key, value)
    {
        char padded[64];
        snprintf(padded, sizeof padded, " %s ", key);
        if (!strstr(known, padded))
            complain("unknown key", key);
    }
}

static double real(const json_t *object, const char *key, double fallback)
{
    const json_t *value = json_object_get(object, key);
    if (value && !json_is_number(value))
        complain("not a number", key);
    if (!value && isnan(fallback))
        complain("missing", key);
    return json_is_number(value) ? json_number_value(value) : fallback;
}

static const char *text(const json_t *object, const char *key, const char *fallback)
{
    const json_t *value = json_object_get(object, key);
    if (value && !json_is_string(value))
        complain("not a text", key);
    return json_is_string(value) ? json_string_value(value) : fallback;
}

static size_t count(const json_t *object, const char *key, size_t most)
{
    size_t n = json_array_size(json_object_get(object, key));
    if (n > most)
        complain("too many", key);
    return n > most ? most : n;
}

static const json_t *item(const json_t *object, const char *key, size_t i)
{
    return json_array_get(json_object_get(object, key), i);
}

static double cell(const json_t *row, size_t i)
{
    return json_number_value(json_array_get(row, i));
}

static void read_rotor(struct spec *spec)
{
    const json_t *r = json_object_get(spec->json, "rotor");
    only(r, " turning start_deg rpm wander ");
    struct rotor *rotor = &spec->rotor;
    rotor->direction = strcmp(text(r, "turning", ""), "clockwise") ? 1 : -1;
    rotor->start_deg = real(r, "start_deg", 0);
    rotor->rpm = real(r, "rpm", NAN);
    size_t n = count(r, "wander", ROTOR_WANDERS);
    for (size_t i = 0; i < n; i++) {
        const json_t *w = item(r, "wander", i);
        rotor->wander[i] = (struct rotor_wander){cell(w, 0), cell(w, 1), cell(w, 2)};
    }
    const json_t *tape = json_object_get(spec->json, "tape");
    only(tape, " at_deg width_deg ");
    rotor->tape_deg = real(tape, "at_deg", NAN);
    rotor->tape_width_deg = real(tape, "width_deg", NAN);
    rotor->mode_count = count(spec->json, "modes", ROTOR_MODES);
    for (size_t i = 0; i < rotor->mode_count; i++) {
        const json_t *m = item(spec->json, "modes", i);
        only(m, " x_hz y_hz damping mass_kg planes sensors ");
        struct rotor_mode *mode = &rotor->modes[i];
        mode->x_hz = real(m, "x_hz", NAN);
        mode->y_hz = real(m, "y_hz", NAN);
        mode->damping = real(m, "damping", NAN);
        mode->mass = real(m, "mass_kg", NAN);
        for (size_t k = 0; k < count(m, "planes", ROTOR_PLANES); k++)
            mode->planes[k] = cell(json_object_get(m, "planes"), k);
        for (size_t k = 0; k < count(m, "sensors", ROTOR_SENSORS); k++)
            mode->sensors[k] = cell(json_object_get(m, "sensors"), k);
    }
}

static void read_tacho(struct spec *spec)
{
    const json_t *t = json_object_get(spec->json, "tacho");
    only(t, " at_deg low_v high_v edge_s ac_s noise_v missing extra gap_from gap_turns scratch_deg "
            "scratch_width_deg scratch_height teeth ripple grow_rpm ");
    spec->rotor.tacho_deg = real(t, "at_deg", NAN);
    spec->optical = (struct optical){.low_v = real(t, "low_v", 0),
                                     .high_v = real(t, "high_v", 5),
                                     .edge_s = real(t, "edge_s", 2 / spec->rate_hz),
                                     .ac_s = real(t, "ac_s", 0),
                                     .noise_v = real(t, "noise_v", 0),
                                     .missing = real(t, "missing", 0),
                                     .extra = real(t, "extra", 0),
                                     .gap_from = lround(real(t, "gap_from", 0)),
                                     .gap_turns = lround(real(t, "gap_turns", 0)),
                                     .scratch_deg = real(t, "scratch_deg", 0),
                                     .scratch_width_deg = real(t, "scratch_width_deg", 0),
                                     .scratch_height = real(t, "scratch_height", 0),
                                     .teeth = (int)real(t, "teeth", 0),
                                     .ripple = real(t, "ripple", 0),
                                     .grow_rpm = real(t, "grow_rpm", 0)};
}

static struct rotor_mass read_mass(const json_t *m)
{
    only(m, " plane mass_g radius_mm body_deg ");
    return (struct rotor_mass){(size_t)real(m, "plane", 0), real(m, "mass_g", NAN) / 1000,
                               real(m, "radius_mm", NAN) / 1000, real(m, "body_deg", NAN)};
}

static void read_unit(struct spec_sensor *sensor, enum rotor_quantity *quantity)
{
    /* g: CGPM 1901; in, mil: international inch, 1959 */
    static const struct {
        const char *unit;
        enum rotor_quantity quantity;
        double si;
    } units[] = {{"g", ROTOR_ACCELERATION, 9.80665}, {"m/s2", ROTOR_ACCELERATION, 1},
                 {"mm/s", ROTOR_VELOCITY, 1e-3},     {"in/s", ROTOR_VELOCITY, 0.0254},
                 {"um", ROTOR_DISPLACEMENT, 1e-6},   {"mil", ROTOR_DISPLACEMENT, 2.54e-5}};
    for (size_t i = 0; i < sizeof units / sizeof *units; i++) {
        if (strcmp(units[i].unit, sensor->unit))
            continue;
        *quantity = units[i].quantity;
        sensor->si_per_unit = units[i].si;
        return;
    }
    complain("unknown unit", sensor->unit);
}

static void read_lines(const json_t *s, const char *key, bool order, struct noise *noise)
{
    for (size_t i = 0; i < count(s, key, NOISE_LINES); i++) {
        const json_t *l = item(s, key, i);
        if (noise->line_count == NOISE_LINES) {
            complain("too many", key);
            return;
        }
        noise->lines[noise->line_count++] = (struct noise_line){
            order ? cell(l, 0) : 0, order ? 0 : cell(l, 0), cell(l, 1), cell(l, 2)};
    }
}

static void read_sensors(struct spec *spec)
{
    spec->rotor.sensor_count = count(spec->json, "sensors", ROTOR_SENSORS);
    for (size_t i = 0; i < spec->rotor.sensor_count; i++) {
        const json_t *s = item(spec->json, "sensors", i);
        only(s,
             " name unit scale show v_per_unit at_deg white coloured corner_hz offset drift orders "
             "lines digits ");
        struct spec_sensor *sensor = &spec->sensors[i];
        sensor->name = text(s, "name", "");
        sensor->unit = text(s, "unit", "");
        sensor->scale = text(s, "scale", NULL);
        sensor->show = text(s, "show", NULL);
        sensor->v_per_unit = real(s, "v_per_unit", 0);
        spec->rotor.sensors[i].at_deg = real(s, "at_deg", NAN);
        read_unit(sensor, &spec->rotor.sensors[i].quantity);
        sensor->noise = (struct noise){.white = real(s, "white", 0),
                                       .coloured = real(s, "coloured", 0),
                                       .corner_hz = real(s, "corner_hz", 5),
                                       .offset = real(s, "offset", 0),
                                       .drift = real(s, "drift", 0)};
        read_lines(s, "orders", true, &sensor->noise);
        read_lines(s, "lines", false, &sensor->noise);
        spec->csv.digits[i] = (int)real(s, "digits", 4);
    }
}

static void read_recording(struct spec *spec)
{
    const json_t *r = json_object_get(spec->json, "recording");
    only(r, " format bits rate_hz seconds full_scale_v oversample csv ");
    spec->format = text(r, "format", "wav");
    spec->bits = (int)real(r, "bits", 16);
    spec->rate_hz = real(r, "rate_hz", NAN);
    spec->seconds = real(r, "seconds", NAN);
    spec->full_scale = real(r, "full_scale_v", 10);
    spec->oversample = (int)real(r, "oversample", 0);
    const json_t *c = json_object_get(r, "csv");
    only(c, " separator decimal time_name time_digits preamble crlf bom quoted header units "
            "tacho_digits ");
    spec->csv.separator = *text(c, "separator", ",");
    spec->csv.decimal = *text(c, "decimal", ".");
    spec->csv.time_name = text(c, "time_name", NULL);
    spec->csv.time_digits = (int)real(c, "time_digits", 6);
    spec->csv.preamble = (int)real(c, "preamble", 0);
    spec->csv.crlf = json_is_true(json_object_get(c, "crlf"));
    spec->csv.bom = json_is_true(json_object_get(c, "bom"));
    spec->csv.quoted = json_is_true(json_object_get(c, "quoted"));
}

/* The header and units rows and the tacho's column, once the sensors are known. */
static void read_columns(struct spec *spec)
{
    const json_t *c = json_object_get(json_object_get(spec->json, "recording"), "csv");
    size_t n = spec->rotor.sensor_count;
    for (size_t i = 0; i <= n; i++) {
        const struct spec_sensor *s = &spec->sensors[i];
        if (!json_is_false(json_object_get(c, "header")))
            spec->csv.names[i] = i < n ? s->name : "Tacho";
        if (json_is_true(json_object_get(c, "units")))
            spec->csv.units[i] = i < n && s->v_per_unit == 0 ? s->unit : "V";
    }
    spec->csv.digits[n] = (int)real(c, "tacho_digits", 2);
}

static void read_planes(struct spec *spec)
{
    spec->plane_count = count(spec->json, "planes", ROTOR_PLANES);
    for (size_t i = 0; i < spec->plane_count; i++) {
        const json_t *p = item(spec->json, "planes", i);
        only(p, " name radius_mm lines ");
        spec->planes[i] = (struct spec_plane){text(p, "name", ""), real(p, "radius_mm", NAN) / 1000,
                                              json_object_get(p, "lines")};
    }
    spec->heavy_count = count(spec->json, "heavy", SPEC_MASSES);
    for (size_t i = 0; i < spec->heavy_count; i++)
        spec->heavy[i] = read_mass(item(spec->json, "heavy", i));
}

static void read_run(struct spec *spec, const json_t *r, struct spec_run *run)
{
    only(r, " name file weights moved rpm sweep_rpm_s seconds lines ");
    run->name = text(r, "name", "");
    run->file = text(r, "file", run->name);
    run->rpm = real(r, "rpm", spec->rotor.rpm);
    run->sweep_rpm_s = real(r, "sweep_rpm_s", 0);
    run->seconds = real(r, "seconds", spec->seconds);
    run->lines = json_object_get(r, "lines");
    run->weight_count = count(r, "weights", SPEC_MASSES);
    for (size_t i = 0; i < run->weight_count; i++) {
        const json_t *w = item(r, "weights", i);
        only(w, " plane mass_g angle_deg radius_mm position ");
        struct spec_weight *weight = &run->weights[i];
        weight->plane = (size_t)real(w, "plane", 0);
        if (weight->plane >= spec->plane_count) {
            complain("no such plane for a weight in run", run->name);
            return;
        }
        weight->mass = real(w, "mass_g", NAN) / 1000;
        weight->angle_deg = real(w, "angle_deg", NAN);
        weight->radius = real(w, "radius_mm", spec->planes[weight->plane].radius * 1000) / 1000;
        weight->position = (int)real(w, "position", 0);
    }
    run->moved_count = count(r, "moved", SPEC_MASSES);
    for (size_t i = 0; i < run->moved_count; i++)
        run->moved[i] = read_mass(item(r, "moved", i));
}

int spec_read(struct spec *spec, const char *path)
{
    memset(spec, 0, sizeof *spec);
    failed = false;
    json_error_t error;
    spec->json = json_load_file(path, JSON_REJECT_DUPLICATES, &error);
    if (!spec->json) {
        fprintf(stderr, "simulate: %s: '%s' (line %d)\n", error.text, path, error.line);
        return -1;
    }
    only(spec->json, " seed title angles edge rotor tape tacho modes heavy sensors planes runs "
                     "recording sheet ");
    spec->seed = (uint64_t)real(spec->json, "seed", NAN);
    spec->title = text(spec->json, "title", "simulated");
    spec->with_rotation = !strcmp(text(spec->json, "angles", "against rotation"), "with rotation");
    spec->edge = strcmp(text(spec->json, "edge", "rising"), "falling") ? 1 : -1;
    read_recording(spec);
    read_rotor(spec);
    read_tacho(spec);
    read_sensors(spec);
    read_columns(spec);
    read_planes(spec);
    spec->run_count = count(spec->json, "runs", SPEC_RUNS);
    for (size_t i = 0; i < spec->run_count; i++)
        read_run(spec, item(spec->json, "runs", i), &spec->runs[i]);
    if (failed)
        spec_release(spec);
    return failed ? -1 : 0;
}

void spec_release(struct spec *spec)
{
    json_decref(spec->json);
    spec->json = NULL;
}
