/* optical.c - the tacho's signal. */
#include "optical.h"

#include <math.h>

#include "rng.h"

static const double TWO_PI = 6.28318530717958647692;

/* How much of a mark of that half width is seen, 0..1, `past` (rad) after its middle. */
static double seen(double past, double half_width, double speed, double edge_s)
{
    double inside_s = (half_width - fabs(past)) / speed;
    return fmin(1, fmax(0, inside_s / edge_s + 0.5));
}

static double luck(uint64_t seed, long turn, uint64_t what)
{
    struct rng rng;
    rng_init(&rng, seed + 0x632be59bd9b4e019u * (uint64_t)(turn + 1000000) + what);
    return rng_uniform(&rng);
}

static double level(const struct optical *p, const struct rotor *rotor, uint64_t seed, double t)
{
    double turned, speed;
    rotor_turned(rotor, t, &turned, &speed, NULL);
    double half = rotor->tape_width_deg / 360 * TWO_PI / 2;
    double past = rotor_before_tacho(rotor, rotor->tape_deg, t);
    long turn = lround((turned - past) / TWO_PI); /* which passage is nearest */
    double height = 0;
    bool lost = luck(seed, turn, 1) < p->missing ||
                (turn >= p->gap_from && turn < p->gap_from + p->gap_turns);
    if (!lost)
        height = seen(past, half, speed, p->edge_s);
    if (p->extra > 0 && luck(seed, turn, 2) < p->extra) {
        /* at random within the half turn on either side, clear of the tape itself */
        double where = (0.1 + 0.35 * luck(seed, turn, 3)) * TWO_PI;
        if (luck(seed, turn, 4) < 0.5)
            where = -where;
        height = fmax(height, seen(past - where, half, speed, p->edge_s));
    }
    if (p->scratch_height > 0)
        height = fmax(height, p->scratch_height * seen(rotor_before_tacho(rotor, p->scratch_deg, t),
                                                       p->scratch_width_deg / 720 * TWO_PI, speed,
                                                       p->edge_s));
    if (p->teeth > 0)
        height = fmax(height, p->ripple * (0.5 + 0.5 * cos(p->teeth * past)));
    if (p->grow_rpm > 0)
        height *= speed * 60 / TWO_PI / p->grow_rpm;
    return p->low_v + height * (p->high_v - p->low_v);
}

void optical_run(const struct optical *optical, const struct rotor *rotor, uint64_t seed,
                 double rate_hz, size_t n, double *volts, size_t stride)
{
    struct rng rng;
    rng_init(&rng, seed ^ 0x7ac40u);
    double keep = optical->ac_s > 0 ? exp(-1 / (rate_hz * optical->ac_s)) : 1, last = 0, out = 0;
    for (size_t i = 0; i < n; i++) {
        double v = level(optical, rotor, seed, (double)i / rate_hz);
        if (optical->ac_s > 0) {
            /* starts as if it had been running: at the level beside the tape */
            out = i == 0 ? v - optical->low_v : keep * (out + v - last);
            last = v;
            v = out;
        }
        volts[i * stride] = v + (optical->noise_v > 0 ? optical->noise_v * rng_normal(&rng) : 0);
    }
}
