#include "desk/interview.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/message.h"
#include "base/status.h"
#include "sheet/sheet.h"
#include "sheet/sheet_keys.h"

#define TYPED_ROOM 201 /* a title's length and the NUL */
#define TRIES 3        /* of one question; then it stays open */
#define TEXT_ROOM 400  /* a question, a fault, a few lines of a sheet */

enum { ENDED = -1, NO_MEMORY = -2 }; /* beside 0: there is an answer, or it was left empty */

/* ---- what is wrong with an answer ---- */

/* Behind "answer:2: "; the line that was typed is repeated in it. */
static void find_fault(const char *errors, char *why, size_t room)
{
    static const char line[] = "answer:2: ";
    for (const char *at = errors; at && *at; at = strchr(at, '\n') ? strchr(at, '\n') + 1 : NULL)
        if (!strncmp(at, line, strlen(line)) && !*why) {
            const char *text = at + strlen(line);
            snprintf(why, room, "%.*s", (int)strcspn(text, "\n"), text);
        }
}

int interview_judge(const char *head, const char *key, const char *value, const char *rest,
                    char *why, size_t room)
{
    struct buffer text = BUFFER_INIT, errors = BUFFER_INIT;
    struct sheet sheet = {0};
    why[0] = '\0';
    buffer_format(&text, "[%s]\n%s = ", head, key);
    outline_value(&text, value);
    buffer_format(&text, "\n%s\n", rest);
    int count = text.failed ? -1 : sheet_read_text(&sheet, "answer", text.bytes, text.length, true,
                                                   &errors);
    buffer_add(&errors, "", 1);
    if (count > 0 && !errors.failed)
        find_fault(errors.bytes, why, room);
    sheet_release(&sheet);
    buffer_release(&errors);
    buffer_release(&text);
    return count < 0 || errors.failed ? -1 : 0;
}

/* ---- one question ---- */

static const char *keep(struct interview *v, const char *text)
{
    char **typed = realloc(v->typed, (v->typed_count + 1) * sizeof *typed);
    if (!typed)
        return NULL;
    v->typed = typed;
    char *copy = strdup(text);
    if (copy)
        v->typed[v->typed_count++] = copy;
    return copy;
}

/* A line without the blanks at its ends. ENDED where there is none. */
static int take_line(const char *question, char line[TYPED_ROOM])
{
    char text[TYPED_ROOM];
    fprintf(stderr, "%s: ", question);
    if (!fgets(text, sizeof text, stdin))
        return ENDED;
    if (!strchr(text, '\n'))
        for (int c = getchar(); c != '\n' && c != EOF;)
            c = getchar();
    const char *start = text + strspn(text, " \t");
    size_t length = strcspn(start, "\n");
    while (length > 0 && strchr(" \t\r", start[length - 1]))
        length--;
    memcpy(line, start, length);
    line[length] = '\0';
    return 0;
}

struct question {
    const char *text;
    const char *head, *key; /* of the sheet; head NULL: a file's name */
    const char *rest;       /* what the sheet must hold besides, to read it */
    const char *usual;      /* what an empty answer stands for; NULL: it stays open */
};

/* "against" and "with" will do. */
static void complete_sense(char line[TYPED_ROOM])
{
    static const char *const senses[] = {"against rotation", "with rotation"};
    for (int i = 0; i < 2 && *line; i++)
        if (!strncmp(line, senses[i], strlen(line))) {
            strcpy(line, senses[i]);
            return;
        }
}

static bool has_channel(const struct channels *channels, const char *name)
{
    for (size_t i = 0; i < channels->count; i++)
        if (!strcmp(channels->items[i].channel, name))
            return true;
    return false;
}

static int judge(const struct interview *v, const struct question *q, char line[TYPED_ROOM],
                 char *why, size_t room)
{
    why[0] = '\0';
    if (!q->head) {
        if (access(line, F_OK) == 0)
            snprintf(why, room, "is there already, and stays as it is: '%.200s'", line);
        return 0;
    }
    if (!strcmp(q->key, "angles"))
        complete_sense(line);
    if (!strcmp(q->head, "tacho") && !strcmp(line, "none"))
        return 0;
    int result = interview_judge(q->head, q->key, line, q->rest ? q->rest : "", why, room);
    if (result == 0 && !*why && !strcmp(q->head, "tacho") && !has_channel(v->channels, line))
        snprintf(why, room, "no such channel, the recording has %zu: '%.100s'", v->channels->count,
                 line);
    return result;
}

/* Asks until the sheet takes the answer, TRIES times at most. *answer stays NULL where it is left open. */
static int ask(struct interview *v, const struct question *q, const char **answer)
{
    char line[TYPED_ROOM], why[TEXT_ROOM];
    for (int i = 0; i < TRIES; i++) {
        if (take_line(q->text, line) != 0)
            return ENDED;
        if (!*line && q->usual)
            snprintf(line, sizeof line, "%s", q->usual);
        if (!*line)
            return 0;
        if (judge(v, q, line, why, sizeof why) != 0)
            return NO_MEMORY;
        if (!*why) {
            *answer = keep(v, line);
            return *answer ? 0 : NO_MEMORY;
        }
        message("%s", why);
    }
    message("stays open in the sheet: '%s'", q->head ? q->key : "output");
    return 0;
}

/* ---- the questions ---- */

static bool is_sensor(const struct interview *v, size_t i)
{
    const struct channels_one *one = &v->channels->items[i];
    const char *tacho = v->outline->answers.tacho;
    return one->use == CHANNELS_SENSOR && !(tacho && !strcmp(tacho, one->channel));
}

static bool is_name_free(const struct interview *v, const char *name, size_t but)
{
    for (size_t i = 0; i < v->channels->count; i++)
        if (i != but && !strcmp(v->channels->items[i].name, name))
            return false;
    return strcmp(name, "tacho") != 0;
}

/* Asks for a name that the sheet takes; *name stays where the answer is empty or never right. */
static int ask_name(struct interview *v, const char *question, size_t but, const char **name)
{
    char line[TYPED_ROOM];
    for (int i = 0; i < TRIES; i++) {
        if (take_line(question, line) != 0)
            return ENDED;
        if (!*line)
            return 0;
        const char *fault = sheet_keys_name_fault(line);
        if (!fault && !is_name_free(v, line, but))
            fault = "there is one of that name";
        if (!fault) {
            *name = keep(v, line);
            return *name ? 0 : NO_MEMORY;
        }
        message("%s: '%s'", fault, line);
    }
    return 0;
}

static int name_sensors(struct interview *v)
{
    for (size_t i = 0; i < v->channels->count; i++) {
        struct channels_one *one = &v->channels->items[i];
        char question[TEXT_ROOM];
        const char *name = NULL;
        if (!is_sensor(v, i))
            continue;
        snprintf(question, sizeof question, "Name of the sensor on channel '%s' (empty: %s)",
                 one->channel, one->name);
        int result = ask_name(v, question, i, &name);
        if (result != 0)
            return result;
        if (name)
            snprintf(one->name, sizeof one->name, "%s", name);
    }
    return 0;
}

static int name_planes(struct interview *v)
{
    size_t count = 0;
    while (!v->planes_given && count < INTERVIEW_PLANES) {
        const char *name = NULL;
        int result = ask_name(v,
                              count ? "Another plane (empty: no more)"
                                    : "Name of the plane where weights go (empty: rotor)",
                              v->channels->count, &name);
        for (size_t i = 0; name && i < count; i++)
            if (!strcmp(v->planes[i], name))
                name = NULL; /* said already */
        if (result != 0)
            return result;
        if (!name)
            break;
        v->planes[count++] = name;
    }
    if (count > 0) {
        v->outline->planes = v->planes;
        v->outline->plane_count = count;
    }
    return 0;
}

static int ask_weight(struct interview *v, size_t run, size_t plane)
{
    const struct outline *o = v->outline;
    const struct outline_answers *a = &o->answers;
    char text[TEXT_ROOM], head[NAME_ROOM + 8], key[NAME_ROOM + 8], rest[TEXT_ROOM];
    snprintf(text, sizeof text, "Weight mounted on plane '%s' in run '%s' (%s; empty: none)",
             o->planes[plane], o->runs[run],
             a->positions ? "70 g at position 3" : "60 g at 30 deg");
    snprintf(head, sizeof head, "run %s", o->runs[run]);
    snprintf(key, sizeof key, "weight %s", o->planes[plane]);
    snprintf(rest, sizeof rest, "[plane %s]\nradius = %s%s%s", o->planes[plane],
             a->radius ? a->radius : "1 m", a->positions ? "\npositions = " : "",
             a->positions ? a->positions : "");
    const struct question question = {text, head, key, rest, NULL};
    const char *weight = NULL;
    int result = ask(v, &question, &weight);
    if (result == 0 && weight)
        v->weights[v->outline->weight_count++] = (struct outline_weight){run, plane, weight};
    return result;
}

static int ask_weights(struct interview *v)
{
    struct outline *o = v->outline;
    int result = 0;
    if (v->weights_given)
        return 0;
    v->weights = calloc(o->run_count * o->plane_count, sizeof *v->weights);
    if (!v->weights)
        return NO_MEMORY;
    o->weights = v->weights;
    for (size_t r = 0; result == 0 && r < o->run_count; r++)
        for (size_t p = 0; result == 0 && p < o->plane_count; p++)
            result = ask_weight(v, r, p);
    return result;
}

/* The answer to a question that is not answered by an option. */
static int want(struct interview *v, const char **answer, const char *text, const char *head,
                const char *key, const char *rest)
{
    const struct question question = {text, head, key, rest, NULL};
    return *answer ? 0 : ask(v, &question, answer);
}

static int ask_about_sensors(struct interview *v)
{
    struct outline_answers *a = &v->outline->answers;
    char rest[TYPED_ROOM + 32];
    bool open = false;
    for (size_t i = 0; i < v->channels->count; i++)
        open = open || (is_sensor(v, i) && !*v->channels->items[i].unit);
    int result = name_sensors(v);
    if (result == 0 && open)
        result = want(v, &a->unit, "What the sensors measure (g, m/s2, mm/s, in/s, um, mil)",
                      "sensor x", "unit", "channel = 1");
    snprintf(rest, sizeof rest, "channel = 1\nunit = %s", a->unit ? a->unit : "g");
    if (result == 0 && open)
        result = want(v, &a->scale, "Their scale (100 mV/g; empty: the recording is in that unit)",
                      "sensor x", "scale", rest);
    if (result == 0 && !v->channels->text)
        result = want(v, &a->full_scale, "Volts at digital full scale (10 V)", "recording",
                      "full scale", "");
    if (result == 0 && v->channels->text && !v->channels->has_rate)
        result = want(v, &a->rate, "Rate of the recording (12800 Hz)", "recording", "rate", "");
    return result;
}

static int ask_about_job(struct interview *v)
{
    struct outline_answers *a = &v->outline->answers;
    bool tacho = false;
    for (size_t i = 0; i < v->channels->count; i++)
        tacho = tacho || v->channels->items[i].use == CHANNELS_TACHO;
    int result = want(v, v->output, "File to write the sheet to (job.ini; empty: show it here)",
                      NULL, "", "");
    if (result == 0)
        result = want(v, &a->title, "Title of the job", "job", "title", "");
    if (result == 0)
        result = want(v, &a->angles, "Do angles of weights count 'against' or 'with' rotation",
                      "job", "angles", "");
    if (result == 0 && !tacho)
        result = want(v, &a->tacho, "Channel of the tacho (none: there is none)", "tacho",
                      "channel", "");
    return result;
}

static int ask_about_rotor(struct interview *v)
{
    struct outline_answers *a = &v->outline->answers;
    char text[80], seen[40];
    const double rpm = v->channels->speed_rpm;
    snprintf(seen, sizeof seen, "%.0f rpm", rpm);
    snprintf(text, sizeof text, "Service speed (%s%s)", isnan(rpm) ? "1480 rpm" : seen,
             isnan(rpm) ? "" : " as recorded, if empty");
    const struct question speed = {text, "rotor", "service speed", "", isnan(rpm) ? NULL : seen};
    int result = want(v, &a->mass, "Mass of the rotor (340 kg)", "rotor", "mass", "");
    if (result == 0 && !a->speed)
        result = ask(v, &speed, &a->speed);
    if (result == 0)
        result = want(v, &a->grade, "Balance quality grade, ISO 21940-11 (G6.3; empty: none)",
                      "rotor", "grade", "");
    return result;
}

static int ask_about_planes(struct interview *v)
{
    struct outline_answers *a = &v->outline->answers;
    int result = name_planes(v);
    if (result == 0)
        result = want(v, &a->radius, "Radius where weights are fixed (410 mm)", "plane x", "radius",
                      "");
    if (result == 0)
        result = want(v, &a->positions, "Positions for weights (12 from 0 deg; empty: any angle)",
                      "plane x", "positions", "radius = 1 m");
    if (result == 0)
        result = want(v, &a->stock, "Pieces at hand (10 20 50 g; empty: any mass)", "plane x",
                      "stock", "radius = 1 m");
    if (result == 0)
        result = want(v, &a->target, "Target (1.8 mm/s rms)", "aim", "target", "");
    return result;
}

int interview_hold(struct interview *v)
{
    fputs("What is left empty stays open in the sheet, as a comment.\n", stderr);
    int result = ask_about_job(v);
    if (result == 0)
        result = ask_about_sensors(v);
    if (result == 0)
        result = ask_about_rotor(v);
    if (result == 0)
        result = ask_about_planes(v);
    if (result == 0)
        result = ask_weights(v);
    if (result == 0)
        return STATUS_DONE;
    if (result == NO_MEMORY)
        return message_no_memory();
    fputc('\n', stderr);
    message("the answers ended early: nothing was written");
    return STATUS_USAGE;
}

void interview_release(struct interview *v)
{
    for (size_t i = 0; i < v->typed_count; i++)
        free(v->typed[i]);
    free(v->typed);
    free(v->weights);
    *v = (struct interview){0};
}
