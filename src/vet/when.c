#include "vet/when.h"

#include <math.h>
#include <stdio.h>

/* The Julian day number at noon of a date of the Gregorian calendar. */
static long day_number(long y, long m, long d)
{
    long a = (m - 14) / 12; /* -1 in January and February, else 0 */

    return d - 32075 + 1461 * (y + 4800 + a) / 4 + 367 * (m - 2 - a * 12) / 12 -
           3 * ((y + 4900 + a) / 100) / 4;
}

double when_hours(const char *text)
{
    int y, m, d, hour = 12, minute = 0, got;
    char between = ' ';

    got = sscanf(text, "%4d-%2d-%2d%c%2d:%2d", &y, &m, &d, &between, &hour, &minute);
    if ((got != 3 && got != 6) || (between != ' ' && between != 'T'))
        return NAN;
    if (m < 1 || m > 12 || d < 1 || d > 31 || hour < 0 || hour > 24 || minute < 0 || minute > 59)
        return NAN;
    return 24.0 * (double)(day_number(y, m, d) - day_number(2000, 1, 1)) + hour + minute / 60.0;
}

struct when_trend when_trend_of(const double *hours, const double complex *vectors, size_t count)
{
    struct when_trend trend = {0, NAN};
    double complex mean = 0, slope = 0;
    double middle = 0, spread = 0, all = 0, n = (double)count, first = INFINITY, last = -INFINITY;

    for (size_t i = 0; i < count; i++) {
        mean += vectors[i] / n;
        middle += hours[i] / n;
        first = fmin(first, hours[i]);
        last = fmax(last, hours[i]);
    }
    for (size_t i = 0; i < count; i++) {
        slope += (vectors[i] - mean) * (hours[i] - middle);
        spread += (hours[i] - middle) * (hours[i] - middle);
        all += pow(cabs(vectors[i] - mean), 2);
    }
    if (count < 3 || !(spread > 0) || !(all > 0))
        return trend;
    slope /= spread;
    trend.move = slope * (last - first);
    trend.chance = pow(fmax(1 - pow(cabs(slope), 2) * spread / all, 0), n - 2);
    return trend;
}
