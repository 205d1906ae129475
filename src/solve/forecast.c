#include "solve/forecast.h"

#include <math.h>

#define STEPS 96   /* of Simpson's rule over the tangential component, even */
#define MIXTURE 24 /* of Simpson's rule over the scale of the t distribution, even */
#define REACH 8.0  /* standard deviations beyond which a normal density is nothing (1e-15) */
#define PI_HALF 1.57079632679489661923

static double below(double x)
{
    return 0.5 * erfc(-x / sqrt(2));
}

/* In the frame of the mean: u along it, v across. */
struct frame {
    double mean;  /* |mean| */
    double sd_v;  /* of v */
    double slope; /* of E[u | v] */
    double sd_u;  /* of u given v */
};

static struct frame frame_of(double complex mean, const double cov[3])
{
    double a = cabs(mean);
    double c = a > 0 ? creal(mean) / a : 1, s = a > 0 ? cimag(mean) / a : 0;
    double uu = c * c * cov[0] + 2 * c * s * cov[1] + s * s * cov[2];
    double vv = s * s * cov[0] - 2 * c * s * cov[1] + c * c * cov[2];
    double uv = -c * s * cov[0] + (c * c - s * s) * cov[1] + c * s * cov[2];
    double least = 1e-10 * (uu + vv); /* a line is a very thin ellipse */
    uu = fmax(uu, least);
    vv = fmax(vv, least);
    struct frame f = {a, sqrt(vv), uv / vv, sqrt(fmax(uu - uv * uv / vv, least))};
    return f;
}

/* P(|z| <= radius) of the normal; `k` stretches both standard deviations. */
static double normal_within(const struct frame *f, double k, double radius)
{
    double sv = k * f->sd_v, su = k * f->sd_u;
    double limit = REACH * sv >= radius ? PI_HALF : asin(REACH * sv / radius);
    double h = 2 * limit / STEPS, sum = 0;
    for (int i = 0; i <= STEPS; i++) {
        double t = -limit + i * h;
        double v = radius * sin(t), reach = radius * cos(t);
        double u = f->mean + f->slope * v;
        double inside = below((reach - u) / su) - below((-reach - u) / su);
        double density = exp(-0.5 * v * v / (sv * sv)) * reach;
        sum += (i == 0 || i == STEPS ? 1 : i % 2 ? 4 : 2) * density * inside;
    }
    return sum * h / 3 / (sv * sqrt(2 * 3.14159265358979323846));
}

double forecast_within(double complex mean, const double cov[3], double dof, double radius)
{
    if (!isfinite(creal(mean) + cimag(mean) + cov[0] + cov[1] + cov[2]) || isnan(radius))
        return NAN;
    if (!(cov[0] + cov[2] > 0))
        return cabs(mean) <= radius ? 1 : 0;
    if (!(radius > 0))
        return 0;
    struct frame f = frame_of(mean, cov);
    if (isinf(dof))
        return fmin(1, normal_within(&f, 1, radius));
    /* z = mean + n / sqrt(g), g = chi^2_dof / dof; over y = log g, whose density is
     * exp(dof/2 (y - exp y)) but for a constant. */
    double width = sqrt(2 / dof), low = -7.5 * width - 3 * width * width, high = 5.5 * width;
    double h = (high - low) / MIXTURE, sum = 0, total = 0;
    for (int i = 0; i <= MIXTURE; i++) {
        double y = low + i * h;
        double weight = (i == 0 || i == MIXTURE ? 1
                         : i % 2                ? 4
                                                : 2) *
                        exp(dof / 2 * (y - exp(y) + 1));
        total += weight;
        if (weight > 1e-14)
            sum += weight * normal_within(&f, exp(-y / 2), radius);
    }
    return fmin(1, sum / total);
}

/* The radius between low and high: bisection to come near, then the Illinois variant of regula
 * falsi (Dowell & Jarratt, BIT 11 (1971) 168-174). */
static double root_between(double complex mean, const double cov[3], double dof, double p,
                           double low, double high)
{
    double spread = sqrt(cov[0] + cov[2]), x = high;
    double at_low = forecast_within(mean, cov, dof, low) - p;
    double at_high = forecast_within(mean, cov, dof, high) - p;
    int side = 0;
    for (int i = 0; i < 60 && high - low > 1e-7 * spread; i++) {
        x = i < 6 ? 0.5 * (low + high) : (low * at_high - high * at_low) / (at_high - at_low);
        double at = forecast_within(mean, cov, dof, x) - p;
        if (fabs(at) < 1e-9)
            break;
        if (at < 0) {
            low = x;
            at_low = at;
            at_high *= side < 0 ? 0.5 : 1;
            side = -1;
        } else {
            high = x;
            at_high = at;
            at_low *= side > 0 ? 0.5 : 1;
            side = 1;
        }
    }
    return x;
}

double forecast_quantile(double complex mean, const double cov[3], double dof, double p)
{
    double spread = sqrt(cov[0] + cov[2]), low = 0, high = cabs(mean) + 4 * spread;
    if (!isfinite(high))
        return NAN;
    if (!(spread > 0))
        return cabs(mean);
    while (forecast_within(mean, cov, dof, high) < p && high < 1e6 * (cabs(mean) + spread))
        high *= 2;
    low = fmax(0, cabs(mean) - 40 * spread);
    return root_between(mean, cov, dof, p, low, high);
}
