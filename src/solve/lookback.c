#include "solve/lookback.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/regress.h"
#include "solve/stored.h"

int lookback_row(const struct model_row *row, size_t planes, size_t run, struct lookback *out)
{
    struct model_row part = *row;
    size_t at = 0;
    part.count = 0;
    while (part.count < row->count && row->runs[part.count] < run)
        part.count++;
    at = part.count;
    if (at == row->count || row->runs[at] != run)
        return 0;
    memset(&part.posterior, 0, sizeof part.posterior);
    part.misfit = part.changed = NAN;
    part.stored = calloc(planes + 1, sizeof *part.stored);
    if (!part.stored)
        return REGRESS_NO_MEMORY;
    for (size_t p = 0; p < planes; p++)
        part.stored[p] = row->stored[p];
    int result = stored_fit(&part, planes);
    if (result == REGRESS_OK && part.posterior.rank == planes + 1) {
        double cov[3];
        out->measured = row->y[at];
        out->bare = part.posterior.mean[0];
        out->predicted = posterior_predict(&part.posterior, row->x + at * planes, cov);
        double variance = cov[0] + cov[2] + row->total[at][0] + row->total[at][2];
        double least = 1e-9 * row->as_found; /* exact readings are known to nine digits */
        out->se = cabs(out->measured - out->predicted) / sqrt(fmax(variance, least * least));
        result = 1;
    }
    posterior_release(&part.posterior);
    free(part.stored);
    return result;
}
