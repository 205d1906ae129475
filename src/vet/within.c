#include "vet/within.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "vet/across.h"
#include "vet/trials.h"

static const double GRAVITY = 9.80665; /* m/s2, CGPM 1901 */
static const double STEPS_LEAST =
    2.5; /* a signal of three levels or fewer is the converter's own */

static double larger(double a, double b)
{
    return b > a ? b : a; /* a where b is NaN */
}

void within_refuse(struct vet_run *run, const struct job *job)
{
    run->refused = true;
    for (size_t i = 0; i < job->sensor_count; i++)
        run->readings[i].use = false;
}

double within_force(const struct job_run *run, const struct job *job, double rpm)
{
    double w = 2 * PI * rpm / 60, most = 0;

    for (size_t p = 0; p < job->plane_count; p++) {
        double complex sum = 0;
        for (size_t i = 0; i < run->weight_count; i++) {
            const struct job_weight *g = &run->weights[i];
            if (g->plane == p)
                sum += angle_vector(g->mounted_mass * g->radius_m, g->angle_deg);
        }
        most = larger(most, cabs(sum) * w * w);
    }
    return most;
}

double within_journal_load(const struct job *job)
{
    double weight = job->rotor_mass * GRAVITY, a, b;

    if (isnan(job->span_m) || isnan(job->centre_m) || !(job->span_m > 0))
        return weight / 2;
    b = fabs(weight * job->centre_m / job->span_m);
    a = fabs(weight * (job->span_m - job->centre_m) / job->span_m);
    return job->centre_m > 0 && job->centre_m < job->span_m ? fmin(a, b) : fmax(a, b);
}

/* A recording that gave no reading at all: its tacho is to blame, whatever else there is to say. */
static bool without_turns(const struct vet_run *run, const struct job *job)
{
    for (size_t i = 0; i < job->sensor_count; i++)
        if (run->readings[i].present)
            return false;
    return run->has_tacho && run->turns_seen == 0 && !run->hand && !run->unreadable;
}

static bool coasts(const struct vet_run *run, const struct job *job)
{
    return !strcmp(facts_role(run, job), "coast-down");
}

/* Of a slow roll only the probes are used: what any other sensor shows there is no matter. */
static bool matters(const struct vet_run *run, size_t sensor, const struct job *job)
{
    return strcmp(facts_role(run, job), "runout") != 0 ||
           job->sensors[sensor].quantity == QUANTITY_DISPLACEMENT;
}

static void check_length(struct vet_run *run, int position, const struct job *job,
                         struct findings *findings)
{
    long turns = 0;
    double independent = NAN;
    enum ruling ruling;

    /* A coast-down passes each speed once: how far a reading can be trusted is in its covariance.
     */
    if (run->hand || run->unreadable || without_turns(run, job) || coasts(run, job))
        return;
    for (size_t i = 0; i < job->sensor_count; i++) {
        const struct vet_reading *r = &run->readings[i];
        double share = r->independent / (double)r->blocks;
        if (!r->present || r->turns < turns)
            continue;
        turns = r->turns;
        if (share > 0)
            independent =
                fmin((double)turns * fmin(share, 1), isnan(independent) ? INFINITY : independent);
    }
    ruling = isnan(independent)
                 ? findings_add(findings, CHECK_LENGTH, position, -1, (double)turns,
                                "%ld turns could be used", turns)
                 : findings_add(findings, CHECK_LENGTH, position, -1, (double)turns,
                                "%ld turns could be used, worth about %g independent ones", turns,
                                findings_figure(independent));
    if (ruling == RULING_REFUSE)
        within_refuse(run, job);
}

void within_hint_marks(const struct vet_run *run, const struct job *job, char *to, size_t room,
                       struct findings *findings)
{
    int marks = facts_marks(run, job), given = job->tacho_marks > 1 ? job->tacho_marks : 1;

    if (marks == 0)
        return;
    snprintf(
        to, room,
        "the tacho's %.0f rpm are the service speed times %s%d: see whether the shaft gives %d "
        "mark%s a turn, and say marks = %d under [tacho]",
        run->tacho_rpm, marks > given ? "" : "1/", marks > given ? marks / given : given / marks,
        marks, marks == 1 ? "" : "s", marks);
    findings_instead(findings, to);
}

static void check_speed(struct vet_run *run, int position, const struct job *job,
                        struct findings *findings)
{
    double speed = facts_speed(run, job, false), spread = NAN, off;
    char hint[200];

    if (isnan(speed))
        return;
    if (job->service_rpm > 0 && !facts_role(run, job)[0]) {
        off = 100 * fabs(speed - job->service_rpm) / job->service_rpm;
        within_hint_marks(run, job, hint, sizeof hint, findings);
        if (findings_add(findings, CHECK_SERVICE_SPEED, position, -1, off,
                         "turned at %.0f rpm, %g %% off the service speed of %.0f rpm", speed,
                         findings_figure(off), job->service_rpm) == RULING_REFUSE)
            within_refuse(run, job);
    }
    for (size_t i = 0; i < job->sensor_count; i++)
        if (run->readings[i].present && !isnan(run->readings[i].speed_pct))
            spread = isnan(spread) ? run->readings[i].speed_pct
                                   : larger(spread, run->readings[i].speed_pct);
    if (run->hand || isnan(spread))
        return;
    if (findings_add(findings, CHECK_SPEED_STEADY, position, -1, spread,
                     "speed wandered by %g %% (standard deviation)",
                     findings_figure(spread)) == RULING_REFUSE)
        within_refuse(run, job);
}

/* A sensor without a reading in a run whose others have theirs: a NaN among its samples, say. Not
 * every speed of a coast-down has one. */
static bool vanished(const struct vet_run *run, size_t sensor, const struct job *job)
{
    bool others = false;

    for (size_t i = 0; i < job->sensor_count; i++)
        others = others || run->readings[i].present;
    return others && !run->readings[sensor].present && !coasts(run, job);
}

static void check_channel(struct vet_run *run, int position, size_t sensor, const struct job *job,
                          struct findings *findings)
{
    const struct vet_channel *c = &run->channels[sensor];
    int s = (int)sensor;
    double steps = (c->max - c->min) / c->resolution; /* NaN for a constant: 0/0 */
    bool dead = !(c->resolution > 0) || !(steps > STEPS_LEAST);
    bool refuse;

    refuse = findings_add(findings, CHECK_CLIPPING, position, s, (double)c->railed,
                          "%lld of %lld samples stand at full scale or in held crests", c->railed,
                          c->samples) == RULING_REFUSE;
    if (c->same_as != -1)
        refuse |=
            findings_add(findings, CHECK_SENSOR_DEAD, position, s, 1,
                         "the signal is the same as that of '%s'",
                         c->same_as < 0 ? "tacho" : job->sensors[c->same_as].name) == RULING_REFUSE;
    else if (dead)
        refuse |= findings_add(findings, CHECK_SENSOR_DEAD, position, s, 1,
                               c->resolution > 0 ? "no signal above the channel's resolution"
                                                 : "the signal is constant") == RULING_REFUSE;
    else if (vanished(run, sensor, job)) {
        findings_instead(findings, "look at its samples, which hold what is no number");
        refuse |= findings_add(findings, CHECK_SENSOR_DEAD, position, s, 1,
                               "no reading could be made of it, though the others gave theirs") ==
                  RULING_REFUSE;
    } else
        findings_add(findings, CHECK_SENSOR_DEAD, position, s, 0,
                     "the signal lives, and no other channel has the same");
    if (refuse)
        run->readings[sensor].use = false;
}

/* Where a channel repeats another one, neither can be told to be the true one. */
static void spread_same(struct vet_run *run, const struct job *job)
{
    for (size_t i = 0; i < job->sensor_count; i++) {
        int other = run->channels[i].present ? run->channels[i].same_as : -1;
        if (other >= 0 && run->channels[other].same_as == -1)
            run->channels[other].same_as = (int)i;
    }
}

static void check_tacho(struct vet_run *run, int position, const struct job *job,
                        struct findings *findings)
{
    double all = (double)(run->marks + run->missed), share;

    if (run->hand || !run->has_tacho || !(all > 0))
        return;
    share = 100 * (double)(run->missed + run->extra) / all;
    if (findings_add(findings, CHECK_TACHO, position, -1, share,
                     "%ld marks of %.0f missed and %ld extra, %g %%", run->missed, all, run->extra,
                     findings_figure(share)) == RULING_REFUSE)
        within_refuse(run, job);
}

static void check_reference(struct vet_run *run, int position, const struct job *job,
                            struct findings *findings)
{
    size_t present = 0, phase = 0;
    char hint[200];

    for (size_t i = 0; i < job->sensor_count; i++) {
        present += run->readings[i].present;
        phase += run->readings[i].present && run->readings[i].has_phase;
    }
    if (without_turns(run, job)) {
        within_hint_marks(run, job, hint, sizeof hint, findings);
        if (findings_add(findings, CHECK_PHASE_REFERENCE, position, -1, 1,
                         "there is no usable tacho: %s",
                         !run->pulses      ? "its channel looks like vibration, not like pulses"
                         : run->marks == 0 ? "its channel gave no mark"
                                           : "too few marks follow one rhythm") == RULING_REFUSE)
            within_refuse(run, job);
        return;
    }
    if (coasts(run, job)) {
        if (findings_add(findings, CHECK_PHASE_REFERENCE, position, -1, !run->reference,
                         run->reference ? "lag is read from one mark a turn"
                                        : "lag cannot be read: the marks of a turn cannot be told "
                                          "apart") == RULING_REFUSE)
            within_refuse(run, job);
        return;
    }
    if (present > 0 && phase == present)
        findings_add(findings, CHECK_PHASE_REFERENCE, position, -1, 0, "%s",
                     run->hand ? "lag was noted by hand" : "lag is read from one mark a turn");
    else if (run->index < 0 && !run->unreadable &&
             findings_add(findings, CHECK_PHASE_REFERENCE, position, -1, 1,
                          "lag cannot be read: %s",
                          run->marks > 0 ? "the marks of a turn cannot be told apart"
                                         : "there are no tacho marks") == RULING_REFUSE)
        within_refuse(run, job);
}

/* What to do about weights that pull hard: only a trial may as well be smaller, and beyond the
 * refusal limit a wrong sheet is likelier than a weight that somebody fitted. */
static const char *force_advice(const struct vet_run *run, const struct job *job, double share,
                                const struct findings *findings)
{
    double limit;

    if (run->index == job->aim.mounted || !trials_is_trial(job, (size_t)run->index))
        return "check rotor mass, speed and radius in the sheet";
    return limits_judge(findings->limits, CHECK_WEIGHT_FORCE, share, &limit) == RULING_REFUSE
               ? "check rotor mass, speed and radius in the sheet, else use a smaller weight"
               : NULL;
}

static void check_force(struct vet_run *run, int position, const struct job *job,
                        struct findings *findings)
{
    double load = within_journal_load(job), rpm = job->service_rpm, force, share;

    if (run->index < 0 || job->runs[run->index].weight_count == 0)
        return;
    if (!(rpm > 0))
        rpm = facts_speed(run, job, false);
    force = within_force(&job->runs[run->index], job, rpm);
    share = 100 * force / load;
    if (isnan(share))
        return;
    findings_instead(findings, force_advice(run, job, share, findings));
    if (findings_add(findings, CHECK_WEIGHT_FORCE, position, -1, share,
                     "the weights pull with %g N at %.0f rpm, %g %% of the static journal load",
                     findings_figure(force), rpm, findings_figure(share)) == RULING_REFUSE)
        within_refuse(run, job);
}

void within_run(struct vet_run *run, int position, const struct job *job, struct findings *findings)
{
    if (run->unreadable && !findings->limits->rows[CHECK_READABLE].off)
        within_refuse(run, job);                   /* the finding is read's own */
    for (size_t i = 0; i < job->sensor_count; i++) /* a coast-down hands on what is said of it */
        run->readings[i].use = !run->refused;
    check_length(run, position, job, findings);
    check_speed(run, position, job, findings);
    spread_same(run, job);
    for (size_t i = 0; i < job->sensor_count; i++)
        if (run->channels[i].present && matters(run, i, job))
            check_channel(run, position, i, job, findings);
    check_tacho(run, position, job, findings);
    check_reference(run, position, job, findings);
    check_force(run, position, job, findings);
}

/* Could the tacho alone scatter the lags of blocks as much? Its marks scatter more than the blocks,
 * which average over many, or too many of them are wrong. */
static bool tacho_suspect(const struct vet_run *run, double phase_deg,
                          const struct findings *findings)
{
    double all = (double)(run->marks + run->missed), limit;
    double share = all > 0 ? 100 * (double)(run->missed + run->extra) / all : 0;

    return !run->has_tacho || isnan(run->jitter_deg) || run->jitter_deg >= phase_deg ||
           limits_judge(findings->limits, CHECK_TACHO, share, &limit) != RULING_OK;
}

static bool steadiness(const struct vet_run *run, const struct vet_reading *r, int position, int s,
                       double share, struct findings *findings)
{
    bool refuse = false;
    double value = r->amplitude_pct * share;
    char wander[64] = "";

    if (r->wander_pct > 0)
        snprintf(wander, sizeof wander, "; the vector wanders slowly by %g %%",
                 findings_figure(r->wander_pct * share));
    if (!isnan(value))
        refuse |= findings_add(findings, CHECK_AMPLITUDE_STEADY, position, s, value,
                               "block amplitudes scatter by %g %%, %ld of %ld blocks set aside%s",
                               findings_figure(value), r->set_aside, r->blocks + r->set_aside,
                               wander) == RULING_REFUSE;
    if (!isnan(r->phase_deg) && share > WITHIN_LAG_SHARE) {
        if (!tacho_suspect(run, r->phase_deg, findings))
            findings_instead(findings, findings->limits->rows[CHECK_AMPLITUDE_STEADY].advice);
        refuse |= findings_add(findings, CHECK_PHASE_STEADY, position, s, r->phase_deg,
                               "block lags scatter by %g deg",
                               findings_figure(r->phase_deg)) == RULING_REFUSE;
    }
    return refuse;
}

/* A lasting jump is a move from start to end as well. */
static bool drift(struct vet_reading *r, int position, int s, double share,
                  struct findings *findings)
{
    bool jumped = r->step_pct > larger(r->drift_pct, 0);
    double percent = jumped ? r->step_pct : r->drift_pct;
    double value = percent * share, size = percent / 100 * r->amplitude;
    enum ruling ruling;

    if (isnan(value))
        return false;
    ruling = jumped      ? findings_add(findings, CHECK_DRIFT, position, s, value,
                                        "the vector jumped by %g %% at %g s and stayed",
                                        findings_figure(value), findings_figure(r->step_s))
             : value > 0 ? findings_add(findings, CHECK_DRIFT, position, s, value,
                                        "the vector moved by %g %% from start to end",
                                        findings_figure(value))
                         : findings_add(findings, CHECK_DRIFT, position, s, value,
                                        "no trend stands out from the scatter");
    if (ruling != RULING_OK) {
        r->widen[0] += size * size / 12;
        r->widen[2] += size * size / 12;
    }
    return ruling == RULING_REFUSE;
}

static void say_neighbour(const struct vet_reading *r, char *to, size_t room)
{
    to[0] = '\0';
    if (!isnan(r->beat.turning))
        snprintf(to, room, ", as a line at %.2f Hz would make it",
                 r->speed_rpm / 60 - r->beat.turning);
}

static bool beats(struct vet_reading *r, int position, int s, double share,
                  struct findings *findings)
{
    double value = 100 * r->beat.swing / r->amplitude * share, variance;
    enum ruling ruling;
    char neighbour[64];

    if (isnan(value))
        return false;
    say_neighbour(r, neighbour, sizeof neighbour);
    ruling = value > 0
                 ? findings_add(findings, CHECK_BEAT, position, s, value,
                                "the vector swings by %g %% every %g s%s", findings_figure(value),
                                findings_figure(r->beat.period), neighbour)
                 : findings_add(findings, CHECK_BEAT, position, s, value,
                                "no periodic swing stands out from the scatter");
    variance = ruling == RULING_OK ? 0 : beat_variance(&r->beat);
    r->widen[0] += variance;
    r->widen[2] += variance;
    return ruling == RULING_REFUSE;
}

/* Lag against speed, where lag counts at all. */
static bool resonates(const struct vet_reading *r, int position, int s, double share,
                      struct findings *findings)
{
    double caution = findings->limits->rows[CHECK_NEAR_RESONANCE].caution;
    const struct resonance *found = &r->resonance;
    bool out = resonance_stands_out(found);

    if (!(share > WITHIN_LAG_SHARE) || isnan(found->slope))
        return false;
    if (!out && !(found->error < caution / 2)) {
        findings_rule(findings, CHECK_NEAR_RESONANCE, RULING_OK, position, s, NAN, NAN, "",
                      "the speed held too steady to tell how the lag turns with it");
        return false;
    }
    return findings_add(findings, CHECK_NEAR_RESONANCE, position, s, out ? fabs(found->slope) : 0,
                        "the lag turns by %g +- %g deg per %% of speed",
                        findings_figure(found->slope),
                        findings_figure(2 * found->error)) == RULING_REFUSE;
}

/* Is it unbalance at all? Asked of runs without weights. */
static bool one_x_share(const struct vet_reading *r, int position, int s, const struct job *job,
                        struct findings *findings)
{
    double w = 2 * PI * r->speed_rpm / 60, one, share;

    one = cabs(units_convert(r->amplitude, job->sensors[s].quantity, r->overall_quantity, w));
    share = 100 * one / sqrt(2) / r->overall_rms;
    if (share > 100) /* both are estimates of the same */
        share = 100;
    return !isnan(share) &&
           findings_add(findings, CHECK_ONE_X_SHARE, position, s, share,
                        "1x is %g %% of the overall rms", findings_figure(share)) == RULING_REFUSE;
}

/* The largest line that does not turn with the shaft, % of 1x in the quantity shown; NaN: not
 * known. The spectrum's own are found at no multiple of half an order; lines that were told one by
 * one may stand closer. */
static double neighbour(const struct vet_reading *r, const struct job_sensor *sensor, double *hz)
{
    int derivatives = (int)sensor->quantity - (int)sensor->show.quantity;
    double told_hz, told = orders_line((const double(*)[2])r->lines, r->line_count,
                                       r->speed_rpm / 60, derivatives, &told_hz);
    double percent = 100 * told / r->amplitude;

    *hz = r->neighbour_order * r->speed_rpm / 60;
    if (r->line_count == 0 || !(told > 0) || percent <= r->neighbour)
        return r->neighbour;
    *hz = told_hz;
    return percent;
}

/* What else than 1x there is, against the larger of 1x and the as-found 1x: `share` is 1x over
 * that. */
static bool orders(const struct vet_reading *r, int position, int s, const struct job *job,
                   double share, struct findings *findings)
{
    double hz, other = share * neighbour(r, &job->sensors[s], &hz);
    double two = r->two_x * share, half = r->half_order * share;
    const char *one = share < 1 ? "the as-found 1x" : "1x";
    bool refuse = false;

    if (two >= WITHIN_SHAFT_PCT)
        findings_instead(findings, "see whether the tacho counts this shaft, not one of half its "
                                   "speed; else misalignment, looseness or a bent shaft");
    if (!isnan(two))
        refuse |= findings_add(findings, CHECK_TWO_X, position, s, two, "2x is %g %% of %s",
                               findings_figure(two), one) == RULING_REFUSE;
    if (!isnan(half))
        refuse |= findings_add(findings, CHECK_HALF_ORDER, position, s, half,
                               "the largest half order is %g %% of %s", findings_figure(half),
                               one) == RULING_REFUSE;
    if (!isnan(other))
        refuse |= findings_add(findings, CHECK_NEIGHBOUR, position, s, other,
                               "a line at %.1f Hz that does not turn with the shaft is %g %% of %s",
                               hz, findings_figure(other), one) == RULING_REFUSE;
    return refuse;
}

void within_vectors(struct vet_run *run, int position, const double *as_found,
                    const struct job *job, struct findings *findings)
{
    bool ordinary = !facts_role(run, job)[0];
    bool bare = ordinary && (run->index < 0 || job_run_is_bare(job, (size_t)run->index));

    for (size_t i = 0; i < job->sensor_count; i++) {
        struct vet_reading *r = &run->readings[i];
        double share = r->amplitude / larger(r->amplitude, as_found[i]);
        bool refuse = false;
        if (!r->present || run->hand || !matters(run, i, job))
            continue;
        refuse |= steadiness(run, r, position, (int)i, share, findings);
        refuse |= drift(r, position, (int)i, share, findings);
        if (r->has_phase) {
            refuse |= beats(r, position, (int)i, share, findings);
            refuse |= resonates(r, position, (int)i, share, findings);
        }
        if (bare)
            refuse |= one_x_share(r, position, (int)i, job, findings);
        if (ordinary)
            refuse |= orders(r, position, (int)i, job, share, findings);
        if (refuse)
            r->use = false;
    }
}
