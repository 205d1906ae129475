#include "vet/findings.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void findings_init(struct findings *findings, const struct limits *limits)
{
    *findings = (struct findings){.limits = limits};
}

void findings_clear(struct findings *findings)
{
    findings->count = 0;
}

void findings_release(struct findings *findings)
{
    free(findings->items);
    *findings = (struct findings){0};
}

static struct finding *grow(struct findings *f)
{
    if (f->count == f->room) {
        size_t room = f->room ? 2 * f->room : 32;
        struct finding *more = realloc(f->items, room * sizeof *more);
        if (!more) {
            f->failed = true;
            return NULL;
        }
        f->items = more;
        f->room = room;
    }
    return &f->items[f->count++];
}

void findings_instead(struct findings *findings, const char *advice)
{
    findings->instead = advice;
}

/* Adds the limit and the advice to what was seen. */
static void finish_text(struct finding *item, const char *advice)
{
    char *text = item->text;
    size_t used = strlen(text), room = sizeof item->text;

    if (item->limit > 0)
        used += (size_t)snprintf(text + used, room - used, ", limit %g%s%s", item->limit,
                                 item->unit[0] ? " " : "", item->unit);
    if (used < room && item->ruling != RULING_OK)
        snprintf(text + used, room - used, ": %s", advice);
}

static enum ruling add(struct findings *f, const struct finding *from, const char *format,
                       va_list arguments)
{
    struct finding *item = grow(f);
    const char *advice = f->instead ? f->instead : f->limits->rows[from->check].advice;

    f->instead = NULL;
    if (!item)
        return from->ruling;
    *item = *from;
    vsnprintf(item->text, sizeof item->text - 200, format, arguments); /* 200: limit and advice */
    finish_text(item, advice);
    return item->ruling;
}

enum ruling findings_add(struct findings *findings, enum check check, int run, int sensor,
                         double value, const char *format, ...)
{
    struct finding item = {check, RULING_OK, run, sensor, value, NAN, "", ""};
    va_list arguments;
    enum ruling ruling;

    if (findings->limits->rows[check].off) {
        findings->instead = NULL;
        return RULING_OK;
    }
    item.unit = findings->limits->rows[check].unit;
    item.ruling = limits_judge(findings->limits, check, value, &item.limit);
    va_start(arguments, format);
    ruling = add(findings, &item, format, arguments);
    va_end(arguments);
    return ruling;
}

enum ruling findings_rule(struct findings *findings, enum check check, enum ruling ruling, int run,
                          int sensor, double value, double limit, const char *unit,
                          const char *format, ...)
{
    struct finding item = {check, ruling, run, sensor, value, limit, unit, ""};
    va_list arguments;

    if (findings->limits->rows[check].off) {
        findings->instead = NULL;
        return RULING_OK;
    }
    va_start(arguments, format);
    ruling = add(findings, &item, format, arguments);
    va_end(arguments);
    return ruling;
}

double findings_figure(double value)
{
    double step = pow(10, floor(log10(fabs(value))) - 1);

    if (!(step > 0.01)) /* with 0, whose logarithm is minus infinity */
        step = 0.01;
    return isfinite(value) ? round(value / step) * step : value;
}
