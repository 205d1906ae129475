#include "report/digits.h"

#include <limits.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

/* Doubles carry 15 safe digits: what lies closer to a border than this is on it. */
static const double HAIR = 1e-9;

static int exponent_of(double x)
{
    return (int)floor(log10(fabs(x)) + HAIR);
}

int digits_place(double value, double half)
{
    if (!isfinite(value))
        return 0;
    int finest = value != 0 ? exponent_of(value) - (DIGITS_MOST - 1) : 0;
    if (!(half > 0) || !isfinite(half))
        return finest;
    int place = exponent_of(half) - 1;
    if (ceil(half / pow(10, place) - HAIR) >= 100) /* 0.0996 rounds up to 0.10 */
        place++;
    if (value == 0)
        return place;
    return place > finest ? place : finest;
}

int digits_place_second(double value)
{
    return value != 0 && isfinite(value) ? exponent_of(value) - 1 : INT_MAX;
}

char *digits_at(char *text, double value, int place)
{
    if (!isfinite(value)) {
        strcpy(text, "-");
        return text;
    }
    if (place > 0) {
        double step = pow(10, place);
        value = round(value / step) * step;
    }
    int decimals = place < 0 ? -place : 0;
    snprintf(text, DIGITS_ROOM, fabs(value) < 1e15 ? "%.*f" : "%.*e", decimals > 20 ? 20 : decimals,
             value);
    if (text[0] == '-' && strspn(text + 1, "0.") == strlen(text + 1))
        memmove(text, text + 1, strlen(text));
    return text;
}

static void strip_zeros(char *text)
{
    if (!strchr(text, '.'))
        return;
    size_t end = strlen(text);
    while (text[end - 1] == '0')
        text[--end] = '\0';
    if (text[end - 1] == '.')
        text[--end] = '\0';
}

char *digits_text(char *text, double value, double half)
{
    digits_at(text, value, digits_place(value, half));
    if (!(half > 0))
        strip_zeros(text);
    return text;
}

char *digits_against(char *text, double value, double half, double limit)
{
    const int finest = digits_place(value, NAN);
    char bound[DIGITS_ROOM];
    const double shown_limit = strtod(digits_text(bound, limit, NAN), NULL);
    digits_text(text, value, half);
    for (int place = digits_place(value, half) - 1;
         isfinite(value) && isfinite(limit) && place >= finest &&
         (strtod(text, NULL) <= shown_limit) != (value <= limit);
         place--)
        digits_at(text, value, place);
    return text;
}

char *digits_half(char *text, double half, int place)
{
    if (!isfinite(half)) {
        strcpy(text, "-");
        return text;
    }
    double step = pow(10, place);
    return digits_at(text, ceil(half / step - HAIR) * step, place);
}

char *digits_beside(char *text, double half, int place)
{
    if (!(half > 0) || !isfinite(half)) {
        strcpy(text, "-");
        return text;
    }
    if (half >= 0.5 * pow(10, place))
        return digits_half(text, half, place);
    text[0] = '<';
    digits_at(text + 1, pow(10, place), place);
    return text;
}

bool digits_half_counts(double half, int place)
{
    return half >= 0.01 * pow(10, place);
}

int digits_angle_place(double half_deg)
{
    return half_deg >= 1 ? 0 : -1;
}

char *digits_angle(char *text, double deg, double half_deg)
{
    if (!isfinite(deg)) {
        strcpy(text, "-");
        return text;
    }
    int place = digits_angle_place(half_deg);
    double scale = pow(10, -place);
    double rounded = round(angle_wrap_360(deg) * scale) / scale;
    digits_at(text, rounded >= 360 ? 0 : rounded, place);
    if (!(half_deg > 0))
        strip_zeros(text);
    return text;
}

char *digits_angle_half(char *text, double half_deg)
{
    return digits_half(text, half_deg, digits_angle_place(half_deg));
}

char *digits_chance(char *text, double probability)
{
    if (!isfinite(probability))
        strcpy(text, "-");
    else if (probability < 0.01)
        strcpy(text, "under 1 %");
    else if (probability > 0.99)
        strcpy(text, "over 99 %");
    else
        snprintf(text, DIGITS_ROOM, "%.0f %%", 100 * probability);
    return text;
}
