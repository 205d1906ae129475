#include "report/runout.h"

#include <math.h>

#include "report/digits.h"
#include "report/shown.h"
#include "report/text_readings.h"
#include "sheet/units.h"

bool runout_has_effect(const struct dossier *d, int sensor)
{
    return sensor >= 0 && (size_t)sensor < d->job->sensor_count &&
           d->job->sensors[sensor].quantity == QUANTITY_DISPLACEMENT;
}

/* Mean of the usable slow-roll vectors of that probe, and its covariance; false: there is none. */
static bool find(const struct dossier *d, int sensor, double complex *vector, double cov[3])
{
    double n = 0;
    *vector = 0;
    cov[0] = cov[1] = cov[2] = 0;
    for (size_t i = 0; runout_has_effect(d, sensor) && i < d->readings.count; i++) {
        const struct dossier_reading *item = &d->readings.items[i];
        double own[3];
        if (item->reading.sensor != sensor || !item->use || !item->reading.has_phase ||
            !dossier_is_runout(d, item->reading.run))
            continue;
        dossier_cov(item, own);
        *vector += item->reading.vector;
        for (int k = 0; k < 3; k++)
            cov[k] += own[k];
        n++;
    }
    *vector /= n;
    for (int k = 0; k < 3; k++)
        cov[k] /= n * n;
    return n > 0;
}

bool runout_comes_off(const struct dossier *d, const struct dossier_reading *reading)
{
    double complex vector;
    double cov[3];
    return reading->reading.has_phase && !dossier_is_runout(d, reading->reading.run) &&
           find(d, reading->reading.sensor, &vector, cov);
}

struct dossier_reading runout_off(const struct dossier *d, const struct dossier_reading *reading)
{
    struct dossier_reading left = *reading;
    double complex vector;
    double cov[3];
    if (!runout_comes_off(d, reading) || !find(d, reading->reading.sensor, &vector, cov))
        return left;
    left.reading.vector -= vector;
    left.reading.amplitude = cabs(left.reading.vector);
    for (int k = 0; k < 3; k++)
        left.widen[k] += cov[k];
    return left;
}

/* "A 80.1 um pk-pk at 57.3 deg lag" */
static void left_over(const struct dossier *d, const struct dossier_reading *left,
                      struct buffer *text)
{
    const struct shown s = text_readings_shown(d, left);
    const struct job_sensor *sensor = &d->job->sensors[left->reading.sensor];
    char number[DIGITS_ROOM], unit[24];
    buffer_format(text, "%s %s %s at ", sensor->name, digits_text(number, s.amplitude, s.half),
                  units_show_text(&sensor->show, unit));
    if (s.lag_open)
        buffer_text(text, "a lag that is not known");
    else
        buffer_format(text, "%s deg lag", digits_angle(number, s.lag_deg, s.lag_half));
}

/* The names of the sensors of those readings that a slow roll has, or has no, effect on. */
static size_t names(const struct dossier *d, size_t first, size_t end, bool effect,
                    struct buffer *text)
{
    size_t count = 0;
    for (size_t i = first; i < end; i++) {
        const int sensor = d->readings.items[i].reading.sensor;
        if (runout_has_effect(d, sensor) == effect)
            buffer_format(text, "%s%s", count++ ? ", " : "", dossier_sensor(d, sensor));
    }
    return count;
}

static void of_slow_roll(const struct dossier *d, size_t first, size_t end, struct buffer *text)
{
    struct buffer probes = BUFFER_INIT, others = BUFFER_INIT;
    if (names(d, first, end, true, &probes) > 0)
        buffer_format(text,
                      "What a shaft's surface shows at slow roll: its 1x vector is taken off the "
                      "readings of displacement probes (%s), which the other tables show as they "
                      "were read; what is left without it stands beneath them.",
                      probes.failed ? "" : probes.bytes);
    if (names(d, first, end, false, &others) > 0)
        buffer_format(text, "%sNo effect on %s: only on displacement probes has a slow roll any.",
                      text->length ? " " : "", others.failed ? "" : others.bytes);
    text->failed = text->failed || probes.failed || others.failed;
    buffer_release(&probes);
    buffer_release(&others);
}

void runout_words(const struct dossier *d, size_t first, size_t end, struct buffer *text)
{
    size_t count = 0;
    if (first < end && dossier_is_runout(d, d->readings.items[first].reading.run)) {
        of_slow_roll(d, first, end, text);
        return;
    }
    for (size_t i = first; i < end; i++) {
        if (!runout_comes_off(d, &d->readings.items[i]))
            continue;
        const struct dossier_reading left = runout_off(d, &d->readings.items[i]);
        buffer_text(text, count++ ? ", " : "Without runout: ");
        left_over(d, &left, text);
    }
    buffer_text(text, count ? "." : "");
}

const char *runout_forecast(const struct dossier *d)
{
    for (size_t i = 0; i < d->forecasts.count; i++) {
        double complex vector;
        double cov[3];
        if (find(d, d->forecasts.items[i].sensor, &vector, cov))
            return "Of displacement probes before and after are without runout, which a probe will "
                   "go on to show besides.";
    }
    return NULL;
}
