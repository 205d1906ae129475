/* track_signal.h - test recordings from closed forms: a tape, a tacho and vibration on a shaft
 * whose angle is known analytically. Geometry only: the tacho is high while the tape (from angle 0
 * to its width) is in front of it, and the vibration is sum a_k*cos(k*theta - lag_k). */
#ifndef TRACK_SIGNAL_H
#define TRACK_SIGNAL_H

#include <math.h>
#include <stddef.h>
#include <stdint.h>

#define TAU 6.28318530717958647692

struct signal {
    double rate, rev;            /* Hz; mean rev/s */
    double wander, wander_turns; /* speed swing as a fraction, and its period in turns */
    double sweep;                /* rev/s per s */
    double tape;                 /* tape width, turns */
    double edge;                 /* width of the slow edges, turns; 0: two samples */
    double phase;                /* angle at time 0, turns */
};

static inline double signal_turns(const struct signal *s, double t)
{
    double w = s->wander_turns > 0 ? TAU * s->rev / s->wander_turns : 1;

    return s->phase + s->rev * t + s->sweep * t * t / 2 +
           (s->wander_turns > 0 ? s->rev * s->wander / w * (1 - cos(w * t)) : 0);
}

static inline double signal_speed(const struct signal *s, double t) /* rev/s */
{
    double w = s->wander_turns > 0 ? TAU * s->rev / s->wander_turns : 1;

    return s->rev + s->sweep * t + (s->wander_turns > 0 ? s->rev * s->wander * sin(w * t) : 0);
}

/* 1 under the tape, 0 elsewhere, with raised-cosine edges centred on angle 0 and `tape`. */
static inline double signal_tape(const struct signal *s, double t)
{
    double u = signal_turns(s, t), edge = s->edge > 0 ? s->edge : 2 * signal_speed(s, t) / s->rate;
    double a = u - floor(u + 0.5), b = a - s->tape;
    double up = a <= -edge / 2 ? 0 : a >= edge / 2 ? 1 : 0.5 + 0.5 * sin(TAU / 2 * a / edge);
    double down = b <= -edge / 2 ? 0 : b >= edge / 2 ? 1 : 0.5 + 0.5 * sin(TAU / 2 * b / edge);

    return up - down;
}

/* Normal deviates: xorshift64* (Vigna 2016), Box & Muller 1958. */
static inline double signal_uniform(uint64_t *state)
{
    *state ^= *state >> 12;
    *state ^= *state << 25;
    *state ^= *state >> 27;
    return (double)((*state * 2685821657736338717ULL) >> 11) / 9007199254740992.0;
}

static inline double signal_normal(uint64_t *state)
{
    double u = signal_uniform(state), v = signal_uniform(state);

    return sqrt(-2 * log(1 - u)) * cos(TAU * v);
}

#endif
