#include "solve/misfit.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

bool misfit_list(const struct model *m, const struct model_row *row, char *text, size_t size)
{
    size_t length = 0, named = 0, count = 0;
    text[0] = '\0';
    for (size_t i = 0; i < row->count; i++)
        count += row->possible[i];
    for (size_t i = 0; i < row->count && length + 60 < size; i++) {
        if (!row->possible[i])
            continue;
        named++;
        length += (size_t)snprintf(text + length, size - length, "%s'%s'",
                                   named == 1       ? ""
                                   : named == count ? " or "
                                                    : ", ",
                                   m->job->runs[row->runs[i]].name);
    }
    if (named < count)
        snprintf(text + length, size - length, " or one of %zu more", count - named);
    return count > 0;
}

bool misfit_judge(const struct model *m, const struct model_row *row, struct advice_finding *f)
{
    struct judge_limits l = judge_limits_of(m->job, "linearity", 3, 10);
    if (l.off || isnan(row->misfit) || row->state != MODEL_GOOD)
        return false;
    *f = (struct advice_finding){.check = "linearity",
                                 .unit = "s.e.",
                                 .basis = "common practice",
                                 .run = (int)row->misfit_run,
                                 .sensor = (int)row->sensor};
    f->value = row->misfit;
    f->verdict = judge_value(&l, row->misfit, &f->limit);
    char runs[200];
    if (f->verdict == ADVICE_OK) {
        snprintf(f->text, sizeof f->text,
                 "the runs fit one set of responses; run '%s' is furthest off",
                 m->job->runs[row->misfit_run].name);
    } else if (row->culprit >= 0) {
        f->run = row->culprit;
        snprintf(f->text, sizeof f->text,
                 "run '%s' does not fit the others, which fit each other: check its weights, their "
                 "angles and radii, and whether the machine, its speed or the tape changed",
                 m->job->runs[row->culprit].name);
    } else {
        f->run = -1;
        bool any = misfit_list(m, row, runs, sizeof runs);
        snprintf(f->text, sizeof f->text,
                 "the runs do not fit one set of responses; %s%s: check weights, angles, radii, "
                 "speeds and the tape of all, and repeat a run, which will tell",
                 any ? "any one may be wrong of " : "which is wrong cannot be told", runs);
    }
    size_t length = strlen(f->text);
    if (f->verdict != ADVICE_OK && row->left_on >= 0)
        snprintf(f->text + length, sizeof f->text - length,
                 "; they would fit if the weights of run '%s' had still been on in run '%s'",
                 m->job->runs[row->left_on].name, m->job->runs[row->left_in].name);
    return true;
}
