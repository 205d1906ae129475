#include "sheet/units.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define INCH 0.0254      /* m, exact (1959) */
#define POUND 0.45359237 /* kg, exact (1959) */
#define GRAVITY 9.80665  /* m/s2, exact (CGPM 1901) */
#define SQRT_2 1.41421356237309504880

struct unit {
    enum dimension dimension;
    const char *name;
    double si;
};

static const struct unit UNITS[] = {
    {DIMENSION_MASS, "g", 1e-3},        {DIMENSION_MASS, "kg", 1},
    {DIMENSION_MASS, "mg", 1e-6},       {DIMENSION_MASS, "oz", POUND / 16},
    {DIMENSION_MASS, "lb", POUND},      {DIMENSION_LENGTH, "mm", 1e-3},
    {DIMENSION_LENGTH, "cm", 1e-2},     {DIMENSION_LENGTH, "m", 1},
    {DIMENSION_LENGTH, "in", INCH},     {DIMENSION_SPEED, "rpm", 1},
    {DIMENSION_RATE, "Hz", 1},          {DIMENSION_RATE, "kHz", 1e3},
    {DIMENSION_VOLTAGE, "V", 1},        {DIMENSION_VOLTAGE, "mV", 1e-3},
    {DIMENSION_ANGLE, "deg", 1},        {DIMENSION_PERCENT, "%", 1},
    {DIMENSION_DENSITY, "kg/m3", 1},    {DIMENSION_DENSITY, "g/cm3", 1e3},
    {DIMENSION_DENSITY, "kg/dm3", 1e3}, {DIMENSION_DENSITY, "lb/in3", POUND / (INCH * INCH * INCH)},
};

struct vibration {
    const char *name;
    enum quantity quantity;
    double si;
};

static const struct vibration VIBRATIONS[] = {
    {"g", QUANTITY_ACCELERATION, GRAVITY},
    {"m/s2", QUANTITY_ACCELERATION, 1},
    {"mm/s", QUANTITY_VELOCITY, 1e-3},
    {"in/s", QUANTITY_VELOCITY, INCH},
    {"m/s", QUANTITY_VELOCITY, 1},
    {"um", QUANTITY_DISPLACEMENT, 1e-6},
    {"mil", QUANTITY_DISPLACEMENT, INCH / 1000},
    {"mm", QUANTITY_DISPLACEMENT, 1e-3},
    {"m", QUANTITY_DISPLACEMENT, 1},
    {"in", QUANTITY_DISPLACEMENT, INCH},
};

#define COUNT(array) (sizeof(array) / sizeof((array)[0]))

/* "um" also as people type it: with the micro sign (U+00B5) or the Greek letter (U+03BC). */
static const char *plain_name(const char *unit)
{
    return !strcmp(unit, "\xc2\xb5m") || !strcmp(unit, "\xce\xbcm") ? "um" : unit;
}

double units_factor(enum dimension dimension, const char *unit)
{
    if (dimension == DIMENSION_VIBRATION) {
        struct show show;
        return units_vibration(unit, &show) ? show.si : 0;
    }
    for (size_t i = 0; i < COUNT(UNITS); i++)
        if (UNITS[i].dimension == dimension && !strcmp(UNITS[i].name, unit))
            return UNITS[i].si;
    return 0;
}

bool units_vibration(const char *unit, struct show *show)
{
    const char *name = plain_name(unit);
    for (size_t i = 0; i < COUNT(VIBRATIONS); i++) {
        if (strcmp(VIBRATIONS[i].name, name))
            continue;
        show->unit = VIBRATIONS[i].name;
        show->quantity = VIBRATIONS[i].quantity;
        show->si = VIBRATIONS[i].si;
        return true;
    }
    return false;
}

static bool parse_detection(const char *text, enum detection *detection)
{
    if (!strcmp(text, "pk"))
        *detection = DETECTION_PEAK;
    else if (!strcmp(text, "pk-pk"))
        *detection = DETECTION_PEAK_TO_PEAK;
    else if (!strcmp(text, "rms"))
        *detection = DETECTION_RMS;
    else
        return false;
    return true;
}

bool units_show_parse(const char *text, struct show *show)
{
    struct show parsed;
    char unit[16];
    size_t length = strcspn(text, " \t");
    if (length == 0 || length >= sizeof unit)
        return false;
    memcpy(unit, text, length);
    unit[length] = '\0';
    text += length;
    text += strspn(text, " \t");
    if (!units_vibration(unit, &parsed) || !parse_detection(text, &parsed.detection))
        return false;
    *show = parsed;
    return true;
}

char *units_show_text(const struct show *show, char *text)
{
    static const char *const DETECTIONS[] = {
        [DETECTION_PEAK] = "pk", [DETECTION_PEAK_TO_PEAK] = "pk-pk", [DETECTION_RMS] = "rms"};
    snprintf(text, 24, "%s %s", show->unit, DETECTIONS[show->detection]);
    return text;
}

/* How many times the displacement is differentiated; -1 for what is no vibration. */
static int order_of(enum quantity quantity)
{
    switch (quantity) {
    case QUANTITY_DISPLACEMENT:
        return 0;
    case QUANTITY_VELOCITY:
        return 1;
    case QUANTITY_ACCELERATION:
        return 2;
    case QUANTITY_TACHO:
        break;
    }
    return -1;
}

double complex units_convert(double complex z, enum quantity from, enum quantity to, double w)
{
    int first = order_of(from), last = order_of(to);
    if (first < 0 || last < 0 || (first != last && !(w > 0)))
        return CMPLX(NAN, NAN);
    for (; first < last; first++) /* times -j*w */
        z = CMPLX(cimag(z) * w, -creal(z) * w);
    for (; first > last; first--) /* divided by it */
        z = CMPLX(-cimag(z) / w, creal(z) / w);
    return z;
}

static double peak_factor(enum detection detection)
{
    switch (detection) {
    case DETECTION_PEAK:
        return 1;
    case DETECTION_PEAK_TO_PEAK:
        return 2;
    case DETECTION_RMS:
        return 1 / SQRT_2;
    }
    return NAN;
}

double units_shown(double peak_si, const struct show *show)
{
    return peak_si * peak_factor(show->detection) / show->si;
}

double units_from_shown(double shown, const struct show *show)
{
    return shown * show->si / peak_factor(show->detection);
}
