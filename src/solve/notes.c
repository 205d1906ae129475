#include "solve/notes.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/stored.h"
#include "solve/zones.h"

static const char *sensor_of(const struct model *m, const struct model_row *row)
{
    return m->job->sensors[row->sensor].name;
}

static void tell_changed(const struct model *m, const struct model_row *row,
                         struct advice_finding *f)
{
    const char *sensor = sensor_of(m, row);
    const char *then = row->kept == MODEL_STORED_LEFT
                           ? "the stored ones of this sensor are left out"
                           : "they are taken as less sure; a trial run would settle it";
    if (row->kept != MODEL_STORED_LEFT && f->verdict == ADVICE_OK)
        snprintf(f->text, sizeof f->text, "the stored responses of sensor '%s' fit the runs",
                 sensor);
    else if (row->changed_plane >= 0)
        snprintf(
            f->text, sizeof f->text,
            "sensor '%s' responds to plane '%s' otherwise than stored, by more than both allow: "
            "something changed in the machine, its speed, mark or sensors; %s",
            sensor, m->job->planes[row->changed_plane].name, then);
    else
        snprintf(f->text, sizeof f->text,
                 "run '%s' does not come out at sensor '%s' as the stored responses say: something "
                 "changed in the machine, its speed, mark or sensors; %s",
                 m->job->runs[row->misfit_run].name, sensor, then);
}

bool notes_stored(const struct model *m, const struct model_row *row, struct advice_finding *f)
{
    struct judge_limits l = judge_limits_of(m->job, "response-changed", STORED_CHANGED, INFINITY);
    if (l.off || (isnan(row->changed) && !row->apart))
        return false;
    *f = (struct advice_finding){.check = "response-changed",
                                 .unit = "s.e.",
                                 .basis = "common practice",
                                 .run = -1,
                                 .sensor = (int)row->sensor};
    if (row->apart) {
        f->verdict = ADVICE_CAUTION;
        f->unit = "%";
        f->value = 100 * fabs(row->apart->speed_rpm / row->speed_rpm - 1);
        f->limit = 100 * STORED_SPEED_APART;
        snprintf(f->text, sizeof f->text,
                 "the stored responses of sensor '%s' are of %s rpm, the runs of %s rpm: not used",
                 sensor_of(m, row), judge_figure(row->apart->speed_rpm, 4).text,
                 judge_figure(row->speed_rpm, 4).text);
        return true;
    }
    f->value = row->changed;
    f->verdict = judge_value(&l, row->changed, &f->limit);
    tell_changed(m, row, f);
    return true;
}

bool notes_removed(const struct job *job, struct advice_finding *f)
{
    int run = job_removed_run(job), mounted = job->aim.mounted;
    if (run < 0)
        return false;
    *f = (struct advice_finding){.check = "removed-stays",
                                 .unit = "",
                                 .basis = "common practice",
                                 .verdict = ADVICE_CAUTION,
                                 .run = run,
                                 .sensor = -1,
                                 .value = NAN,
                                 .limit = NAN};
    if (mounted < 0)
        snprintf(f->text, sizeof f->text,
                 "run '%s' has removed material: what cannot be put back must be named as "
                 "`mounted = %s` in [aim]; this answer is for a rotor with everything as found",
                 job->runs[run].name, job->runs[run].name);
    else
        snprintf(f->text, sizeof f->text,
                 "run '%s' has removed material that the mounted run '%s' does not list: what "
                 "cannot be put back must stand among that run's weights as well; this answer is "
                 "for a rotor where it is put back",
                 job->runs[run].name, job->runs[mounted].name);
    return true;
}

/* "12 um pk-pk at a lag of 40 deg" as the sensor is shown. */
static void vector_words(const struct job_sensor *s, double complex z, double rpm, char *text,
                         size_t size)
{
    char unit[24];
    double complex shown = units_convert(z, s->quantity, s->show.quantity, rpm * PI / 30);
    if (isnan(creal(shown)))
        snprintf(text, size, "%s m pk at a lag of %.0f deg", judge_figure(cabs(z), 3).text,
                 angle_of(z));
    else
        snprintf(text, size, "%s %s at a lag of %.0f deg",
                 judge_figure(units_shown(cabs(shown), &s->show), 3).text,
                 units_show_text(&s->show, unit), angle_of(shown));
}

/* The row of a sensor whose slow-roll vector is missing; NULL: it is not. */
static const struct model_row *unrolled(const struct model *m, size_t sensor)
{
    for (size_t i = 0; i < m->row_count; i++)
        if (m->rows[i].sensor == sensor && m->rows[i].unrolled)
            return &m->rows[i];
    return NULL;
}

static bool tell_unrolled(const struct model *m, size_t sensor, struct advice_finding *f)
{
    const struct model_row *row = unrolled(m, sensor);
    if (!row)
        return false;
    *f = (struct advice_finding){.check = "runout",
                                 .unit = "",
                                 .basis = "common practice",
                                 .verdict = row->in_aim ? ADVICE_REFUSE : ADVICE_CAUTION,
                                 .run = m->runout_run,
                                 .sensor = (int)sensor,
                                 .value = NAN,
                                 .limit = NAN};
    snprintf(f->text, sizeof f->text,
             m->runout[sensor].count > 0
                 ? "the readings of sensor '%s' have no phase, so that no slow-roll vector can be "
                   "taken off them: it is %s"
                 : "there is no usable slow-roll vector to take off the readings of sensor '%s': "
                   "it is %s",
             m->job->sensors[sensor].name,
             row->in_aim ? "lost, and the aim counts on it" : "left out; the aim does without it");
    return true;
}

void notes_runout_step(const struct model *m, const struct model_row *row, struct advice_next *next)
{
    const char *sensor = m->job->sensors[row->sensor].name;
    const char *run = m->job->runs[m->runout_run].name;
    *next = (struct advice_next){.step = "repeat"};
    snprintf(next->reason, sizeof next->reason,
             "no usable slow-roll vector of a sensor that the aim counts on: '%s' (run '%s')",
             sensor, run);
    snprintf(next->text, sizeof next->text,
             m->amplitudes
                 ? "sensor '%s' holds runout, which cannot be taken off without phase: run again "
                   "with a phase reference, slow roll '%s' included, or set the aim on sensors "
                   "that are no probes"
                 : "repeat the slow roll '%2$s' so that sensor '%1$s' gives a vector there: slow, "
                   "unclipped, with the tacho; or set the aim on sensors that are no probes",
             sensor, run);
}

bool notes_runout(const struct model *m, size_t sensor, struct advice_finding *f)
{
    const struct model_runout *o = &m->runout[sensor];
    const struct job_sensor *s = &m->job->sensors[sensor];
    char words[100];
    if (o->count == 0 || m->amplitudes)
        return tell_unrolled(m, sensor, f);
    *f = (struct advice_finding){.check = "runout",
                                 .unit = "",
                                 .basis = "common practice",
                                 .run = -1,
                                 .sensor = (int)sensor,
                                 .value = NAN,
                                 .limit = NAN};
    vector_words(s, o->vector, o->speed_rpm, words, sizeof words);
    snprintf(f->text, sizeof f->text,
             "the slow-roll vector, %s, is taken off all readings of sensor '%s': correction and "
             "forecast are of the vibration without runout",
             words, s->name);
    return true;
}

void notes_prediction(const struct model *m, const struct model_row *row, size_t run, double se,
                      struct advice_finding *f)
{
    struct judge_limits l = judge_limits_of(m->job, "linearity", 3, INFINITY);
    *f = (struct advice_finding){.check = "prediction",
                                 .unit = "s.e.",
                                 .basis = "common practice",
                                 .run = (int)run,
                                 .sensor = (int)row->sensor,
                                 .value = se};
    l.refuse = INFINITY; /* linearity refuses, where it must */
    f->verdict = judge_value(&l, se, &f->limit);
    if (f->verdict == ADVICE_OK)
        snprintf(f->text, sizeof f->text,
                 "run '%s' came out as the runs before it predict; sensor '%s' is furthest off",
                 m->job->runs[run].name, sensor_of(m, row));
    else
        snprintf(
            f->text, sizeof f->text,
            "run '%s' did not come out at sensor '%s' as the runs before it predict: check that "
            "the weights, their angles and radii are as the sheet says, and whether the machine "
            "or its speed changed",
            m->job->runs[run].name, sensor_of(m, row));
}

void notes_speed(const struct job *job, const struct slope_match *match, struct advice_finding *f)
{
    const struct job_sensor *s = &job->sensors[match->sensor];
    double w = match->rpm * PI / 30;
    double shown = cabs(units_convert(match->largest, s->quantity, s->show.quantity, w));
    char unit[24];
    *f = (struct advice_finding){.check = "speed-corrected",
                                 .unit = "",
                                 .basis = "common practice",
                                 .run = -1,
                                 .sensor = (int)match->sensor,
                                 .value = NAN,
                                 .limit = NAN};
    snprintf(
        f->text, sizeof f->text,
        "condition '%s': the readings of sensor '%s' are brought to %s rpm by their slope over "
        "speed within the runs, by %s %s at most; what that costs is in the ranges",
        match->condition, s->name, judge_figure(match->rpm, 5).text,
        judge_figure(units_shown(shown, &s->show), 2).text, units_show_text(&s->show, unit));
}

/* The ideal least-squares weight leaves so much of as found that something else is wrong: our
 * choice, a single plane of a rigid rotor that is out in one plane leaves a few percent. */
#define LEFT_MOST 0.3

/* Amplitude that a weight leaves at a row, SI peak. */
static double left_by(const struct answer *a, const struct model_row *row,
                      const double complex *weights)
{
    for (size_t r = 0; r < a->rows; r++) {
        double unused[3];
        if (a->row[r] == row)
            return cabs(posterior_predict(&a->posterior[r], weights, unused));
    }
    return NAN;
}

/* Chances from which on what is expected is no certainty: our choice of words. */
#define CHANCE_SOME 0.05
#define CHANCE_GOOD 0.25

static const char *miss_words(double chance)
{
    return !(chance >= CHANCE_SOME)   ? "this will not meet"
           : !(chance >= CHANCE_GOOD) ? "this is unlikely to meet"
                                      : "this may well not meet";
}

/* What keeps the vibration above the target. */
static const char *miss_reason(const struct answer *a, const struct model_row *row)
{
    if (left_by(a, row, a->classical) / row->as_found > LEFT_MOST)
        return "even the ideal weight leaves much of it; weights on these planes cannot do it "
               "alone, or a sensor or the tape is not as the sheet says";
    if (left_by(a, row, a->weights) > row->target)
        return "even the ideal weight leaves more than the target, since what the readings of all "
               "sensors and conditions ask for differs";
    return "positions, stock or limits allow no better";
}

bool notes_target(const struct answer *a, struct advice_finding *f)
{
    const struct answer_forecast *worst = NULL;
    for (size_t i = 0; i < a->forecast_count; i++) {
        const struct answer_forecast *fc = &a->forecasts[i];
        double share = cabs(fc->after) / fc->row->target;
        if (fc->row->in_aim && share > 1 &&
            (!worst || share > cabs(worst->after) / worst->row->target))
            worst = fc;
    }
    if (!worst || a->static_only) /* the couple comes after */
        return false;
    const struct job_sensor *s = &a->model->job->sensors[worst->row->sensor];
    double w = worst->row->speed_rpm * PI / 30, target = worst->row->target;
    double after = cabs(units_convert(cabs(worst->after), s->quantity, s->show.quantity, w));
    double aimed = cabs(units_convert(target, s->quantity, s->show.quantity, w));
    char unit[24];
    bool shown = !isnan(after) && !isnan(aimed);
    *f = (struct advice_finding){.check = "target-missed",
                                 .unit = "%",
                                 .basis = "the aim of the sheet",
                                 .run = -1,
                                 .sensor = (int)worst->row->sensor,
                                 .verdict = ADVICE_CAUTION,
                                 .value = 100 * cabs(worst->after) / target,
                                 .limit = 100};
    size_t n = (size_t)snprintf(
        f->text, sizeof f->text,
        "%s the target at '%s' (%s of %s %s expected): ", miss_words(worst->chance), s->name,
        shown ? judge_figure(units_shown(after, &s->show), 3).text : "more",
        shown ? judge_figure(units_shown(aimed, &s->show), 3).text : "it",
        shown ? units_show_text(&s->show, unit) : "");
    snprintf(f->text + n, sizeof f->text - n, "%s", miss_reason(a, worst->row));
    return true;
}

bool notes_zone(const struct answer *a, const struct answer_forecast *fc, struct advice_finding *f)
{
    const struct answer_zone *z = &fc->zone;
    if (!z->given)
        return false;
    char before = zones_of(z->before, z->limits), after = zones_of(z->after, z->limits);
    bool length = z->quantity == QUANTITY_DISPLACEMENT;
    double unit = length ? 1e-6 : 1e-3;
    const char *name = length ? "um rms" : "mm/s rms";
    *f = (struct advice_finding){.check = "zone",
                                 .unit = name,
                                 .basis = ZONES_BASIS,
                                 .run = -1,
                                 .sensor = (int)fc->row->sensor,
                                 .value = z->after / unit,
                                 .limit = z->limits[1] / unit};
    f->verdict = after > 'B' ? ADVICE_CAUTION : ADVICE_OK;
    snprintf(f->text, sizeof f->text,
             "sensor '%s': %s %s, zone %c now; %s %s, zone %c expected after (group %d, %s%s)",
             sensor_of(a->model, fc->row), judge_figure(z->before / unit, 2).text, name, before,
             judge_figure(z->after / unit, 2).text, name, after, a->model->job->aim.zone_group,
             a->model->job->aim.zone_flexible ? "flexible" : "rigid",
             z->overall ? "" : "; of 1x alone, the overall vibration is not less");
    return true;
}

/* Between conditions at one speed, common practice: a bearing's or a foundation's warmth turns a
 * response less. */
#define TURNED_MOST 90  /* deg */
#define TURNED_ALIKE 30 /* deg: from sensor to sensor */
#define SPEED_ALIKE 0.02

/* Turn of the response from row a to row b, deg; NaN: not known in both, or at another speed. */
static double turn_between(const struct model_row *a, const struct model_row *b, size_t plane)
{
    if (a->sensor != b->sensor || a->state != MODEL_GOOD || b->state != MODEL_GOOD ||
        !(fabs(b->speed_rpm / a->speed_rpm - 1) <= SPEED_ALIKE))
        return NAN;
    return angle_wrap_180(angle_of(b->posterior.mean[plane + 1]) -
                          angle_of(a->posterior.mean[plane + 1]));
}

/* How far all sensors turn alike between two conditions, deg; NaN: they do not. */
static double turned(const struct model *m, size_t plane, size_t from, size_t to)
{
    double first = NAN;
    size_t count = 0;
    for (size_t i = 0; i < m->row_count; i++)
        for (size_t k = 0; k < m->row_count; k++) {
            if (m->rows[i].condition != from || m->rows[k].condition != to)
                continue;
            double turn = turn_between(&m->rows[i], &m->rows[k], plane);
            if (isnan(turn))
                continue;
            first = count++ == 0 ? turn : first;
            if (!(fabs(turn) > TURNED_MOST) || fabs(angle_wrap_180(turn - first)) > TURNED_ALIKE)
                return NAN;
        }
    return count > 1 ? first : NAN;
}

bool notes_turned(const struct model *m, size_t plane, struct advice_finding *f)
{
    for (size_t to = 1; to < m->condition_count && !m->amplitudes; to++)
        for (size_t from = 0; from < to; from++) {
            double turn = turned(m, plane, from, to);
            if (isnan(turn))
                continue;
            *f = (struct advice_finding){.check = "response-turned",
                                         .unit = "deg",
                                         .basis = "common practice",
                                         .verdict = ADVICE_CAUTION,
                                         .run = -1,
                                         .sensor = -1,
                                         .value = fabs(turn),
                                         .limit = TURNED_MOST};
            snprintf(f->text, sizeof f->text,
                     "from condition '%s' to '%s' the responses to plane '%s' turn by %.0f deg at "
                     "all sensors alike, at one speed, as if a weight's angle had been written "
                     "wrong in one of them, or the tape moved: check the weights of their runs",
                     m->conditions[from], m->conditions[to], m->job->planes[plane].name,
                     fabs(turn));
            return true;
        }
    return false;
}
