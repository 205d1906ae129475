/* rotor.c - geometry and mechanics of a turning disc on its support. */
#include "rotor.h"

#include <complex.h>
#include <math.h>

static const double TWO_PI = 6.28318530717958647692;

static double radians(double deg)
{
    return deg * (TWO_PI / 360);
}

void rotor_turned(const struct rotor *rotor, double t, double *turned, double *speed,
                  double *acceleration)
{
    double w0 = rotor->rpm * TWO_PI / 60, rate = rotor->sweep_rpm_s * TWO_PI / 60;
    double phi = w0 * t + rate * t * t / 2, w = w0 + rate * t, a = rate;
    for (size_t i = 0; i < ROTOR_WANDERS; i++) {
        const struct rotor_wander *v = &rotor->wander[i];
        if (v->depth == 0)
            continue;
        double k = TWO_PI / v->period_s;
        phi += w0 * v->depth * (cos(v->phase) - cos(k * t + v->phase)) / k;
        w += w0 * v->depth * sin(k * t + v->phase);
        a += w0 * v->depth * k * cos(k * t + v->phase);
    }
    if (turned)
        *turned = phi;
    if (speed)
        *speed = w;
    if (acceleration)
        *acceleration = a;
}

/* Laboratory angle of the body point at time t. */
static double laboratory(const struct rotor *rotor, double body_deg, double turned)
{
    return radians(rotor->start_deg + body_deg) + rotor->direction * turned;
}

struct rotor_mass rotor_weight(const struct rotor *rotor, size_t plane, double mass, double radius,
                               double angle_deg)
{
    /* Against rotation is clockwise on a disc that turns counter-clockwise. */
    double body = rotor->tape_deg - rotor->direction * angle_deg;
    return (struct rotor_mass){plane, mass, radius, body};
}

double rotor_against(const struct rotor *rotor, double body_deg)
{
    double deg = fmod(rotor->direction * (rotor->tape_deg - body_deg), 360);
    return deg < 0 ? deg + 360 : deg;
}

double rotor_before_tacho(const struct rotor *rotor, double body_deg, double t)
{
    double turned;
    rotor_turned(rotor, t, &turned, NULL, NULL);
    double past = laboratory(rotor, body_deg, turned) - radians(rotor->tacho_deg);
    return remainder(rotor->direction * past, TWO_PI);
}

/* Force of all masses on a mode, as a complex number: real part to the right, imaginary part up. */
static double complex mode_force(const struct rotor *rotor, const struct rotor_mode *mode,
                                 const struct rotor_mass *masses, size_t mass_count, double turned,
                                 double speed, double acceleration)
{
    double complex pull = 0;
    /* -m times the second derivative of r*exp(j*psi) */
    double complex inertia = speed * speed - I * rotor->direction * acceleration;
    for (size_t i = 0; i < mass_count; i++) {
        const struct rotor_mass *m = &masses[i];
        double psi = laboratory(rotor, m->body_deg, turned);
        pull += mode->planes[m->plane] * m->mass * m->radius * cexp(I * psi);
    }
    return pull * inertia;
}

/* What a sine of speed w does to one direction of a mode: factor and delay as a complex number. */
static double complex receptance(double hz, const struct rotor_mode *mode, double w)
{
    double wn = TWO_PI * hz;
    return 1 / (mode->mass * (wn * wn - w * w + 2 * I * mode->damping * wn * w));
}

double rotor_steady(const struct rotor *rotor, const struct rotor_mass *masses, size_t mass_count,
                    size_t sensor, double t)
{
    double turned, w;
    rotor_turned(rotor, t, &turned, &w, NULL);
    const struct rotor_sensor *s = &rotor->sensors[sensor];
    double cx = cos(radians(s->at_deg)), cy = sin(radians(s->at_deg));
    double complex motion = 0;
    for (size_t k = 0; k < rotor->mode_count; k++) {
        const struct rotor_mode *mode = &rotor->modes[k];
        double complex now = mode_force(rotor, mode, masses, mass_count, turned, w, 0);
        /* a quarter turn earlier: tells where in its cycle each direction's force is */
        double complex past =
            mode_force(rotor, mode, masses, mass_count, turned - TWO_PI / 4, w, 0);
        double complex fx = creal(now) + I * creal(past), fy = cimag(now) + I * cimag(past);
        motion += mode->sensors[sensor] * (cx * fx * receptance(mode->x_hz, mode, w) +
                                           cy * fy * receptance(mode->y_hz, mode, w));
    }
    if (s->quantity == ROTOR_VELOCITY)
        motion *= I * w;
    if (s->quantity == ROTOR_ACCELERATION)
        motion *= -w * w;
    return creal(motion);
}

/* One mode in both directions: displacement and velocity. */
struct state {
    double q[2], v[2];
};

static void slope(const struct rotor *rotor, const struct rotor_mode *mode,
                  const struct rotor_mass *masses, size_t mass_count, double t,
                  const struct state *s, struct state *d)
{
    double turned, w, a;
    rotor_turned(rotor, t, &turned, &w, &a);
    double complex f = mode_force(rotor, mode, masses, mass_count, turned, w, a) / mode->mass;
    double wn[2] = {TWO_PI * mode->x_hz, TWO_PI * mode->y_hz}, pull[2] = {creal(f), cimag(f)};
    for (int i = 0; i < 2; i++) {
        d->q[i] = s->v[i];
        d->v[i] = pull[i] - 2 * mode->damping * wn[i] * s->v[i] - wn[i] * wn[i] * s->q[i];
    }
}

static struct state moved(const struct state *s, const struct state *d, double h)
{
    struct state r = *s;
    for (int i = 0; i < 2; i++) {
        r.q[i] += h * d->q[i];
        r.v[i] += h * d->v[i];
    }
    return r;
}

static void advance(const struct rotor *rotor, const struct rotor_mode *mode,
                    const struct rotor_mass *masses, size_t mass_count, double t, double h,
                    struct state *s)
{
    struct state a, b, c, d, at;
    slope(rotor, mode, masses, mass_count, t, s, &a);
    at = moved(s, &a, h / 2);
    slope(rotor, mode, masses, mass_count, t + h / 2, &at, &b);
    at = moved(s, &b, h / 2);
    slope(rotor, mode, masses, mass_count, t + h / 2, &at, &c);
    at = moved(s, &c, h);
    slope(rotor, mode, masses, mass_count, t + h, &at, &d);
    for (int i = 0; i < 2; i++) {
        s->q[i] += h / 6 * (a.q[i] + 2 * b.q[i] + 2 * c.q[i] + d.q[i]);
        s->v[i] += h / 6 * (a.v[i] + 2 * b.v[i] + 2 * c.v[i] + d.v[i]);
    }
}

/* Steady motion of a mode at t = 0, to start the integration without a jolt. */
static struct state at_rest(const struct rotor *rotor, const struct rotor_mode *mode,
                            const struct rotor_mass *masses, size_t mass_count)
{
    double turned, w;
    rotor_turned(rotor, 0, &turned, &w, NULL);
    double complex now = mode_force(rotor, mode, masses, mass_count, turned, w, 0);
    double complex past = mode_force(rotor, mode, masses, mass_count, turned - TWO_PI / 4, w, 0);
    double complex x = (creal(now) + I * creal(past)) * receptance(mode->x_hz, mode, w);
    double complex y = (cimag(now) + I * cimag(past)) * receptance(mode->y_hz, mode, w);
    return (struct state){{creal(x), creal(y)}, {creal(I * w * x), creal(I * w * y)}};
}

static double felt(const struct rotor_sensor *s, const struct state *m, const struct state *d)
{
    double c[2] = {cos(radians(s->at_deg)), sin(radians(s->at_deg))};
    if (s->quantity == ROTOR_DISPLACEMENT)
        return c[0] * m->q[0] + c[1] * m->q[1];
    if (s->quantity == ROTOR_VELOCITY)
        return c[0] * m->v[0] + c[1] * m->v[1];
    return c[0] * d->v[0] + c[1] * d->v[1];
}

static void integrate_mode(const struct rotor *rotor, const struct rotor_mode *mode,
                           const struct rotor_mass *masses, size_t mass_count, double rate_hz,
                           size_t n, int oversample, double *x)
{
    struct state s = at_rest(rotor, mode, masses, mass_count), d;
    double h = 1 / (rate_hz * oversample);
    for (size_t i = 0; i < n; i++) {
        double t = (double)i / rate_hz;
        slope(rotor, mode, masses, mass_count, t, &s, &d);
        for (size_t k = 0; k < rotor->sensor_count; k++)
            x[i * rotor->sensor_count + k] += mode->sensors[k] * felt(&rotor->sensors[k], &s, &d);
        for (int j = 0; j < oversample; j++)
            advance(rotor, mode, masses, mass_count, t + j * h, h, &s);
    }
}

void rotor_run(const struct rotor *rotor, const struct rotor_mass *masses, size_t mass_count,
               double rate_hz, size_t n, int oversample, double *x)
{
    if (oversample > 0) {
        for (size_t i = 0; i < n * rotor->sensor_count; i++)
            x[i] = 0;
        for (size_t k = 0; k < rotor->mode_count; k++)
            integrate_mode(rotor, &rotor->modes[k], masses, mass_count, rate_hz, n, oversample, x);
        return;
    }
    for (size_t i = 0; i < n; i++)
        for (size_t k = 0; k < rotor->sensor_count; k++)
            x[i * rotor->sensor_count + k] =
                rotor_steady(rotor, masses, mass_count, k, (double)i / rate_hz);
}

/* Time in (0, period] at which the tape's edge is exactly before the tacho. */
static double edge_time(const struct rotor *rotor, int edge, double period)
{
    /* The edge that comes first lies ahead in the sense of rotation. */
    double body = rotor->tape_deg + edge * rotor->direction * rotor->tape_width_deg / 2;
    double past = rotor_before_tacho(rotor, body, 0);
    double to_go = past < 0 ? -past : TWO_PI - past;
    return to_go / TWO_PI * period;
}

struct rotor_vector rotor_truth(const struct rotor *rotor, const struct rotor_mass *masses,
                                size_t mass_count, size_t sensor, int edge)
{
    enum { STEPS = 720 };
    struct rotor steady = *rotor;
    steady.sweep_rpm_s = 0;
    for (size_t i = 0; i < ROTOR_WANDERS; i++)
        steady.wander[i].depth = 0;
    double period = 60 / rotor->rpm, start = edge_time(&steady, edge, period),
           step = period / STEPS;
    double best = -INFINITY, at = start;
    for (int i = 0; i < STEPS; i++) {
        double x = rotor_steady(&steady, masses, mass_count, sensor, start + i * step);
        if (x > best) {
            best = x;
            at = start + i * step;
        }
    }
    /* The peak is where the slope changes sign: bisect the difference of two near samples. */
    double low = at - step, high = at + step, near = period / 36;
    for (int i = 0; i < 60; i++) {
        double middle = (low + high) / 2;
        double rise = rotor_steady(&steady, masses, mass_count, sensor, middle + near) -
                      rotor_steady(&steady, masses, mass_count, sensor, middle - near);
        if (rise > 0)
            low = middle;
        else
            high = middle;
    }
    struct rotor_vector z;
    z.amplitude = rotor_steady(&steady, masses, mass_count, sensor, low);
    z.lag_deg = fmod((low - start) / period * 360 + 360, 360);
    z.re = z.amplitude * cos(radians(z.lag_deg));
    z.im = z.amplitude * sin(radians(z.lag_deg));
    return z;
}
