#include "report/text_others.h"

#include <math.h>
#include <string.h>

#include "report/digits.h"
#include "report/paper.h"
#include "report/phrase.h"
#include "report/shown.h"
#include "report/text_answer.h"

/* "8.7 %": the root of expected squared vibration, as a share of what it is now. */
static void share(struct buffer *out, double of_nothing)
{
    char text[DIGITS_ROOM];
    buffer_format(out, "%s %%", digits_at(text, 100 * of_nothing, of_nothing < 0.0995 ? -1 : 0));
}

/* A weight of a list, to the digits that the 95 % half widths (kg, deg; NaN: nominal) support. */
static void item(struct buffer *out, const struct job *job, const json_t *json,
                 const double half[2])
{
    double mass = dossier_number(json, "mass"), position = dossier_number(json, "position");
    buffer_text(out, mass < 0 ? "remove " : "");
    phrase_mass(out, job, fabs(mass), half[0]);
    buffer_format(out, " on plane '%s'", dossier_string(json, "plane"));
    if (position > 0)
        buffer_format(out, ", position %.0f", position);
    buffer_text(out, ", at ");
    phrase_angle(out, job, dossier_number(json, "angle_deg"), half[1]);
}

static void other(const struct dossier *d, const json_t *json, struct buffer *out)
{
    const json_t *items = json_object_get(json, "items");
    struct buffer text = BUFFER_INIT;
    buffer_text(&text, "- ");
    share(&text, dossier_number(json, "of_nothing"));
    buffer_text(&text, json_is_true(json_object_get(json, "unopposed"))
                           ? ", without pieces that work against each other: "
                           : ": ");
    if (json_array_size(items) == 0)
        buffer_text(&text, "nothing added");
    for (size_t i = 0; i < json_array_size(items); i++) {
        const json_t *one = json_array_get(items, i);
        const double half[2] = {
            text_answer_free_half(d, job_find_plane(d->job, dossier_string(one, "plane"))), NAN};
        buffer_text(&text, i ? "; " : "");
        item(&text, d->job, one, half);
    }
    paper_take(out, 2, 4, &text);
}

void text_others_write(const struct dossier *dossier, struct buffer *out)
{
    const json_t *others = json_object_get(dossier->figures, "others");
    double best = dossier_number(dossier->figures, "of_nothing");
    if (dossier->placements.count == 0 || json_array_size(others) == 0 || isnan(best))
        return;
    struct buffer text = BUFFER_INIT;
    buffer_text(&text,
                "Instead of the above, not besides it. Over all sensors, and with all that is "
                "uncertain in the readings to come, what is above leaves ");
    share(&text, best);
    buffer_text(&text, " of the vibration; the next best would leave:");
    paper_heading(out, "OTHERWISE");
    paper_take(out, 2, 2, &text);
    for (size_t i = 0; i < json_array_size(others); i++)
        other(dossier, json_array_get(others, i), out);
}

static int sensor_index(const struct job *job, const char *name)
{
    for (size_t i = 0; i < job->sensor_count; i++)
        if (strcmp(job->sensors[i].name, name) == 0)
            return (int)i;
    return -1;
}

static void trial(const struct job *job, const json_t *json, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    char change[DIGITS_ROOM];
    const int sensor = sensor_index(job, dossier_string(json, "sensor"));
    const double mass = dossier_number(json, "mass");
    if (sensor < 0)
        return;
    const struct show *show = &job->sensors[sensor].show;
    const double effect = shown_amplitude(dossier_number(json, "effect"), NAN,
                                          job->sensors[sensor].quantity, job->service_rpm, show)
                              .amplitude;
    if (!isfinite(effect))
        return;
    buffer_format(&text, "Plane '%s'", dossier_string(json, "plane"));
    if (isfinite(mass)) { /* it is in the text of the step, too, to three digits */
        buffer_text(&text, ", ");
        phrase_mass(&text, job, fabs(mass), fabs(mass) / 10);
    }
    /* A stored response is of another day: two digits are all it deserves. */
    buffer_format(&text, ": expected to change sensor '%s' most, by about %s %s %s (1x).",
                  job->sensors[sensor].name, digits_text(change, effect, effect), show->unit,
                  detection_text(show->detection));
    paper_take(out, 2, 4, &text);
}

void text_others_trials(const struct dossier *dossier, struct buffer *out)
{
    const json_t *trials = json_object_get(dossier->figures, "trials");
    for (size_t i = 0; i < json_array_size(trials); i++)
        trial(dossier->job, json_array_get(trials, i), out);
}

/* 95 % half widths of an ideal weight (kg, deg) on that plane; NaN: not known. */
static void ideal_half(const struct dossier *d, const json_t *json, double half[2])
{
    half[0] = half[1] = NAN;
    for (size_t i = 0; i < d->corrections.count; i++) {
        const struct correction_record *c = &d->corrections.items[i];
        if (strcmp(dossier_plane(d, c->plane), dossier_string(json, "plane")) == 0)
            phrase_weight_half(dossier_number(json, "mass"), dossier_number(json, "angle_deg"), c->ellipse, half);
    }
}

static void list(const struct dossier *d, const char *lead, const json_t *weights, bool ideal,
                 struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    buffer_format(&text, "%s ", lead);
    if (json_array_size(weights) == 0)
        buffer_text(&text, "nothing");
    for (size_t i = 0; i < json_array_size(weights); i++) {
        const json_t *weight = json_array_get(weights, i);
        double half[2] = {NAN, NAN};
        if (ideal)
            ideal_half(d, weight, half);
        buffer_text(&text, i ? "; " : "");
        item(&text, d->job, weight, half);
    }
    buffer_text(&text, ".");
    paper_take(out, 2, 4, &text);
}

void text_others_same(const struct dossier *dossier, struct buffer *out)
{
    const json_t *instead = dossier_instead(dossier);
    const json_t *merged = json_object_get(dossier->figures, "merged");
    if (!instead && !merged)
        return;
    paper_heading(out, "THE SAME IN OTHER WORDS");
    if (instead) {
        const char *to = dossier_string(instead, "relative_to");
        struct buffer lead = BUFFER_INIT;
        if (dossier_base(dossier->job, to) >= 0)
            buffer_format(&lead, "The ideal weight with the weights of run '%s' left on:", to);
        else
            buffer_text(&lead, "The ideal weight with everything taken off first:");
        if (!lead.failed)
            list(dossier, lead.bytes, json_object_get(instead, "weights"), true, out);
        out->failed = out->failed || lead.failed;
        buffer_release(&lead);
    }
    if (merged)
        list(dossier,
             dossier->placements.count > 0
                 ? "What will be on, as one weight a plane at the plane's radius:"
                 : "What is on, as one weight a plane at the plane's radius:",
             merged, false, out);
    paper_say(out, 2, 2, "Each is in the place of what is above, not to be fitted besides it.");
}
