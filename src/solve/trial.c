#include "solve/trial.h"

#include <math.h>

#include "base/angle.h"

double trial_force(double mass, double radius, double rpm)
{
    double w = rpm * PI / 30;
    return mass * radius * w * w;
}

double trial_mass(double journal_load, double radius, double rpm)
{
    double w = rpm * PI / 30;
    return TRIAL_SHARE * journal_load * TRIAL_GRAVITY / (radius * w * w);
}

struct search {
    const double *masses;
    const int *counts;
    size_t stock;
    double wanted, most, best;
};

static void look(struct search *s, size_t from, int left, double sum)
{
    if (sum > s->most * (1 + 1e-12))
        return;
    if (sum > 0 && (!(s->best > 0) || fabs(sum - s->wanted) < fabs(s->best - s->wanted)))
        s->best = sum;
    if (from == s->stock || left == 0 || sum > s->wanted)
        return;
    int count = s->counts[from] < 0 || s->counts[from] > left ? left : s->counts[from];
    for (int k = 0; k <= count; k++)
        look(s, from + 1, left - k, sum + k * s->masses[from]);
}

double trial_round(double mass, const double *masses, const int *counts, size_t stock, int pieces,
                   double most)
{
    if (stock == 0)
        return fmin(mass, most);
    struct search s = {masses, counts, stock, mass, most, 0};
    look(&s, 0, pieces > 8 ? 8 : pieces, 0);
    return s.best;
}
