#include "track/vector.h"

#include <math.h>

#include "base/angle.h"

typedef float lanes __attribute__((vector_size(16)));

static lanes spread(double value)
{
    float v = (float)value;

    return (lanes){v, v, v, v};
}

/* sin and cos of pi*y for |y| <= 1/2 by their Taylor polynomials; the remainders at 1/2 are 6e-8
 * and 7e-9, below the precision of the lanes. */
static void half_angle(lanes y, lanes *sine, lanes *cosine)
{
    const double p = PI * PI;
    lanes z = y * y;
    lanes s = spread(-p * p * p * p * p / 39916800.0);
    lanes c = spread(p * p * p * p * p * p / 479001600.0);

    s = s * z + spread(p * p * p * p / 362880.0);
    s = s * z - spread(p * p * p / 5040.0);
    s = s * z + spread(p * p / 120.0);
    s = s * z - spread(p / 6.0);
    s = s * z + spread(1.0);
    c = c * z - spread(p * p * p * p * p / 3628800.0);
    c = c * z + spread(p * p * p * p / 40320.0);
    c = c * z - spread(p * p * p / 720.0);
    c = c * z + spread(p * p / 24.0);
    c = c * z - spread(p / 2.0);
    c = c * z + spread(1.0);
    *sine = s * y * spread(PI);
    *cosine = c;
}

/* Adds the ripple at the shares s of a turn to the angle u, and its slope (by s) to `slope`: two
 * sums over powers of exp(j*2*pi*s), by Horner's rule. */
static void add_ripple(const struct shaft_ripple *ripple, lanes s, lanes *u, lanes *slope)
{
    lanes sine, cosine, re = spread(0), im = re, slope_re = re, slope_im = re;

    half_angle(s - spread(0.5), &sine, &cosine);
    lanes c = spread(2) * sine * sine - spread(1), j = spread(-2) * sine * cosine;

    for (size_t k = ripple->orders; k-- > 0;) {
        double turn = 2 * PI * (double)(k + 1);
        lanes a = re + spread(ripple->cosine[k]), b = im - spread(ripple->sine[k]);

        re = a * c - b * j;
        im = a * j + b * c;
        a = slope_re + spread(turn * ripple->sine[k]);
        b = slope_im + spread(turn * ripple->cosine[k]);
        slope_re = a * c - b * j;
        slope_im = a * j + b * c;
    }
    *u += re + spread(ripple->mean);
    *slope += slope_re;
}

void vector_weigh(struct vector_weights *weights, const struct shaft_turn *turn, double start,
                  size_t count)
{
    double step = 1 / (turn->t1 - turn->t0), first = (start - turn->t0) * step;
    const double *k = turn->c;
    lanes s = {(float)first, (float)(first + step), (float)(first + 2 * step),
               (float)(first + 3 * step)};
    lanes base = s, index = spread(0);

    weights->count = count;
    for (size_t i = 0; i < count; i += 4) {
        lanes u = spread(k[5]) * s + spread(k[4]), slope = spread(5 * k[5]) * s + spread(4 * k[4]);
        lanes sine, cosine;

        u = u * s + spread(k[3]);
        u = u * s + spread(k[2]);
        u = u * s + spread(k[1]);
        u = u * s;
        slope = slope * s + spread(3 * k[3]);
        slope = slope * s + spread(2 * k[2]);
        slope = slope * s + spread(k[1]);
        if (turn->ripple) {
            add_ripple(turn->ripple, s, &u, &slope);
        }
        slope = slope * spread(step);
        half_angle(u - spread(0.5), &sine, &cosine);
        *(lanes *)(weights->angle + i) = u;
        *(lanes *)(weights->one + i) = slope;
        *(lanes *)(weights->cosine + i) = slope * (spread(2) * sine * sine - spread(1));
        *(lanes *)(weights->sine + i) = slope * (spread(-2) * sine * cosine);
        index += spread(4);
        s = base + index * spread(step);
    }
    for (size_t i = count; i % 4; i++) {
        weights->angle[i] = weights->one[i] = weights->cosine[i] = weights->sine[i] = 0;
    }
}

void vector_ramp(struct vector_weights *weights)
{
    for (size_t i = 0; i < weights->count; i++) {
        float one = weights->one[i];
        float ramp = weights->angle[i] - weights->sine[i] / one * (float)(1 / (2 * PI));

        weights->one[i] = one * ramp;
        weights->cosine[i] *= ramp;
        weights->sine[i] *= ramp;
    }
}

static double total(lanes v)
{
    return ((double)v[0] + (double)v[1]) + ((double)v[2] + (double)v[3]);
}

void vector_add(struct vector_sums *sums, const struct vector_weights *weights, const float *x,
                float offset)
{
    lanes re = spread(0), im = re, mean = re, square = re, shift = spread(offset);
    size_t i = 0;

    for (; i + 4 <= weights->count; i += 4) {
        lanes y = (lanes){x[i], x[i + 1], x[i + 2], x[i + 3]} - shift;
        lanes w = *(const lanes *)(weights->one + i) * y;

        re += *(const lanes *)(weights->cosine + i) * y;
        im += *(const lanes *)(weights->sine + i) * y;
        mean += w;
        square += w * y;
    }
    for (size_t k = 0; i + k < weights->count; k++) {
        float y = x[i + k] - offset;

        re[k] += weights->cosine[i + k] * y;
        im[k] += weights->sine[i + k] * y;
        mean[k] += weights->one[i + k] * y;
        square[k] += weights->one[i + k] * y * y;
    }
    sums->re += total(re);
    sums->im += total(im);
    sums->mean += total(mean);
    sums->square += total(square);
}
