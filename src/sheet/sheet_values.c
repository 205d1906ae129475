#include "sheet/sheet_values.h"

#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define DIGITS_MOST 60 /* characters of one number */

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

static const char *skip_blanks(const char *at)
{
    return at + strspn(at, " \t");
}

static bool ends_word(char c)
{
    return c == '\0' || c == ' ' || c == '\t' || c == ',';
}

/* Length of the number at `text` and where its point is (its length, where it has none); 0: none.
 */
static size_t number_length(const char *text, size_t *point)
{
    size_t at = text[0] == '+' || text[0] == '-';
    size_t digits = 0;
    for (; is_digit(text[at]); at++)
        digits++;
    size_t end = at;
    if (text[at] == '.') {
        for (end = at + 1; is_digit(text[end]); end++)
            digits++;
        *point = at;
    } else {
        *point = end;
    }
    if (digits == 0)
        return 0;
    if (text[end] == 'e' || text[end] == 'E') {
        size_t exponent = end + 1 + (text[end + 1] == '+' || text[end + 1] == '-');
        if (is_digit(text[exponent])) {
            for (end = exponent; is_digit(text[end]);)
                end++;
        }
    }
    return end;
}

const char *sheet_values_number(const char **at, double *value)
{
    const char *text = skip_blanks(*at);
    char copy[DIGITS_MOST + 16];
    size_t point, length = number_length(text, &point);
    if (length == 0)
        return *text ? "not a number" : "no number";
    if (length > DIGITS_MOST)
        return "number too long";
    if (text[length] == ',' && is_digit(text[length + 1]))
        return "a number is written with a decimal point, lists with blanks";
    if (text[length] == ';')
        return "a list is written with blanks between its items";
    /* strtod wants the point of the process's locale. */
    const char *tail = text[point] == '.' ? text + point + 1 : text + point;
    snprintf(copy, sizeof copy, "%.*s%.8s%.*s", (int)point, text,
             text[point] == '.' ? localeconv()->decimal_point : "", (int)(text + length - tail),
             tail);
    double number = strtod(copy, NULL);
    if (!isfinite(number))
        return "number too large";
    *value = number;
    *at = text + length;
    return NULL;
}

bool sheet_values_take(const char **at, char *word, size_t room)
{
    const char *text = skip_blanks(*at);
    size_t length = 0;
    while (!ends_word(text[length]))
        length++;
    if (length == 0 || length >= room)
        return false;
    memcpy(word, text, length);
    word[length] = '\0';
    *at = text + length;
    return true;
}

bool sheet_values_word(const char **at, const char *word)
{
    const char *text = skip_blanks(*at);
    size_t length = strlen(word);
    if (strncmp(text, word, length) || (word[0] != ',' && !ends_word(text[length])))
        return false;
    *at = text + length;
    return true;
}

bool sheet_values_end(const char *at)
{
    return *skip_blanks(at) == '\0';
}

static const char *wrong_unit(enum dimension dimension)
{
    static const char *const CAUSES[] = {
        [DIMENSION_MASS] = "unit does not fit, wanted g, kg, oz or lb",
        [DIMENSION_LENGTH] = "unit does not fit, wanted mm, cm, m or in",
        [DIMENSION_SPEED] = "unit does not fit, wanted rpm",
        [DIMENSION_RATE] = "unit does not fit, wanted Hz or kHz",
        [DIMENSION_VOLTAGE] = "unit does not fit, wanted V or mV",
        [DIMENSION_ANGLE] = "unit does not fit, wanted deg",
        [DIMENSION_PERCENT] = "unit does not fit, wanted %",
        [DIMENSION_VIBRATION] = "unit does not fit, wanted g, m/s2, mm/s, in/s, um or mil",
        [DIMENSION_DENSITY] = "unit does not fit, wanted kg/m3, kg/dm3, g/cm3 or lb/in3"};
    return CAUSES[dimension];
}

static const char *no_unit(enum dimension dimension)
{
    static const char *const CAUSES[] = {
        [DIMENSION_MASS] = "no unit, wanted g, kg, oz or lb",
        [DIMENSION_LENGTH] = "no unit, wanted mm, cm, m or in",
        [DIMENSION_SPEED] = "no unit, wanted rpm",
        [DIMENSION_RATE] = "no unit, wanted Hz or kHz",
        [DIMENSION_VOLTAGE] = "no unit, wanted V or mV",
        [DIMENSION_ANGLE] = "no unit, wanted deg",
        [DIMENSION_PERCENT] = "no unit, wanted %",
        [DIMENSION_DENSITY] = "no unit, wanted kg/m3, kg/dm3, g/cm3 or lb/in3",
        [DIMENSION_VIBRATION] = "no unit, wanted g, m/s2, mm/s, in/s, um or mil"};
    return CAUSES[dimension];
}

/* The unit at *at as its factor. */
static const char *take_unit(const char **at, enum dimension dimension, double *factor)
{
    char unit[24];
    const char *text = *at;
    if (sheet_values_end(text) || *skip_blanks(text) == ',')
        return no_unit(dimension);
    if (!sheet_values_take(&text, unit, sizeof unit))
        return wrong_unit(dimension);
    *factor = units_factor(dimension, unit);
    if (!(*factor > 0))
        return wrong_unit(dimension);
    *at = text;
    return NULL;
}

const char *sheet_values_measure(const char **at, enum dimension dimension, double *value)
{
    double number, factor;
    const char *text = *at;
    const char *fault = sheet_values_number(&text, &number);
    if (!fault)
        fault = take_unit(&text, dimension, &factor);
    if (fault)
        return fault;
    *value = number * factor;
    *at = text;
    return NULL;
}

const char *sheet_values_amplitude(const char **at, double *value, struct show *show)
{
    char unit[16], detection[16], both[40];
    const char *text = *at;
    double number;
    const char *fault = sheet_values_number(&text, &number);
    if (fault)
        return fault;
    if (!sheet_values_take(&text, unit, sizeof unit))
        return no_unit(DIMENSION_VIBRATION);
    if (units_factor(DIMENSION_VIBRATION, unit) <= 0)
        return wrong_unit(DIMENSION_VIBRATION);
    if (!sheet_values_take(&text, detection, sizeof detection))
        return "no detection behind the unit, wanted pk, pk-pk or rms";
    snprintf(both, sizeof both, "%s %s", unit, detection);
    if (!units_show_parse(both, show))
        return "unknown detection, wanted pk, pk-pk or rms";
    *value = number;
    *at = text;
    return NULL;
}

/* "4x" before a number: its count; leaves *at alone where there is none. */
static const char *take_count(const char **at, int *count)
{
    const char *text = skip_blanks(*at);
    size_t digits = strspn(text, "0123456789");
    *count = -1;
    if (digits == 0 || text[digits] != 'x')
        return NULL;
    if (digits > 6)
        return "count out of range";
    *count = atoi(text);
    if (*count < 1)
        return "count out of range";
    *at = text + digits + 1;
    return NULL;
}

static bool begins_number(const char *at)
{
    const char *text = skip_blanks(at);
    size_t point;
    return number_length(text, &point) > 0;
}

const char *sheet_values_list(const char *at, enum dimension dimension, bool counts,
                              struct sheet_item *items, size_t most, size_t *count)
{
    size_t made = 0, waiting = 0; /* items; from which on the unit is still to come */
    do {
        const char *fault = NULL;
        double factor;
        if (made == most)
            return "list too long";
        items[made].count = -1;
        if (counts)
            fault = take_count(&at, &items[made].count);
        if (!fault)
            fault = sheet_values_number(&at, &items[made].value);
        if (fault)
            return fault;
        made++;
        bool more = sheet_values_word(&at, ",") || begins_number(at);
        if (more && begins_number(at))
            continue;
        fault = take_unit(&at, dimension, &factor);
        if (fault)
            return fault;
        for (; waiting < made; waiting++)
            items[waiting].value *= factor;
        if (sheet_values_word(&at, ",") && sheet_values_end(at))
            return "list ends with a comma";
    } while (!sheet_values_end(at));
    if (waiting < made)
        return no_unit(dimension);
    *count = made;
    return NULL;
}
