#include "solve/advice.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "solve/misfit.h"
#include "solve/sits.h"
#include "solve/tolerance.h"
#include "solve/trial.h"

static void judge(struct advice_finding *f, const struct judge_limits *l, double value)
{
    f->value = value;
    f->verdict = judge_value(l, value, &f->limit);
}

static double weight_unit(const struct job *job, const char **name)
{
    *name = job->units == UNITS_US ? "oz" : "g";
    return job->units == UNITS_US ? 0.45359237 / 16 : 1e-3;
}

/* "'left' and 'right'": planes with a say in the pattern that is seen least. */
static void weak_planes(const struct answer *a, char *text, size_t size)
{
    size_t length = 0;
    text[0] = '\0';
    for (size_t p = 0; p < a->planes && length + 1 < size; p++)
        if (cabs(a->weak[p]) > 0.2) /* of the largest part: a lesser one is not the trouble */
            length += (size_t)snprintf(text + length, size - length, "%s'%s'",
                                       length ? " and " : "", a->model->job->planes[p].name);
}

bool advice_conditioning(const struct answer *a, struct advice_finding *f)
{
    const struct job *job = a->model->job;
    struct judge_limits l = judge_limits_of(job, "conditioning", 10, 100);
    bool short_of_rows = isinf(a->condition);
    if (a->planes < 2 && !short_of_rows)
        return false;
    if (l.off && !short_of_rows)
        return false;
    *f = (struct advice_finding){
        .check = "conditioning", .unit = "", .basis = "common practice", .run = -1, .sensor = -1};
    judge(f, &l, a->condition);
    char names[200];
    weak_planes(a, names, sizeof names);
    if (short_of_rows) {
        f->verdict = ADVICE_REFUSE;
        f->limit = l.refuse;
        snprintf(
            f->text, sizeof f->text,
            "%zu planes cannot be told apart by %zu usable readings a run: %s; more sensors or "
            "another speed are needed",
            a->planes, a->rows, names);
        return true;
    }
    if (f->verdict == ADVICE_OK) {
        snprintf(f->text, sizeof f->text, "the planes can be told apart");
        return true;
    }
    size_t first = 0, second = 0;
    for (size_t p = 0; p < a->planes; p++)
        if (cabs(a->weak[p]) > cabs(a->weak[first]))
            first = p;
    second = first == 0 ? 1 : 0;
    for (size_t p = 0; p < a->planes; p++)
        if (p != first && cabs(a->weak[p]) > cabs(a->weak[second]))
            second = p;
    double apart = fabs(angle_wrap_180(angle_of(a->weak[second]) - angle_of(a->weak[first])));
    snprintf(f->text, sizeof f->text,
             "planes %s are hardly told apart%s; a run with trial weights on both, %.0f deg apart, "
             "%s times the mass on '%s', would show the difference best",
             names, f->verdict == ADVICE_REFUSE ? "" : ", so the weights are kept moderate", apart,
             judge_figure(cabs(a->weak[second]), 2).text, job->planes[second].name);
    return true;
}

/* Static load on the journal that carries plane `plane`, kg: half the weight unless distances tell.
 */
static double journal_load(const struct job *job, size_t plane)
{
    double share[2] = {0.5, 0.5};
    if (job->span_m > 0 && !isnan(job->centre_m))
        tolerance_loads(job->span_m, job->centre_m, share);
    share[0] = fabs(share[0]);
    share[1] = fabs(share[1]);
    if (job->plane_count == 2)
        return job->rotor_mass * share[plane];
    if (job->support == SUPPORT_OVERHUNG) /* the bearing beside the overhung mass carries it */
        return job->rotor_mass * fmax(share[0], share[1]);
    return job->rotor_mass * fmin(share[0], share[1]);
}

bool advice_force(const struct answer *a, size_t plane, struct advice_finding *f)
{
    const struct job *job = a->model->job;
    struct judge_limits l = judge_limits_of(job, "correction-force", 15, 50);
    if (l.off || !(job->rotor_mass > 0) || !(job->service_rpm > 0))
        return false;
    double load = journal_load(job, plane) * TRIAL_GRAVITY;
    /* all that then sits there together, or the most at one place */
    double mass = cabs(a->placed_weights[plane] + a->mounted[plane]);
    double sign = job->planes[plane].work == WORK_REMOVE ? -1 : 1;
    bool mounted = a->mounted[plane] != 0;
    const char *unit;
    double kg = weight_unit(job, &unit);
    for (size_t i = 0; i < a->placement.best.count; i++) {
        const struct place_item *item = &a->placement.best.items[i];
        if (item->plane == plane)
            mass =
                fmax(mass, fabs(sign * item->mass + sits_equivalent(job, plane, item->angle_deg)));
    }
    double force = trial_force(mass, job->planes[plane].radius_m, job->service_rpm);
    if (!(load > 0))
        return false;
    *f = (struct advice_finding){.check = "correction-force",
                                 .unit = "%",
                                 .basis = "common practice",
                                 .run = -1,
                                 .sensor = -1};
    judge(f, &l, 100 * force / load);
    struct judge_figure pull = judge_figure(force, 2), share = judge_figure(100 * force / load, 2);
    if (f->verdict == ADVICE_REFUSE)
        snprintf(f->text, sizeof f->text,
                 "no weight is given, because %s on '%s', %s %s, would pull with %s N at service "
                 "speed, %s %% of the static journal load: check rotor mass, speed, radius and "
                 "stock",
                 mounted ? "what would then sit" : "the one found", job->planes[plane].name,
                 judge_figure(mass / kg, 3).text, unit, pull.text, share.text);
    else
        snprintf(f->text, sizeof f->text,
                 "what %s on '%s' pulls with %s N at service speed, %s %% of the static journal "
                 "load%s",
                 mounted ? "then sits" : "is placed", job->planes[plane].name, pull.text,
                 share.text,
                 f->verdict == ADVICE_OK ? ""
                                         : "; check rotor mass, speed, radius and readings before "
                                           "it is fitted");
    return true;
}

/* Expected size of the effect, from what is stored; relative to one another sensors of the same
 * quantity are compared, the first quantity stored counts. */
static void expect_effect(const struct job *job, size_t plane, struct advice_trial *t)
{
    for (size_t i = 0; i < job->response_count; i++) {
        const struct job_response *r = &job->responses[i];
        double effect = cabs(r->vector) * t->mass;
        if (r->plane != plane ||
            (t->sensor >= 0 &&
             job->sensors[r->sensor].quantity != job->sensors[t->sensor].quantity) ||
            !(effect > (t->sensor >= 0 ? t->effect : 0)))
            continue;
        t->sensor = (int)r->sensor;
        t->effect = effect;
    }
}

void advice_trials(const struct job *job, struct advice_trial *trials)
{
    for (size_t p = 0; p < job->plane_count; p++) {
        const struct job_plane *plane = &job->planes[p];
        struct advice_trial *t = &trials[p];
        *t = (struct advice_trial){NAN, NAN, NAN, -1, NAN};
        if (!(job->rotor_mass > 0) || !(job->service_rpm > 0) || !(plane->radius_m > 0))
            continue;
        double masses[64];
        int counts[64];
        size_t stock = plane->stock_count > 64 ? 64 : plane->stock_count;
        for (size_t i = 0; i < stock; i++) {
            masses[i] = plane->stock[i].mass;
            counts[i] = plane->stock[i].count;
        }
        t->wanted = trial_mass(journal_load(job, p), plane->radius_m, job->service_rpm);
        t->mass = trial_round(t->wanted, masses, counts, stock, plane->pieces,
                              fmin(plane->most, plane->most_in_all));
        if (!(t->mass > 0))
            t->mass = NAN;
        t->force = trial_force(t->mass, plane->radius_m, job->service_rpm);
        expect_effect(job, p, t);
    }
}

int advice_corrected_run(const struct model *m)
{
    int run = m->job->aim.mounted >= 0 ? m->job->aim.mounted : m->last_run;
    if (run < 0 || job_run_is_bare(m->job, (size_t)run))
        return -1;
    if (m->amplitudes && run < 4) /* as found and three trials come first */
        return -1;
    int rank = model_rank_before(m, (size_t)run);
    if (rank < 0)
        return -2;
    return rank == (int)m->job->plane_count + 1 ? run : -1;
}

bool advice_is_done(const struct answer *a, int run)
{
    bool targets = false;
    for (size_t r = 0; r < a->rows; r++) {
        const double complex *z = model_find(a->row[r], (size_t)run);
        if (isnan(a->row[r]->target))
            continue;
        targets = true;
        if (!z || cabs(*z) > a->row[r]->target)
            return false;
    }
    if (targets)
        return true;
    if (!a->has_residual || run != a->model->job->aim.mounted)
        return false;
    for (size_t p = 0; p < a->planes; p++)
        if (!(a->residuals[p].before <= a->residuals[p].permissible))
            return false;
    return true;
}

bool advice_is_final(const struct advice_finding *finding)
{
    return !strcmp(finding->check, "conditioning") || !strcmp(finding->check, "correction-force") ||
           !strcmp(finding->check, "correction");
}

void advice_no_correction(const struct advice_next *next, struct advice_finding *f)
{
    *f = (struct advice_finding){.check = "correction",
                                 .unit = "",
                                 .basis = "",
                                 .verdict = ADVICE_REFUSE,
                                 .run = -1,
                                 .sensor = -1,
                                 .value = NAN,
                                 .limit = NAN};
    snprintf(f->text, sizeof f->text, "%s", next->reason);
}

/* ---- steps ---- */

/* Three digits without zeros behind the point: pieces in stock are as exact as they are named. */
static struct judge_figure mass_figure(double mass)
{
    struct judge_figure figure = judge_figure(mass, 3);
    size_t length = strlen(figure.text);
    if (strchr(figure.text, '.'))
        while (figure.text[length - 1] == '0')
            figure.text[--length] = '\0';
    if (length > 0 && figure.text[length - 1] == '.')
        figure.text[length - 1] = '\0';
    return figure;
}

/* "on 'wheel' about 60 g (force 58 N)" for a plane; without a size just its name. */
static size_t trial_words(const struct job *job, size_t p, const struct advice_trial *t, char *text,
                          size_t size)
{
    const char *unit;
    double kg = weight_unit(job, &unit);
    if (isnan(t->mass))
        return (size_t)snprintf(text, size, "on '%s'", job->planes[p].name);
    return (size_t)snprintf(text, size, "on '%s' about %s %s (force %s N)", job->planes[p].name,
                            mass_figure(t->mass / kg).text, unit, judge_figure(t->force, 2).text);
}

static bool plane_is_bare(const struct job *job, size_t p)
{
    for (size_t i = 0; i < job->run_count; i++)
        if (job_run_weight(job, i, p) != 0)
            return false;
    return true;
}

/* Appends what the sheet lacks for the size of a trial weight, and nothing else. */
static void say_unsized(const struct job *job, struct advice_next *next)
{
    bool radius = false;
    for (size_t p = 0; p < job->plane_count; p++)
        radius = radius || !(job->planes[p].radius_m > 0);
    const char *const lacks[] = {job->rotor_mass > 0 ? NULL : "its rotor's mass",
                                 job->service_rpm > 0 ? NULL : "its service speed",
                                 radius ? "the radius of each plane" : NULL};
    size_t length = strlen(next->text), count = 0, said = 0;
    for (size_t i = 0; i < 3; i++)
        count += lacks[i] != NULL;
    for (size_t i = 0; i < 3 && length + 40 < sizeof next->text; i++)
        if (lacks[i])
            length += (size_t)snprintf(next->text + length, sizeof next->text - length, "%s%s",
                                       said++ == 0     ? "; for its size the sheet must give "
                                       : said == count ? " and "
                                                       : ", ",
                                       lacks[i]);
}

/* Appends the trial weights of the planes that no run has tried yet. */
static void list_trials(const struct model *m, struct advice_next *next)
{
    const struct job *job = m->job;
    struct advice_trial trials[16];
    size_t length = strlen(next->text), count = 0;
    bool unsized = false;
    if (job->plane_count > 16)
        return;
    advice_trials(job, trials);
    for (size_t p = 0; p < job->plane_count && length + 80 < sizeof next->text; p++) {
        if (!plane_is_bare(job, p) || m->held[p])
            continue;
        length += (size_t)snprintf(next->text + length, sizeof next->text - length, "%s",
                                   count++ ? ", " : ": ");
        length += trial_words(job, p, &trials[p], next->text + length, sizeof next->text - length);
        unsized = unsized || isnan(trials[p].wanted);
    }
    if (count && unsized)
        say_unsized(job, next);
}

void advice_trial_step(const struct model *m, struct advice_next *next)
{
    *next = (struct advice_next){.step = "trial"};
    snprintf(next->text, sizeof next->text,
             m->job->plane_count == 0
                 ? "the sheet names no plane: add one, then run with a trial weight"
             : m->job->plane_count == 1
                 ? "run with a trial weight at any convenient position"
                 : "run with a trial weight, one plane at a time, at any convenient position");
    list_trials(m, next);
    size_t length = strlen(next->text);
    if (m->amplitudes && m->job->plane_count == 1)
        snprintf(next->text + length, sizeof next->text - length,
                 "; no lag can be read: it takes three such runs, the same weight at three angles "
                 "about 120 deg apart, or one with a phase reference (and as found with it)");
}

void advice_repeat_step(const struct model *m, const struct ruling *ruling,
                        struct advice_next *next)
{
    *next = (struct advice_next){.step = "repeat"};
    if (!ruling->row) {
        snprintf(next->reason, sizeof next->reason, "no reading is fit to balance on");
        snprintf(
            next->text, sizeof next->text,
            "no reading is fit to balance on: mend what the findings name and repeat the runs");
        return;
    }
    const struct model_row *row = ruling->row;
    const char *sensor = m->job->sensors[row->sensor].name;
    const char *run = row->lost_run >= 0 ? m->job->runs[row->lost_run].name : "";
    const char *condition = m->conditions[row->condition];
    char runs[160];
    if (row->torn) {
        bool any = misfit_list(m, row, runs, sizeof runs);
        snprintf(next->reason, sizeof next->reason,
                 "the runs contradict each other, and which is wrong cannot be told: sensor '%s' "
                 "(condition '%s')",
                 sensor, condition);
        snprintf(next->text, sizeof next->text,
                 "the runs contradict each other at sensor '%s' (condition '%s')%s%s: check their "
                 "weights, angles and radii against the sheet, then repeat one",
                 sensor, condition, any ? ", any one may be wrong of " : "", runs);
        return;
    }
    if (ruling->named)
        snprintf(next->reason, sizeof next->reason,
                 "refused readings of a sensor that the aim names: '%s' (run '%s', condition '%s')",
                 sensor, run, condition);
    else
        snprintf(next->reason, sizeof next->reason,
                 "refused readings that the regression needs: '%s' (sensor '%s', condition '%s')",
                 run, sensor, condition);
    snprintf(
        next->text, sizeof next->text,
        "the readings left cannot carry a correction: mend what the findings refuse, then repeat "
        "run '%s' with sensor '%s' (condition '%s')",
        run, sensor, condition);
}

/* True where the sheet has runs of which no reading came; they are named. */
static bool list_absent(const struct model *m, struct advice_next *next)
{
    char names[200] = "";
    size_t length = 0;
    for (size_t i = 0; i < m->job->run_count && length + 50 < sizeof names; i++)
        if (!m->present[i])
            length += (size_t)snprintf(names + length, sizeof names - length, "%s'%s'",
                                       length ? ", " : "", m->job->runs[i].name);
    if (length == 0)
        return false;
    next->step = "repeat";
    snprintf(next->reason, sizeof next->reason, "a run is missing, no reading of it came: %s",
             names);
    snprintf(next->text, sizeof next->text,
             "the sheet has runs of which no reading came: add or repeat %s", names);
    return true;
}

/* Without phase: what the trials so far leave open, and what the next run is for. */
static void amplitudes_step(const struct model *m, const struct model_row *row,
                            struct advice_next *next)
{
    const char *unit;
    double kg = weight_unit(m->job, &unit), sign = m->job->angles == SENSE_WITH ? -1 : 1;
    size_t trials = 0;
    for (size_t i = 0; row && i < row->count; i++)
        trials += !job_run_is_bare(m->job, row->runs[i]);
    bool two = row && (row->ambiguous || trials == 2);
    bool remove = m->job->planes[0].work == WORK_REMOVE;
    double turn = remove ? -1 : 1; /* what is removed stands opposite */
    snprintf(next->reason, sizeof next->reason,
             row && row->ambiguous
                 ? "a run is missing: amplitudes alone leave more than one answer"
                 : "a run is missing: without phase it takes as found and three trials");
    if (two && !isnan(creal(row->either[0] + row->either[1])))
        snprintf(
            next->text, sizeof next->text,
            "amplitudes alone leave two answers that fit alike, %s%s %s at %.0f deg or %s %s "
            "at %.0f deg %s: do neither yet; a run with the trial weight at one more angle, off "
            "the line of the others, or with a phase reference, tells which is right",
            remove ? "removing " : "", judge_figure(cabs(row->either[0]) / kg, 2).text, unit,
            angle_wrap_360(sign * angle_of(turn * row->either[0])),
            judge_figure(cabs(row->either[1]) / kg, 2).text, unit,
            angle_wrap_360(sign * angle_of(turn * row->either[1])), job_sense_text(m->job));
    else if (two)
        snprintf(next->text, sizeof next->text,
                 "amplitudes alone leave more than one answer that fits these runs: a run with the "
                 "trial weight at one more angle, off the line of the others, or with a phase "
                 "reference, tells which is right");
    else
        snprintf(next->text, sizeof next->text,
                 "amplitudes alone take as found and three trials: one leaves any angle open, two "
                 "leave two answers, the third tells which is right; run with the same weight at "
                 "%s, about 120 deg apart, or once with a phase reference",
                 trials == 0 ? "three angles in turn" : "two more angles in turn");
}

void advice_missing_step(const struct model *m, const struct ruling *ruling,
                         struct advice_next *next)
{
    const struct job *job = m->job;
    *next = (struct advice_next){.step = "trial"};
    if (list_absent(m, next))
        return;
    bool known_first = ruling->row && ruling->row->posterior.known[0];
    if (m->amplitudes) {
        amplitudes_step(m, ruling->row, next);
        return;
    }
    for (size_t p = 0; p < job->plane_count; p++)
        if (plane_is_bare(job, p) && !m->held[p]) {
            snprintf(next->reason, sizeof next->reason,
                     "a run is missing: none carries a weight on plane '%s'", job->planes[p].name);
            snprintf(next->text, sizeof next->text,
                     m->last_run >= 0 && !job_run_is_bare(job, (size_t)m->last_run)
                         ? "take the other trial weights off and run with a trial weight on"
                         : "run with a trial weight on");
            list_trials(m, next);
            return;
        }
    if (!known_first && (!ruling->row || ruling->row->count <= job->plane_count)) {
        snprintf(next->reason, sizeof next->reason,
                 "a run is missing: as found, or one more set of trial weights");
        snprintf(next->text, sizeof next->text,
                 "add the as-found run, or a run with other trial weights");
        return;
    }
    char names[160] = "";
    size_t length = 0;
    for (size_t p = 0; p < job->plane_count && ruling->row && length + 50 < sizeof names; p++)
        if (!ruling->row->posterior.known[p + 1])
            length += (size_t)snprintf(names + length, sizeof names - length, "%s'%s'",
                                       length ? " and " : "", job->planes[p].name);
    bool one = job->plane_count == 1 && ruling->row;
    const char *sensor = one ? job->sensors[ruling->row->sensor].name : "";
    snprintf(next->reason, sizeof next->reason,
             one ? "a run is missing: none with a weight on plane %s has a reading of '%s'"
                 : "a run is missing: the weights on planes %s never change apart from each other",
             names, sensor);
    snprintf(next->text, sizeof next->text,
             one ? "run with a trial weight on plane %s and sensor '%s' in place"
                 : "run with a trial weight on one of the planes %s alone",
             names, sensor);
}

void advice_refused_step(const struct advice_finding *finding, struct advice_next *next)
{
    *next =
        (struct advice_next){.step = strcmp(finding->check, "conditioning") ? "repeat" : "trial"};
    snprintf(next->text, sizeof next->text, "%.390s", finding->text);
    snprintf(next->reason, sizeof next->reason, "no correction: %.280s", finding->text);
}

void advice_useless_step(const struct answer *a, struct advice_next *next)
{
    *next = (struct advice_next){.step = "repeat"};
    size_t excluded = 0;
    for (size_t p = 0; p < a->planes; p++)
        excluded += sits_nowhere(a->model->job, p, next->reason, sizeof next->reason);
    if (excluded == a->planes) {
        snprintf(next->text, sizeof next->text, "%s: mend the sheet; no new run is needed",
                 next->reason);
        return;
    }
    bool limits = a->placement.of_all >= a->placement.nothing;
    snprintf(next->reason, sizeof next->reason,
             "nothing that may be placed lowers the expected vibration%s",
             limits ? "" : " by more than its noise");
    snprintf(next->text, sizeof next->text,
             "nothing that may be placed lowers the expected vibration%s: allow more positions, "
             "pieces or mass, or repeat the runs with a larger trial weight",
             limits ? "" : " by more than its noise");
}

void advice_done_step(const struct answer *a, int run, bool met, struct advice_next *next)
{
    *next = (struct advice_next){.step = "done"};
    snprintf(next->text, sizeof next->text,
             met ? sits_only_removed(a->model->job, (size_t)run)
                       ? "run '%s' meets the aim: remove nothing more"
                       : "run '%s' meets the aim: leave its weights on"
                 : "run '%s': nothing that may be placed lowers it further",
             a->model->job->runs[run].name);
}
