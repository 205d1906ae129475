#include "stream/fields.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

const char fields_no_memory[] = "no memory left";

struct fields fields_of(const json_t *json)
{
    return (struct fields){json, json_is_object(json) ? NULL : "not an object"};
}

int fields_done(const struct fields *f, const char **why)
{
    if (!f->why)
        return 0;
    *why = f->why;
    return -1;
}

void fields_fail(struct fields *f, const char *why)
{
    if (!f->why)
        f->why = why;
}

static const json_t *get(const struct fields *f, const char *key)
{
    const json_t *value = f->why ? NULL : json_object_get(f->json, key);
    return json_is_null(value) ? NULL : value;
}

bool fields_has(const struct fields *f, const char *key)
{
    return get(f, key) != NULL;
}

static double number_of(const json_t *value)
{
    return json_is_number(value) ? json_number_value(value) : NAN;
}

double fields_real(struct fields *f, const char *key)
{
    const json_t *value = get(f, key);
    if (value && !json_is_number(value))
        fields_fail(f, "a field that should be a number is not");
    return number_of(value);
}

double fields_need_real(struct fields *f, const char *key)
{
    double value = fields_real(f, key);
    if (isnan(value))
        fields_fail(f, "a number is missing");
    return value;
}

long long fields_integer(struct fields *f, const char *key, long long fallback)
{
    const json_t *value = get(f, key);
    if (!value)
        return fallback;
    if (!json_is_integer(value)) {
        fields_fail(f, "a field that should be a whole number is not");
        return fallback;
    }
    return json_integer_value(value);
}

int fields_int(struct fields *f, const char *key, int least, int most, int fallback)
{
    long long value = fields_integer(f, key, fallback);
    if (fields_has(f, key) && (value < least || value > most)) {
        fields_fail(f, "a whole number is out of range");
        return fallback;
    }
    return (int)value;
}

double fields_above_zero(struct fields *f, const char *key)
{
    double value = fields_need_real(f, key);
    if (!(value > 0))
        fields_fail(f, "a number that must be above zero is not");
    return value;
}

void fields_covariance(struct fields *f, const char *key, double to[3])
{
    /* rounding of sums of squares; a covariance of exactly one line is legal */
    const double slack = 1 + 1e-9;
    fields_reals(f, key, to, 3);
    if (!f->why && (!(to[0] >= 0) || !(to[2] >= 0) || to[1] * to[1] > slack * to[0] * to[2]))
        fields_fail(f, "a covariance is none");
}

bool fields_boolean(struct fields *f, const char *key, bool fallback)
{
    const json_t *value = get(f, key);
    if (!value)
        return fallback;
    if (!json_is_boolean(value))
        fields_fail(f, "a field that should be true or false is not");
    return json_is_true(value);
}

const char *fields_text(struct fields *f, const char *key)
{
    const json_t *value = get(f, key);
    if (!value)
        return "";
    if (!json_is_string(value)) {
        fields_fail(f, "a field that should be text is not");
        return "";
    }
    return json_string_value(value);
}

void fields_copy(struct fields *f, const char *key, char *to, size_t room)
{
    const char *text = fields_text(f, key);
    size_t length = strlen(text);
    if (length >= room) {
        fields_fail(f, "a text is too long");
        length = 0;
    }
    memcpy(to, text, length);
    to[length] = '\0';
}

void fields_name(struct fields *f, const char *key, char to[NAME_ROOM])
{
    fields_copy(f, key, to, NAME_ROOM);
    if (!to[0])
        fields_fail(f, "a name is missing");
}

double complex fields_vector(struct fields *f, const char *key)
{
    const json_t *value = get(f, key);
    if (!value)
        return CMPLX(NAN, NAN);
    double re = number_of(json_array_get(value, 0)), im = number_of(json_array_get(value, 1));
    if (json_array_size(value) != 2 || isnan(re) || isnan(im))
        fields_fail(f, "a vector is not two numbers");
    return CMPLX(re, im);
}

void fields_reals(struct fields *f, const char *key, double *to, size_t count)
{
    const json_t *value = get(f, key);
    if (json_array_size(value) != count)
        fields_fail(f, "a list of numbers has the wrong length");
    for (size_t i = 0; i < count; i++) {
        to[i] = number_of(json_array_get(value, i));
        if (isnan(to[i]))
            fields_fail(f, "a list of numbers holds something else");
    }
}

const json_t *fields_array(struct fields *f, const char *key)
{
    const json_t *value = get(f, key);
    if (value && !json_is_array(value)) {
        fields_fail(f, "a field that should be a list is not");
        return NULL;
    }
    return value;
}

const json_t *fields_object(struct fields *f, const char *key)
{
    const json_t *value = get(f, key);
    if (value && !json_is_object(value)) {
        fields_fail(f, "a field that should be an object is not");
        return NULL;
    }
    return value;
}

int fields_sensor(struct fields *f, const char *key, const struct job *job)
{
    int index = job_find_sensor(job, fields_text(f, key));
    if (index < 0)
        fields_fail(f, "a sensor that the job does not name");
    return index;
}

int fields_plane(struct fields *f, const char *key, const struct job *job)
{
    int index = job_find_plane(job, fields_text(f, key));
    if (index < 0)
        fields_fail(f, "a plane that the job does not name");
    return index;
}

double *fields_new_reals(struct fields *f, const char *key, size_t *count)
{
    const json_t *array = fields_array(f, key);
    *count = json_array_size(array);
    if (!*count)
        return NULL;
    double *values = malloc(*count * sizeof *values);
    if (!values) {
        fields_fail(f, fields_no_memory);
        *count = 0;
        return NULL;
    }
    for (size_t i = 0; i < *count; i++)
        values[i] = number_of(json_array_get(array, i));
    return values;
}
