#include "report/mounting.h"

#include <complex.h>
#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "report/phrase.h"
#include "report/runout.h"

static bool same_place(const struct job_weight *a, const struct job_weight *b)
{
    return a->plane == b->plane && fabs(remainder(a->angle_deg - b->angle_deg, 360)) < 1e-6 &&
           fabs(a->radius_m - b->radius_m) <= 1e-9 * b->radius_m;
}

/* How many weights like `w` stand in the list before item `end`. */
static size_t alike(const struct job_run *run, size_t end, const struct job_weight *w)
{
    size_t count = 0;
    for (size_t i = 0; i < end; i++) {
        const struct job_weight *o = &run->weights[i];
        count += same_place(o, w) &&
                 fabs(o->mounted_mass - w->mounted_mass) <= 1e-9 * fabs(w->mounted_mass);
    }
    return count;
}

/* True where weight `i` of run `run` was listed by an earlier run, or stays on with run `kept` (-1:
 * none does): as many alike, each counted once. */
static bool is_listed(const struct job *job, size_t run, size_t i, int kept)
{
    const struct job_weight *w = &job->runs[run].weights[i];
    const size_t which = alike(&job->runs[run], i, w);
    for (size_t r = 0; r < job->run_count; r++)
        if ((r < run || (int)r == kept) &&
            alike(&job->runs[r], job->runs[r].weight_count, w) > which)
            return true;
    return false;
}

/* All that any run added and run `kept` does not hold, each weight with the first run that lists
 * it; gives how many. */
static size_t list_added(struct buffer *out, const struct job *job, int kept)
{
    size_t count = 0;
    for (size_t r = 0; r < job->run_count; r++)
        for (size_t i = 0; i < job->runs[r].weight_count; i++) {
            const struct job_weight *w = &job->runs[r].weights[i];
            if (!(w->mounted_mass > 0) || is_listed(job, r, i, kept))
                continue;
            buffer_text(out, count++ ? "; " : "");
            phrase_weight(out, job, w);
            buffer_format(out, " (run '%s')", job->runs[r].name);
        }
    return count;
}

/* `lead` and the list of what comes off; nothing where nothing does. */
static bool say_off(struct buffer *out, const struct job *job, int kept, const char *lead)
{
    struct buffer list = BUFFER_INIT;
    const size_t count = list_added(&list, job, kept);
    if (count > 0 && !list.failed)
        buffer_format(out, "%s%s.", lead, list.bytes);
    out->failed = out->failed || list.failed;
    buffer_release(&list);
    return count > 0;
}

/* The weights of that run stay on: "weights", "holes" or both, by what it lists. */
static void say_kept(struct buffer *out, const struct job *job, size_t run)
{
    bool added = false, removed = false;
    for (size_t i = 0; i < job->runs[run].weight_count; i++) {
        added = added || job->runs[run].weights[i].mounted_mass > 0;
        removed = removed || job->runs[run].weights[i].mounted_mass < 0;
    }
    buffer_format(out,
                  removed && added ? "In addition to what run '%s' added, which stays on, and "
                                     "removed: "
                  : removed        ? "In addition to what was removed in run '%s': "
                                   : "In addition to the weights of run '%s', which stay on: ",
                  job->runs[run].name);
    phrase_weights(out, job, run);
    buffer_text(out, ".");
    say_off(out, job, (int)run, " Take off first whatever else of the runs is on: ");
}

void mounting_relative_to(struct buffer *out, const struct job *job, const char *name)
{
    const int run = dossier_base(job, name), removed = job_removed_run(job);
    const int loaded = job_found_loaded(job);
    if (run >= 0) {
        say_kept(out, job, (size_t)run);
        return;
    }
    if (removed >= 0) {
        buffer_format(out,
                      "Relative to the rotor %s: put back what was removed in run '%s' first, or "
                      "name the run as mounted in [aim] and ask again.",
                      name, job->runs[removed].name);
        say_off(out, job, -1, " Take off all that the runs added: ");
        return;
    }
    if (loaded >= 0)
        buffer_format(out,
                      "Relative to the rotor without any weight that the sheet lists, those of run "
                      "'%s' included: take all of them off first",
                      job->runs[loaded].name);
    else if (job_never_bare(job))
        buffer_text(out, "Relative to the rotor without any weight that the sheet lists, which no "
                         "run shows: take all of them off first");
    else
        buffer_format(out, "Relative to the rotor %s: ", name);
    const bool plain = loaded < 0 && !job_never_bare(job);
    if (!say_off(out, job, -1,
                 plain ? "first take off all that the runs list, trial and correction weights "
                         "alike: "
                       : ": "))
        buffer_text(out,
                    plain ? "no run lists a weight, so leave on all that was on it then." : ".");
}

/* Largest relative difference of mass that is still the same weight: scales show no more. */
static const double SAME_MASS = 0.005;

/* Equivalent weights of the answer on one plane: what stays and what is placed, kg. */
static double complex answer_on(const struct dossier *d, int base, size_t plane)
{
    double complex sum = base >= 0 ? job_run_weight(d->job, (size_t)base, plane) : 0;
    for (size_t i = 0; i < d->placements.count; i++) {
        const struct placement_record *p = &d->placements.items[i];
        if (p->plane == (int)plane)
            sum += angle_vector(p->mass, p->angle_deg);
    }
    return sum;
}

static bool carries_it(const struct dossier *d, int base, size_t run)
{
    for (size_t p = 0; p < d->job->plane_count; p++) {
        const double complex then = answer_on(d, base, p);
        if (cabs(job_run_weight(d->job, run, p) - then) > SAME_MASS * cabs(then))
            return false;
    }
    return true;
}

/* True where the run's used readings are within every target that is forecast. */
static bool meets_aim(const struct dossier *d, size_t run)
{
    size_t targets = 0;
    for (size_t f = 0; f < d->forecasts.count; f++) {
        const struct forecast_record *own = &d->forecasts.items[f];
        bool met = false;
        if (!isfinite(own->target))
            continue;
        targets++;
        for (size_t i = 0; i < d->readings.count && !met; i++) {
            const struct dossier_reading left = runout_off(d, &d->readings.items[i]);
            const struct reading_record *r = &left.reading;
            met = left.use && r->sensor == own->sensor && r->has_phase &&
                  strcmp(r->run, d->job->runs[run].name) == 0 &&
                  strcmp(r->condition, own->condition) == 0 && cabs(r->vector) <= own->target;
        }
        if (!met)
            return false;
    }
    return targets > 0;
}

void mounting_carried(struct buffer *out, const struct dossier *d)
{
    const struct job *job = d->job;
    if (d->placements.count == 0)
        return;
    const int base = dossier_base(job, d->placements.items[0].relative_to);
    for (size_t r = job->run_count; r-- > 0;) {
        if (job->runs[r].role[0] || (int)r == base || job_run_is_bare(job, r))
            continue;
        const bool carries = carries_it(d, base, r), meets = meets_aim(d, r);
        if (!carries && !meets)
            continue;
        buffer_format(out, "Run '%s' ", job->runs[r].name);
        buffer_text(out, carries ? "already carries all that this answer asks for" : "");
        buffer_text(out, carries && meets ? " and " : "");
        buffer_text(out, meets ? "meets the aim" : "");
        buffer_format(out,
                      ": if its weights are still on, fit NOTHING of what stands here, it would be "
                      "doubled; write `mounted = %s` and ask again.",
                      job->runs[r].name);
        return;
    }
}
