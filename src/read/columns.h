/* columns.h - moves channels of a file to the columns of the stream, calibrated. */
#ifndef LOPSIDE_READ_COLUMNS_H
#define LOPSIDE_READ_COLUMNS_H

#include <stddef.h>

struct columns_route {
    size_t from, to; /* channel in the input, column in the output, both from 0 */
    float gain;      /* output per input */
};

/* out[f*out_width + to] = in[f*in_width + from]*gain for every frame f and route. The product is
 * rounded once, to float32. `in` and `out` do not overlap. NaN stays NaN. */
void columns_move(const float *in, size_t in_width, float *out, size_t out_width,
                  const struct columns_route *routes, size_t route_count, size_t frames);

/* The same from double, multiplied in double and rounded once. `gains` stand beside the routes. */
void columns_move_double(const double *in, size_t in_width, float *out, size_t out_width,
                         const struct columns_route *routes, const double *gains,
                         size_t route_count, size_t frames);

/* Index of the first value that is NaN or infinite; `count` where there is none. */
size_t columns_first_bad(const float *values, size_t count);

#endif
