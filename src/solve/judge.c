#include "solve/judge.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

struct judge_limits judge_limits_of(const struct job *job, const char *check, double caution,
                                    double refuse)
{
    struct judge_limits l = {false, caution, refuse};
    for (size_t i = 0; i < job->limit_count; i++) {
        if (strcmp(job->limits[i].check, check))
            continue;
        l.off = job->limits[i].off;
        if (!isnan(job->limits[i].caution))
            l.caution = job->limits[i].caution;
        if (!isnan(job->limits[i].refuse))
            l.refuse = job->limits[i].refuse;
        else if (l.caution > l.refuse)
            l.refuse = l.caution;
    }
    return l;
}

enum judge_verdict judge_value(const struct judge_limits *l, double value, double *limit)
{
    enum judge_verdict verdict = value >= l->refuse    ? ADVICE_REFUSE
                                 : value >= l->caution ? ADVICE_CAUTION
                                                       : ADVICE_OK;
    *limit = verdict == ADVICE_REFUSE ? l->refuse : l->caution;
    return verdict;
}

struct judge_figure judge_figure(double value, int digits)
{
    struct judge_figure f;
    double size = value == 0 || !isfinite(value) ? 1 : floor(log10(fabs(value)));
    double unit = pow(10, size - digits + 1);
    int decimals = digits - 1 - (int)size;
    snprintf(f.text, sizeof f.text, "%.*f", decimals > 0 ? (decimals > 9 ? 9 : decimals) : 0,
             round(value / unit) * unit);
    return f;
}
