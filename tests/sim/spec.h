/* spec.h - a simulated job as a JSON file says it. The keys stand in spec.c, an example in
 * demo-fan.json. */
#ifndef LOPSIDE_SIM_SPEC_H
#define LOPSIDE_SIM_SPEC_H

#include <jansson.h>
#include <stdint.h>

#include "noise.h"
#include "optical.h"
#include "recording.h"
#include "rotor.h"

#define SPEC_RUNS 16
#define SPEC_MASSES 8

struct spec_sensor {
    const char *name, *unit, *scale, *show;
    double si_per_unit; /* SI of the measured quantity per unit */
    double v_per_unit;  /* 0: the file holds the unit itself (CSV) */
    struct noise noise; /* in the unit */
};

struct spec_plane {
    const char *name;
    double radius;       /* m */
    const json_t *lines; /* further lines of the sheet, or NULL */
};

struct spec_weight {
    size_t plane;
    double mass, angle_deg; /* kg; counted as the sheet counts */
    double radius;          /* m; where it is fixed */
    int position;           /* 0: the sheet says the angle */
};

struct spec_run {
    const char *name, *file;
    struct spec_weight weights[SPEC_MASSES];
    size_t weight_count;
    struct rotor_mass moved[SPEC_MASSES]; /* what changed on the body by itself in this run */
    size_t moved_count;
    double rpm, sweep_rpm_s, seconds;
    const json_t *lines;
};

struct spec {
    json_t *json; /* owned; all strings point into it */
    uint64_t seed;
    const char *title;
    bool with_rotation; /* how the sheet counts weight angles */
    int edge;           /* +1 rising, -1 falling: what the sheet says */
    struct rotor rotor;
    struct optical optical;
    struct rotor_mass heavy[SPEC_MASSES];
    size_t heavy_count;
    struct spec_sensor sensors[ROTOR_SENSORS];
    struct spec_plane planes[ROTOR_PLANES];
    size_t plane_count;
    struct spec_run runs[SPEC_RUNS];
    size_t run_count;
    const char *format; /* "wav", "rf64", "flac", "csv" */
    int bits, oversample;
    double rate_hz, seconds, full_scale;
    struct recording_csv csv;
};

/* Returns 0; or -1 with a line on standard error: unreadable, an unknown key, a missing value. */
int spec_read(struct spec *spec, const char *path) __attribute__((warn_unused_result));
void spec_release(struct spec *spec);

#endif
