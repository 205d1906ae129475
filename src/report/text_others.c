#include "report/text_others.h"

#include <math.h>

#include "report/digits.h"
#include "report/paper.h"
#include "report/phrase.h"

static double number(const json_t *object, const char *key)
{
    const json_t *value = json_object_get(object, key);
    return json_is_number(value) ? json_number_value(value) : NAN;
}

static const char *string(const json_t *object, const char *key)
{
    const char *text = json_string_value(json_object_get(object, key));
    return text ? text : "";
}

/* "8.7 %": the root of expected squared vibration, as a share of what it is now. */
static void share(struct buffer *out, double of_nothing)
{
    char text[DIGITS_ROOM];
    buffer_format(out, "%s %%", digits_at(text, 100 * of_nothing, of_nothing < 0.0995 ? -1 : 0));
}

static void item(struct buffer *out, const struct job *job, const json_t *json)
{
    double mass = number(json, "mass"), position = number(json, "position");
    buffer_text(out, mass < 0 ? "remove " : "");
    phrase_mass(out, job, fabs(mass), NAN);
    buffer_format(out, " on plane '%s'", string(json, "plane"));
    if (position > 0)
        buffer_format(out, ", position %.0f", position);
    buffer_text(out, ", at ");
    phrase_angle(out, job, number(json, "angle_deg"), NAN);
}

static void other(const struct job *job, const json_t *json, struct buffer *out)
{
    const json_t *items = json_object_get(json, "items");
    struct buffer text = BUFFER_INIT;
    buffer_text(&text, "- ");
    share(&text, number(json, "of_nothing"));
    buffer_text(&text, ": ");
    if (json_array_size(items) == 0)
        buffer_text(&text, "nothing added");
    for (size_t i = 0; i < json_array_size(items); i++) {
        buffer_text(&text, i ? "; " : "");
        item(&text, job, json_array_get(items, i));
    }
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 2, 4, text.bytes);
    buffer_release(&text);
}

void text_others_write(const struct dossier *dossier, struct buffer *out)
{
    const json_t *others = json_object_get(dossier->figures, "others");
    double best = number(dossier->figures, "of_nothing");
    if (dossier->placements.count == 0 || json_array_size(others) == 0 || isnan(best))
        return;
    struct buffer text = BUFFER_INIT;
    buffer_text(&text, "Instead of the above, not besides it. What is above leaves an expected ");
    share(&text, best);
    buffer_text(&text, " of the vibration; the next best would leave:");
    paper_heading(out, "OTHERWISE");
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 2, 2, text.bytes);
    buffer_release(&text);
    for (size_t i = 0; i < json_array_size(others); i++)
        other(dossier->job, json_array_get(others, i), out);
}
