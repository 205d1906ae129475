/* job.h - the job: what the `job` record says, in memory.
 *
 * `read` makes it from the job sheet (src/sheet) and prints it; every later stage parses it back
 * from the stream and needs nothing else of the sheet. All values are SI; every weight angle is in
 * degrees against rotation from the mark, whatever the sheet's sense. `read` alone knows the
 * sheet's sense; `job_sheet_angle` turns an angle back into it for people.
 */
#ifndef LOPSIDE_STREAM_JOB_H
#define LOPSIDE_STREAM_JOB_H

#include <complex.h>
#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

#define NAME_ROOM 41 /* names are up to 40 bytes */

enum quantity { QUANTITY_ACCELERATION, QUANTITY_VELOCITY, QUANTITY_DISPLACEMENT, QUANTITY_TACHO };
enum detection { DETECTION_PEAK, DETECTION_PEAK_TO_PEAK, DETECTION_RMS };
enum sense { SENSE_NONE, SENSE_AGAINST, SENSE_WITH };            /* how people count weight angles */
enum phase_sign { PHASE_NONE, PHASE_LAG, PHASE_LEAD };           /* hand readings only */
enum unit_system { UNITS_METRIC, UNITS_US };
enum turning { TURNING_NONE, TURNING_CLOCKWISE, TURNING_COUNTER_CLOCKWISE };
enum support { SUPPORT_NONE, SUPPORT_BETWEEN_BEARINGS, SUPPORT_OVERHUNG };
enum minimise { MINIMISE_TOTAL, MINIMISE_WORST, MINIMISE_STATIC_FIRST };
enum tolerance { TOLERANCE_NONE, TOLERANCE_GRADE, TOLERANCE_API_4WN };
enum work { WORK_ADD, WORK_REMOVE };

/* How a vibration amplitude is shown: "mm/s rms". */
struct show {
    const char *unit;         /* static: "g", "m/s2", "mm/s", "in/s", "um", "mil" */
    enum quantity quantity;   /* of that unit */
    double si;                /* SI per unit: 0.001 for mm/s */
    enum detection detection;
};

struct job_sensor {
    char name[NAME_ROOM];
    char channel[NAME_ROOM];  /* number from 1, or a CSV column's name */
    enum quantity quantity;   /* what the channel measures, hence what its vectors are */
    struct show show;
    double at_deg;            /* NaN: not given. Counted as the sheet counts, for drawings only */
};

struct job_piece {
    double mass;              /* kg */
    int count;                /* how many there are; -1: any number */
};

struct job_position {
    int number;               /* as people number it */
    double angle_deg;         /* against rotation, [0, 360) */
    bool taken;
};

struct job_plane {
    char name[NAME_ROOM];
    double radius_m;
    bool any_position;        /* `positions = any`, or no such key: any angle */
    struct job_position *positions; /* owned; in the order of their numbers */
    size_t position_count;
    struct job_piece *stock;  /* owned; NULL: any mass */
    size_t stock_count;
    int pieces;               /* at most, on this plane */
    double most, most_in_all; /* kg; INFINITY: no limit. At one position; on the plane */
    enum work work;
    double hole_m, density, depth_m; /* of a drill: diameter, kg/m3, deepest hole; not > 0: none */
};

struct job_weight {
    size_t plane;             /* index into planes */
    double mounted_mass;      /* kg, as bolted on; negative: removed */
    double radius_m;          /* where it is bolted */
    double mass;              /* kg, equivalent at the plane's radius: mounted_mass*radius_m/plane radius */
    double angle_deg;         /* against rotation, [0, 360) */
    int position;             /* number of the position, 0: given as an angle */
};

struct job_hand { /* a reading taken by hand */
    size_t sensor;            /* index into sensors */
    bool has_phase;
    double complex vector;    /* SI peak in the sensor's quantity, argument is lag (whatever the sheet states) */
    double amplitude;         /* SI peak */
};

struct job_run {
    char name[NAME_ROOM];
    char condition[NAME_ROOM]; /* default "service" */
    char role[NAME_ROOM];      /* "" for an ordinary run; "runout": slow roll, its 1x vectors are what the
                                * shaft's surface shows; "coast-down" */
    double *speeds_rpm;        /* owned: of a coast-down, the speeds that get a reading; ascending */
    size_t speed_count;        /* 0 for every other role */
    char when[NAME_ROOM];      /* as written, "" if absent */
    struct job_weight *weights; /* owned: all that is mounted, relative to as found */
    size_t weight_count;
    double speed_rpm;          /* of hand readings; NaN otherwise */
    struct job_hand *hand;     /* owned: hand readings; hand_count 0 for recorded runs */
    size_t hand_count;
    bool *without;             /* owned, one per sensor: true where the sensor was off */
};

struct job_target {
    double amplitude;          /* SI peak in `quantity`; NaN: none */
    enum quantity quantity;
    bool in_aim;               /* false: the aim names other sensors only (see job_aim.named) */
};

struct job_importance {
    char condition[NAME_ROOM];
    double factor;             /* its vibration counts as so many times as large in the aim, > 0 */
};

struct job_response {          /* a stored `response`, of a sensor and plane of this job */
    char condition[NAME_ROOM];
    size_t sensor, plane;
    double complex vector;     /* SI peak per kg at the plane's radius, argument is lag */
    double cov[3];             /* var re, cov, var im */
    double speed_rpm;          /* NaN: not known */
};

struct job_aim {
    struct job_target *targets; /* owned, one per sensor */
    bool named;                 /* some `target SENSOR` stands in the sheet without a `target` for all */
    enum minimise minimise;
    int mounted;                /* index of the run whose weights stay on the rotor; -1: everything comes off */
    double repeatability;       /* fraction of the as-found amplitude; default 0.03 */
    bool repeatability_given;
    enum tolerance tolerance;
    int zone_group;             /* of ISO 20816-3: 1 or 2; 0: no zones asked for */
    bool zone_flexible;         /* its support */
    struct job_importance *importances; /* owned; conditions without one count as 1 */
    size_t importance_count;
};

struct job_limit {
    char check[NAME_ROOM];
    bool off;                   /* `none` */
    double caution, refuse;     /* in the check's unit (see vet); NaN: keep the default */
};

struct job {
    char title[201];
    enum sense angles;
    enum phase_sign phase;
    enum unit_system units;
    bool audit;                 /* the runs are recordings named on the command line, each by itself;
                                 * printed only where true */
    /* rotor */
    double rotor_mass;          /* kg, NaN: absent */
    double service_rpm;         /* NaN: absent */
    enum turning turning;       /* as seen from seen_from */
    char seen_from[NAME_ROOM];
    double grade;               /* G, in mm/s: 6.3; NaN: absent */
    enum support support;
    double span_m, centre_m;    /* bearing distance; centre of mass from bearing A towards B; NaN: absent */
    /* tacho */
    bool has_tacho;
    char tacho_channel[NAME_ROOM];
    int tacho_edge;             /* +1 rising, -1 falling */
    int tacho_marks;            /* pulses a turn */
    double tacho_level;         /* volts or CSV units; NaN: found from the recording */

    struct job_sensor *sensors; size_t sensor_count;
    struct job_plane *planes;   size_t plane_count;
    struct job_run *runs;       size_t run_count;
    struct job_aim aim;
    struct job_limit *limits;   size_t limit_count;
    struct job_response *responses; size_t response_count; /* owned; stored ones that the sheet names */
};

void job_init(struct job *job);    /* all absent; NaN where the comments say so */
void job_release(struct job *job); /* frees what is owned */

/* Appends the whole `job` record as one line with its newline. 0, or -1 when memory is out. */
int job_print(const struct job *job, struct buffer *line) __attribute__((warn_unused_result));

/* Fills `job` (already initialised) from a parsed `job` record. Returns 0; -1 with `why` (static)
 * when it is not one that this version understands; -2 when memory is out. */
int job_parse(struct job *job, const json_t *record, const char **why)
    __attribute__((warn_unused_result));

/* Index of the thing with that name, or -1. */
struct line;
/* Adds the field `weights` of a run (NULL: an empty list) to a line that is being built. */
void job_print_weights(const struct job *job, const struct job_run *run, struct line *line);

int job_find_sensor(const struct job *job, const char *name);
int job_find_plane(const struct job *job, const char *name);
int job_find_run(const struct job *job, const char *name);

/* True where run `run` carries no weight at all (its net equivalent weights are all zero). */
bool job_run_is_bare(const struct job *job, size_t run);

/* The first run that removed material which the run named by `mounted` does not list, so that the
 * job's answer takes it as put back; -1: none. */
int job_removed_run(const struct job *job);

/* The first ordinary run that is as found by its name ("found" in it, case aside) and carries weights all the
 * same, so that the job's answer takes as found to be the rotor without them; -1: none, or they stay on (`mounted`). */
int job_found_loaded(const struct job *job);

/* True where some ordinary run carries weights and none carries none, so that as found is what no run
 * shows; false where the weights of `mounted` stay on. */
bool job_never_bare(const struct job *job);

/* The condition of a coast-down's reading at one of its speeds: "<condition> @ 900 rpm", the speed as a
 * whole number or in its shortest decimal form (to 1e-6 rpm). False where it does not fit and is cut; the sheet sees to it
 * that this never happens. */
bool job_speed_condition(const char *condition, double speed_rpm, char to[NAME_ROOM]);

/* The total equivalent weight of run `run` on plane `plane`: sum of mass*exp(j*angle), kg. */
double complex job_run_weight(const struct job *job, size_t run, size_t plane);

/* An angle against rotation in the sheet's sense: itself, or 360 - it for `with rotation`. */
double job_sheet_angle(const struct job *job, double angle_deg);

/* "against rotation", "with rotation"; "against rotation" where the sheet states none. */
const char *job_sense_text(const struct job *job);

const char *quantity_text(enum quantity q);        /* "acceleration" ... "tacho" */
int quantity_parse(const char *text);              /* enum quantity, or -1 */
const char *detection_text(enum detection d);      /* "pk", "pk-pk", "rms" */

#endif
