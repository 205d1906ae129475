/* rotor.h - a turning disc, a tape, a heavy spot and sensors, by geometry and mechanics only.
 *
 * The model never uses the relation that the program rests on. It knows a laboratory frame (looking
 * at the drive end, angles counter-clockwise from the right), a body that turns in it, masses on
 * the body that pull outwards, modes of the support that answer, and sensors that feel the motion
 * along their own direction. What a weight "at 30 deg against rotation from the tape" means is
 * worked out by walking that angle on the body, and the lag of a vibration by timing its positive
 * peak.
 *
 * Units: SI, angles in degrees where the name says so, else radians. All functions are pure but for
 * the random numbers handed in; NaN in gives NaN out.
 *
 *     struct rotor rotor = {.direction = -1, .tape_deg = 20, .tape_width_deg = 6, .tacho_deg = 90,
 *                           .rpm = 1480, ...};
 *     struct rotor_mass trial = rotor_weight(&rotor, 0, 0.060, 0.41, 30);   // 60 g at 30 deg
 *     struct rotor_vector z = rotor_truth(&rotor, masses, count, sensor, 1);
 */
#ifndef LOPSIDE_SIM_ROTOR_H
#define LOPSIDE_SIM_ROTOR_H

#include <stdbool.h>
#include <stddef.h>

#define ROTOR_PLANES 4
#define ROTOR_SENSORS 8
#define ROTOR_MODES 4
#define ROTOR_WANDERS 4

enum rotor_quantity { ROTOR_DISPLACEMENT, ROTOR_VELOCITY, ROTOR_ACCELERATION };

/* A mode of the rotor on its support; it may be softer one way than the other. */
struct rotor_mode {
    double x_hz, y_hz;             /* natural frequency, horizontal and vertical; > 0 */
    double damping;                /* fraction of critical, > 0 */
    double mass;                   /* modal mass, kg */
    double planes[ROTOR_PLANES];   /* mode shape at the planes */
    double sensors[ROTOR_SENSORS]; /* and at the sensors */
};

struct rotor_sensor {
    double at_deg;                /* its direction in the laboratory */
    enum rotor_quantity quantity; /* what it measures */
};

/* Speed: rpm(t) = rpm + sweep*t + rpm * sum depth*sin(2 pi t/period + phase). */
struct rotor_wander {
    double depth, period_s, phase;
};

struct rotor {
    int direction;      /* +1 counter-clockwise, -1 clockwise, seen from the drive end */
    double start_deg;   /* how far the body stands turned at t = 0 (counter-clockwise) */
    double rpm;         /* at t = 0, without wander; > 0 */
    double sweep_rpm_s; /* rpm per second */
    struct rotor_wander wander[ROTOR_WANDERS];
    double tape_deg, tape_width_deg; /* body angle of the tape's middle, its width */
    double tacho_deg;                /* where the fixed tacho looks, laboratory angle */
    struct rotor_mode modes[ROTOR_MODES];
    size_t mode_count;
    struct rotor_sensor sensors[ROTOR_SENSORS];
    size_t sensor_count;
};

/* A mass fixed on the body. Negative: taken away. */
struct rotor_mass {
    size_t plane;
    double mass, radius, body_deg;
};

/* 1x of one sensor: peak amplitude in SI of its quantity and lag behind the tape's edge. */
struct rotor_vector {
    double amplitude, lag_deg, re, im;
};

/* Where the shaft is at time t: angle turned (rad, grows whichever way it turns), speed rad/s,
 * acceleration rad/s2. Any pointer may be NULL. */
void rotor_turned(const struct rotor *rotor, double t, double *turned, double *speed,
                  double *acceleration);

/* The mass that an analyst fits `angle_deg` against rotation from the middle of the tape. */
struct rotor_mass rotor_weight(const struct rotor *rotor, size_t plane, double mass, double radius,
                               double angle_deg);

/* The same the other way: where on the body an angle is, counted against rotation, [0, 360). */
double rotor_against(const struct rotor *rotor, double body_deg);

/* Angle (rad, (-pi, pi], positive: has passed, in the sense of rotation) of the body point
 * `body_deg` relative to the tacho at time t. */
double rotor_before_tacho(const struct rotor *rotor, double body_deg, double t);

/* 1x motion of `sensor` at time t in SI of its quantity: the steady state of every mode, with
 * speed as it is at t (for constant or slowly changing speed). */
double rotor_steady(const struct rotor *rotor, const struct rotor_mass *masses, size_t mass_count,
                    size_t sensor, double t);

/* The same for all sensors and n samples at rate_hz, x[i * sensor_count + sensor], optionally by
 * integrating the equations of motion (classical Runge-Kutta, `oversample` steps a sample) from the
 * steady state at t = 0: right through a sweep, too. */
void rotor_run(const struct rotor *rotor, const struct rotor_mass *masses, size_t mass_count,
               double rate_hz, size_t n, int oversample, double *x);

/* True 1x at constant speed rotor->rpm (sweep and wander left out), measured as a person with a
 * fine oscilloscope would: time from the tape's edge before the tacho (edge +1: the pulse begins,
 * -1: it ends) to the following positive peak. */
struct rotor_vector rotor_truth(const struct rotor *rotor, const struct rotor_mass *masses,
                                size_t mass_count, size_t sensor, int edge);

#endif
