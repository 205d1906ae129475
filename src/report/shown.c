#include "report/shown.h"

#include <math.h>
#include <stdio.h>

#include "base/angle.h"
#include "sheet/units.h"

double shown_t95(double freedom)
{
    /* Student (1908), as in any table of t: two-sided 95 %, 1 to 4 degrees of freedom. */
    static const double table[] = {12.7062, 4.3027, 3.1824, 2.7764};
    const double x = 1.959964; /* normal, two-sided 95 % */
    if (!(freedom > 0) || isinf(freedom))
        return x;
    if (freedom <= 1)
        return table[0];
    if (freedom < 4) {
        int below = (int)freedom; /* 1, 2, 3 */
        double share = (1.0 / below - 1 / freedom) / (1.0 / below - 1.0 / (below + 1));
        return table[below - 1] + share * (table[below] - table[below - 1]);
    }
    double v = freedom, x3 = x * x * x, x5 = x3 * x * x, x7 = x5 * x * x, x9 = x7 * x * x;
    return x + (x3 + x) / (4 * v) + (5 * x5 + 16 * x3 + 3 * x) / (96 * v * v) +
           (3 * x7 + 19 * x5 + 17 * x3 - 15 * x) / (384 * v * v * v) +
           (79 * x9 + 776 * x7 + 1482 * x5 - 1920 * x3 - 945 * x) / (92160 * v * v * v * v);
}

/* What a vector of quantity `from` is multiplied with to become one of the shown quantity. */
static double complex turn(enum quantity from, double rpm, const struct show *show)
{
    if (from == show->quantity)
        return 1;
    if (!(rpm > 0) || isinf(rpm))
        return NAN;
    return units_convert(1, from, show->quantity, 2 * PI * rpm / 60);
}

static double spread(double variance, double t)
{
    return t * sqrt(variance > 0 ? variance : 0);
}

struct shown shown_vector(double complex z, const double cov[3], enum quantity from, double rpm,
                          const struct show *show, double freedom)
{
    struct shown s = {NAN, NAN, NAN, NAN, false};
    double complex factor = turn(from, rpm, show);
    double complex shown = z * factor;
    s.amplitude = units_shown(cabs(shown), show);
    if (isnan(s.amplitude))
        return s;
    s.lag_deg = angle_of(shown);
    bool known = cov && !isnan(cov[0] + cov[1] + cov[2]) && cov[0] + cov[2] > 0;
    double size = cabs(z);
    if (!known)
        return s;
    double t = shown_t95(freedom);
    double c = size > 0 ? creal(z) / size : 1, i = size > 0 ? cimag(z) / size : 0;
    double along = c * c * cov[0] + 2 * c * i * cov[1] + i * i * cov[2];
    double across = i * i * cov[0] - 2 * c * i * cov[1] + c * c * cov[2];
    s.half = units_shown(spread(along, t) * cabs(factor), show);
    s.lag_half = size > 0 ? spread(across, t) / size * 180 / PI : INFINITY;
    s.lag_open = !(s.lag_half < 90);
    return s;
}

struct shown shown_amplitude(double peak, double half, enum quantity from, double rpm,
                             const struct show *show)
{
    double factor = cabs(turn(from, rpm, show));
    return (struct shown){units_shown(peak * factor, show), units_shown(half * factor, show), NAN,
                          NAN, false};
}

double shown_mass(const struct job *job, double kg)
{
    return kg / units_factor(DIMENSION_MASS, shown_mass_unit(job));
}

const char *shown_mass_unit(const struct job *job)
{
    return job->units == UNITS_US ? "oz" : "g";
}

double shown_unbalance(const struct job *job, double kgm)
{
    bool us = job->units == UNITS_US;
    return shown_mass(job, kgm) / units_factor(DIMENSION_LENGTH, us ? "in" : "mm");
}

const char *shown_unbalance_unit(const struct job *job)
{
    return job->units == UNITS_US ? "oz in" : "g mm";
}

char *shown_speed(char *text, double rpm)
{
    return digits_at(text, rpm, fabs(rpm) < 100 ? -1 : 0);
}

/* Three significant digits. */
static void three(char *text, double value)
{
    digits_at(text, value, value != 0 && isfinite(value) ? (int)floor(log10(fabs(value))) - 2 : 0);
}

char *shown_force(const struct job *job, char *text, double newton)
{
    const double pound_force = 4.4482216152605; /* N, exact: lb * standard gravity */
    char si[DIGITS_ROOM], us[DIGITS_ROOM];
    three(si, newton);
    three(us, newton / pound_force);
    if (job->units == UNITS_US)
        snprintf(text, 2 * DIGITS_ROOM, "%.15s N (%.15s lbf)", si, us);
    else
        snprintf(text, 2 * DIGITS_ROOM, "%s N", si);
    return text;
}
