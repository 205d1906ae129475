#include "desk/outline.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

#define COMMENT_COLUMN 36 /* where the remark behind a line begins */

static bool is_known(const char *value)
{
    return value && *value;
}

/* Pads the line that begins at `start` and puts a remark behind it. */
static void end_line(struct buffer *text, size_t start, const char *remark)
{
    if (remark) {
        do
            buffer_text(text, " ");
        while (!text->failed && text->length - start < COMMENT_COLUMN);
        buffer_text(text, "# ");
        buffer_text(text, remark);
    }
    buffer_text(text, "\n");
}

/* Control characters would break the line; a comment's sign and blanks at the ends need quotes. */
void outline_value(struct buffer *text, const char *value)
{
    const size_t length = strlen(value);
    const bool quoted = strchr(value, '#') || value[0] == ' ' || value[length - 1] == ' ';
    buffer_text(text, quoted ? "\"" : "");
    for (const char *c = value; *c; c++)
        buffer_add(text, (unsigned char)*c < 0x20 || *c == 0x7F ? "_" : c, 1);
    buffer_text(text, quoted ? "\"" : "");
}

/* `key = value`; without a value the example, as a comment. */
static void add(struct buffer *text, const char *key, const char *value, const char *example,
                const char *remark)
{
    const size_t start = text->length;
    if (!is_known(value) && !example)
        return;
    buffer_text(text, is_known(value) ? "" : "# ");
    buffer_text(text, key);
    buffer_text(text, " = ");
    outline_value(text, is_known(value) ? value : example);
    end_line(text, start, remark);
}

static void add_section(struct buffer *text, const char *kind, const char *name, bool as_comment)
{
    buffer_text(text, as_comment ? "\n# [" : "\n[");
    buffer_text(text, kind);
    if (name) {
        buffer_text(text, " ");
        buffer_text(text, name);
    }
    buffer_text(text, "]\n");
}

/* ---- the sections ---- */

static void add_job(const struct outline *o, struct buffer *text)
{
    const struct outline_answers *a = &o->answers;
    buffer_text(text, "# A job sheet of lopside. What begins with '#' is a comment: complete what "
                      "is missing and\n"
                      "# take the sign away. 'lopside check' says what is still missing, and shows "
                      "the channels.\n");
    add_section(text, "job", NULL, false);
    add(text, "title", is_known(a->title) ? a->title : "Untitled", NULL, NULL);
    add(text, "angles", a->angles, "against rotation",
        is_known(a->angles) ? "how weights and positions count from the mark"
                            : "or: with rotation. How weights and positions count from the mark");
    add(text, "units", a->units, "US", "for what is shown; metric where absent");
}

static void add_rotor(const struct outline *o, struct buffer *text)
{
    const struct outline_answers *a = &o->answers;
    char seen[40] = "1480 rpm", remark[80] = "for the force of weights";
    if (!isnan(o->channels->speed_rpm)) {
        snprintf(seen, sizeof seen, "%.0f rpm", o->channels->speed_rpm);
        snprintf(remark, sizeof remark, "the first recording has %s", seen);
    }
    add_section(text, "rotor", NULL,
                !is_known(a->mass) && !is_known(a->speed) && !is_known(a->grade));
    add(text, "mass", a->mass, "340 kg", "for the tolerance and the first trial weight");
    add(text, "service speed", a->speed, seen, remark);
    add(text, "rotation", NULL, "clockwise", "or: counter-clockwise; for the drawings");
    add(text, "seen from", NULL, "drive end", "where one stands to see that");
    add(text, "grade", a->grade, "G6.3",
        "ISO 21940-11, for the tolerance; with mass and service speed");
}

static void add_recording(const struct outline *o, struct buffer *text)
{
    const bool sound = !o->channels->text;
    const char *value = sound ? o->answers.full_scale : o->answers.rate;
    char about[80];
    if (!sound && o->channels->has_rate && !is_known(value))
        return;
    snprintf(about, sizeof about, "there is no time column");
    if (!isnan(o->channels->coarse_hz))
        snprintf(about, sizeof about, "the time column says only: about %.4g Hz",
                 o->channels->coarse_hz);
    add_section(text, "recording", NULL, !is_known(value));
    if (sound)
        add(text, "full scale", value, "10 V", "volts at digital full scale");
    else
        add(text, "rate", value, "12800 Hz", o->channels->has_rate ? NULL : about);
}

static bool is_tacho(const struct outline *o, const struct channels_one *one)
{
    return is_known(o->answers.tacho) ? !strcmp(o->answers.tacho, one->channel)
                                      : one->use == CHANNELS_TACHO;
}

static void add_tacho(const struct outline *o, struct buffer *text)
{
    const char *channel = o->answers.tacho;
    const char *remark = "the once-per-turn pulses";
    if (is_known(channel) && !strcmp(channel, "none"))
        return;
    for (size_t i = 0; !is_known(channel) && i < o->channels->count; i++)
        if (o->channels->items[i].use == CHANNELS_TACHO) {
            channel = o->channels->items[i].channel;
            remark = o->channels->items[i].pulses ? "guessed: it alone has regular pulses"
                                                  : "guessed by its name";
        }
    add_section(text, "tacho", NULL, !is_known(channel));
    add(text, "channel", channel, "1",
        is_known(channel) ? remark : "could not be told: which one is it?");
    add(text, "edge", NULL, "falling", "rising where absent");
}

static void add_sensor(const struct outline *o, const struct channels_one *one, struct buffer *text)
{
    const bool told = is_known(one->unit);
    add_section(text, "sensor", one->name, false);
    add(text, "channel", one->channel, NULL, NULL);
    add(text, "unit", told ? one->unit : o->answers.unit, o->channels->text ? "mm/s" : "g",
        told ? "as the recording says" : "what it measures: g, m/s2, mm/s, in/s, um, mil");
    if (!told)
        add(text, "scale", o->answers.scale, o->channels->text ? "4 mV/(mm/s)" : "100 mV/g",
            o->channels->text ? "absent: the column is in that unit already" : NULL);
    add(text, "show", o->answers.show, "mm/s rms", "how it is shown");
}

static void add_sensors(const struct outline *o, struct buffer *text)
{
    for (size_t i = 0; i < o->channels->count; i++) {
        const struct channels_one *one = &o->channels->items[i];
        if (one->use == CHANNELS_TIME || is_tacho(o, one))
            continue;
        if (one->use == CHANNELS_OTHER) {
            buffer_text(text, "\n# left out, no vibration by its unit: column '");
            outline_value(text, one->name);
            buffer_text(text, "'\n");
        } else {
            add_sensor(o, one, text);
        }
    }
}

static void add_planes(const struct outline *o, struct buffer *text)
{
    const struct outline_answers *a = &o->answers;
    for (size_t i = 0; i < o->plane_count; i++) {
        add_section(text, "plane", o->planes[i], false);
        add(text, "radius", a->radius, "410 mm", "where weights are fixed");
        add(text, "positions", a->positions, "12 from 0 deg",
            is_known(a->positions) ? NULL : "absent: any angle");
        add(text, "stock", a->stock, "10 20 50 g", is_known(a->stock) ? NULL : "absent: any mass");
        add(text, "pieces", NULL, "4", "at most, on this plane");
        add(text, "most", NULL, "150 g", "at one position");
        add(text, "taken", NULL, "3 7", "positions that are not free");
    }
}

static void add_runs(const struct outline *o, struct buffer *text)
{
    for (size_t r = 0; r < o->run_count; r++) {
        size_t weights = 0;
        char key[NAME_ROOM + 16];
        add_section(text, "run", o->runs[r], false);
        add(text, "file", o->files[r], NULL, NULL);
        for (size_t w = 0; w < o->weight_count; w++) {
            if (o->weights[w].run != r)
                continue;
            snprintf(key, sizeof key, "weight %s", o->planes[o->weights[w].plane]);
            add(text, key, o->weights[w].text, NULL, NULL);
            weights++;
        }
        snprintf(key, sizeof key, "weight %s", o->planes[0]);
        if (weights == 0)
            add(text, key, NULL, "60 g at 30 deg", "all that was mounted in this run, if anything");
    }
}

void outline_write(const struct outline *outline, struct buffer *text)
{
    add_job(outline, text);
    add_rotor(outline, text);
    add_recording(outline, text);
    add_tacho(outline, text);
    add_sensors(outline, text);
    add_planes(outline, text);
    add_runs(outline, text);
    add_section(text, "aim", NULL, !is_known(outline->answers.target));
    add(text, "target", outline->answers.target, "1.8 mm/s rms", NULL);
}

/* ---- what a correction still needs ---- */

static void add_missing_of_sensors(const struct outline *o, bool doubtful, struct buffer *lines)
{
    for (size_t i = 0; i < o->channels->count; i++) {
        const struct channels_one *one = &o->channels->items[i];
        if (one->use == CHANNELS_TIME || one->use == CHANNELS_OTHER || is_tacho(o, one) ||
            is_known(one->unit))
            continue;
        if (!is_known(o->answers.unit))
            buffer_format(lines, "'unit' in [sensor %s]\n", one->name);
        if (doubtful && !o->channels->text && !is_known(o->answers.scale))
            buffer_format(lines, "'scale' in [sensor %s]\n", one->name);
    }
}

void outline_missing(const struct outline *o, bool doubtful, struct buffer *lines)
{
    const struct outline_answers *a = &o->answers;
    bool tacho = is_known(a->tacho);
    for (size_t i = 0; i < o->channels->count; i++)
        tacho = tacho || o->channels->items[i].use == CHANNELS_TACHO;
    if (!is_known(a->angles))
        buffer_text(lines, "'angles' in [job]\n");
    if (doubtful && !o->channels->text && !is_known(a->full_scale))
        buffer_text(lines, "'full scale' in [recording]\n");
    if (o->channels->text && !o->channels->has_rate && !is_known(a->rate))
        buffer_text(lines, "'rate' in [recording]\n");
    if (!tacho)
        buffer_text(lines, "'channel' in [tacho]\n");
    add_missing_of_sensors(o, doubtful, lines);
    for (size_t i = 0; i < o->plane_count && !is_known(a->radius); i++)
        buffer_format(lines, "'radius' in [plane %s]\n", o->planes[i]);
}
