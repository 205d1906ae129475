#include "solve/remedy.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define NAMED 2  /* of a list, by name; the rest is counted */
#define CHECKS 2 /* groups of refusals in one text */

bool remedy_is_diagnosis(const char *check)
{
    return !strcmp(check, "lag-follows-weight") || !strcmp(check, "sensor-swapped") ||
           !strcmp(check, "sensor-turned") || !strcmp(check, "tape-moved");
}

static bool in_aim(const struct model *m, int sensor)
{
    for (size_t r = 0; r < m->row_count; r++)
        if ((int)m->rows[r].sensor == sensor && m->rows[r].in_aim)
            return true;
    return sensor < 0;
}

/* "'a', 'b' and 3 more" of the things that `wanted` marks. */
static void list_names(const struct job *job, const bool *wanted, bool runs, char *text,
                       size_t size)
{
    size_t count = runs ? job->run_count : job->sensor_count, found = 0, length = 0;
    text[0] = '\0';
    for (size_t i = 0; i < count; i++) {
        if (!wanted[i] || found++ >= NAMED)
            continue;
        length += (size_t)snprintf(text + length, size - length, "%s'%s'", length ? ", " : "",
                                   runs ? job->runs[i].name : job->sensors[i].name);
    }
    if (found > NAMED)
        snprintf(text + length, size - length, " and %zu more", found - NAMED);
}

/* The part of a finding's text that says what to do: after its last colon. */
static const char *what_to_do(const char *text)
{
    const char *last = text;
    for (const char *at = strstr(text, ": "); at; at = strstr(at + 2, ": "))
        last = at + 2;
    return last;
}

/* Which of the checks that refuse says most: what makes others refuse, too, comes first. */
static int rank_of(const char *check)
{
    static const char *const first[] = {"same-recording", "tacho",        "service-speed", "beat",
                                        "repeat",         "trial-effect", "linearity"};
    for (size_t i = 0; i < sizeof first / sizeof *first; i++)
        if (!strcmp(check, first[i]))
            return (int)i;
    return (int)(sizeof first / sizeof *first);
}

/* A trial weight that is likely to show an effect, kg: by the 10 % practice if that is more than
 * was tried, else scaled to the limit of the check; NaN: not known. */
static double larger_trial(const struct job *job, const struct remedy_cause *cause)
{
    struct advice_trial trials[16];
    if (job->plane_count > 16)
        return NAN;
    advice_trials(job, trials);
    for (size_t p = 0; p < job->plane_count; p++) {
        double tried = cabs(job_run_weight(job, (size_t)cause->run, p));
        if (!(tried > 0))
            continue;
        if (trials[p].mass > 1.2 * tried) /* else it would show no more */
            return trials[p].mass;
        return tried * cause->limit / cause->value;
    }
    return NAN;
}

static void remedy_words(const struct model *m, const struct remedy_cause *cause, const char *names,
                         const char *sensors, char *text, size_t size)
{
    const struct job *job = m->job;
    bool us = job->units == UNITS_US;
    double kg = !strcmp(cause->check, "trial-effect") ? larger_trial(job, cause) : NAN;
    if (!strcmp(cause->check, "same-recording"))
        snprintf(text, size, "%s: name the file that belongs to each run; no new run is needed",
                 names);
    else if (isfinite(kg) && kg > 0)
        snprintf(text, size, "%s: repeat with a larger trial weight, about %s %s%s", names,
                 judge_figure(kg / (us ? 0.45359237 / 16 : 1e-3), 2).text, us ? "oz" : "g",
                 sensors);
    else
        snprintf(text, size, "%s%s: %.160s", names, sensors, what_to_do(cause->text));
}

/* All that one check refuses. */
static void add_check(const struct model *m, const struct remedy_cause *causes, size_t count,
                      const struct remedy_cause *first, char *text, size_t size)
{
    bool runs[256] = {false}, sensors[256] = {false};
    const struct job *job = m->job;
    if (job->run_count > 256 || job->sensor_count > 256)
        return;
    size_t run_count = 0, sensor_count = 0;
    for (size_t i = 0; i < count; i++) {
        const struct remedy_cause *c = &causes[i];
        if (!c->refused || strcmp(c->check, first->check) != 0 || !in_aim(m, c->sensor))
            continue;
        run_count += !runs[c->run];
        runs[c->run] = true;
        if (c->sensor >= 0) {
            sensor_count += !sensors[c->sensor];
            sensors[c->sensor] = true;
        }
    }
    char list[160], names[180], which[180] = "";
    list_names(job, runs, true, list, sizeof list);
    snprintf(names, sizeof names, "run%s %s", run_count == 1 ? "" : "s", list);
    if (sensor_count > 0) {
        list_names(job, sensors, false, list, sizeof list);
        snprintf(which, sizeof which, " (sensor%s %s)", sensor_count == 1 ? "" : "s", list);
    }
    remedy_words(m, first, names, which, text, size);
}

/* Appends a whole sentence or nothing. */
static void append(struct advice_next *next, const char *more)
{
    size_t length = strlen(next->text), wanted = strlen(more) + 2;
    if (length + wanted < sizeof next->text)
        snprintf(next->text + length, sizeof next->text - length, "%s%s", length ? "; " : "", more);
}

/* The refusing cause of the lowest rank above `above` of the aim's sensors; NULL: none. */
static const struct remedy_cause *
next_cause(const struct model *m, const struct remedy_cause *causes, size_t count, int above)
{
    const struct remedy_cause *best = NULL;
    for (size_t i = 0; i < count; i++) {
        int rank = rank_of(causes[i].check);
        if (causes[i].refused && rank > above && in_aim(m, causes[i].sensor) &&
            (!best || rank < rank_of(best->check)))
            best = &causes[i];
    }
    return best;
}

/* The first diagnosis, without its limit; false: there is none. */
static bool diagnosis(const struct model *m, const struct remedy_cause *causes, size_t count,
                      char *text, size_t size)
{
    for (size_t i = 0; i < count; i++) {
        bool said = causes[i].refused && !strcmp(causes[i].check, "prediction");
        if ((!said && !remedy_is_diagnosis(causes[i].check)) || !in_aim(m, causes[i].sensor))
            continue;
        snprintf(text, size, "%.250s", causes[i].text);
        char *limit = strstr(text, ", limit "), *advice = limit ? strstr(limit, ": ") : NULL;
        if (advice)
            memmove(limit, advice, strlen(advice) + 1);
        return true;
    }
    return false;
}

void remedy_lead(const struct model *m, const struct remedy_cause *causes, size_t count,
                 struct advice_next *next)
{
    struct advice_next own = *next;
    if (!diagnosis(m, causes, count, own.text, sizeof own.text))
        return;
    append(&own, next->text);
    memcpy(next->text, own.text, sizeof next->text);
}

/* 2x that is many times 1x asks for the tacho first, whatever else was refused. */
static void ask_for_shaft(const struct model *m, const struct remedy_cause *causes, size_t count,
                          struct advice_next *next)
{
    for (size_t i = 0; i < count; i++) {
        const struct remedy_cause *c = &causes[i];
        if (strcmp(c->check, "two-x") != 0 || !(c->value >= REMEDY_SHAFT_PCT) ||
            !in_aim(m, c->sensor))
            continue;
        append(next, "2x is many times 1x: see whether the tacho counts this shaft");
        return;
    }
}

void remedy_step(const struct model *m, const struct remedy_cause *causes, size_t count,
                 struct advice_next *next)
{
    struct advice_next own = {.step = next->step};
    int above = -1;
    bool any = diagnosis(m, causes, count, own.text, sizeof own.text);
    for (int k = 0; k < CHECKS; k++) {
        const struct remedy_cause *c = next_cause(m, causes, count, above);
        char words[400];
        if (!c || (k > 0 && rank_of(c->check) > 6)) /* a further one only of those that lead */
            break;
        above = rank_of(c->check);
        words[0] = '\0';
        add_check(m, causes, count, c, words, sizeof words);
        append(&own, words);
        any = true;
    }
    if (any && own.text[0])
        memcpy(next->text, own.text, sizeof next->text);
    ask_for_shaft(m, causes, count, next);
}
