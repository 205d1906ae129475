#include "read/columns.h"

#include <stdbool.h>
#include <stdint.h>
#include <string.h>

#define PATTERN 64 /* gains laid out for a loop of fixed length, which vectorises */

/* Every channel goes to the column of the same number. */
static bool is_straight(size_t in_width, size_t out_width, const struct columns_route *routes,
                        size_t route_count)
{
    if (in_width != out_width || route_count != in_width || PATTERN % in_width != 0)
        return false;
    for (size_t i = 0; i < route_count; i++)
        if (routes[i].from != i || routes[i].to != i)
            return false;
    return true;
}

static void multiply(const float *restrict in, float *restrict out,
                     const struct columns_route *routes, size_t width, size_t count)
{
    float gains[PATTERN];
    for (size_t i = 0; i < PATTERN; i++)
        gains[i] = routes[i % width].gain;
    size_t at = 0;
    for (; at + PATTERN <= count; at += PATTERN)
        for (size_t i = 0; i < PATTERN; i++)
            out[at + i] = in[at + i] * gains[i];
    for (size_t i = 0; at + i < count; i++)
        out[at + i] = in[at + i] * gains[i];
}

void columns_move(const float *in, size_t in_width, float *out, size_t out_width,
                  const struct columns_route *routes, size_t route_count, size_t frames)
{
    if (is_straight(in_width, out_width, routes, route_count)) {
        multiply(in, out, routes, in_width, frames * in_width);
        return;
    }
    for (size_t f = 0; f < frames; f++) {
        const float *from = in + f * in_width;
        float *to = out + f * out_width;
        for (size_t r = 0; r < route_count; r++)
            to[routes[r].to] = from[routes[r].from] * routes[r].gain;
    }
}

void columns_move_double(const double *in, size_t in_width, float *out, size_t out_width,
                         const struct columns_route *routes, const double *gains,
                         size_t route_count, size_t frames)
{
    for (size_t f = 0; f < frames; f++) {
        const double *from = in + f * in_width;
        float *to = out + f * out_width;
        for (size_t r = 0; r < route_count; r++)
            to[routes[r].to] = (float)(from[routes[r].from] * gains[r]);
    }
}

/* IEEE 754 binary32: exponent bits all ones. */
static uint32_t is_bad(float value)
{
    uint32_t bits;
    memcpy(&bits, &value, sizeof bits);
    return (bits & 0x7F800000u) == 0x7F800000u;
}

size_t columns_first_bad(const float *values, size_t count)
{
    uint32_t any = 0;
    for (size_t i = 0; i < count; i++)
        any |= is_bad(values[i]);
    if (!any)
        return count;
    size_t i = 0;
    while (!is_bad(values[i]))
        i++;
    return i;
}
