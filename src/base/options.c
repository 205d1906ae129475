#include "base/options.h"

#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/message.h"
#include "base/nearest.h"

struct parser {
    const struct usage *usage;
    struct option_list *operands;
    int errors;
    bool help, version;
};

static int list_add(struct option_list *list, const char *item)
{
    const char **items = realloc(list->items, (list->count + 1) * sizeof *items);
    if (!items) {
        message_no_memory();
        return -1;
    }
    items[list->count++] = item;
    list->items = items;
    return 0;
}

void option_list_release(struct option_list *list)
{
    free(list->items);
    list->items = NULL;
    list->count = 0;
}

static const struct option *find_option(const struct usage *usage, const char *name, size_t length)
{
    for (const struct option *o = usage->options; o && o->name; o++) {
        if (length == 1 && o->letter == name[0])
            return o;
        if (strlen(o->name) == length && !strncmp(o->name, name, length))
            return o;
    }
    return NULL;
}

static void take_choice(struct parser *p, const struct option *o, const char *text)
{
    char known[256] = "";
    for (int i = 0; o->choices[i]; i++) {
        if (!strcmp(o->choices[i], text)) {
            *(int *)o->value = i;
            return;
        }
        size_t used = strlen(known);
        snprintf(known + used, sizeof known - used, "%s%s", i ? ", " : "", o->choices[i]);
    }
    message("unknown choice for --%s: '%s' (one of %s)", o->name, text, known);
    p->errors++;
}

static void take_number(struct parser *p, const struct option *o, const char *text)
{
    char *end;
    errno = 0;
    double value = strtod(text, &end);
    if (end == text || *end || !isfinite(value)) {
        message("not a number for --%s: '%s'", o->name, text);
        p->errors++;
    } else if (value < o->min || value > o->max) {
        message("out of range for --%s: '%s' (%g to %g%s%s)", o->name, text, o->min, o->max,
                o->unit ? " " : "", o->unit ? o->unit : "");
        p->errors++;
    } else {
        *(double *)o->value = value;
    }
}

static void take_value(struct parser *p, const struct option *o, const char *text)
{
    switch (o->type) {
    case OPTION_TEXT:
        *(const char **)o->value = text;
        break;
    case OPTION_LIST:
        if (list_add(o->value, text) < 0)
            p->errors++;
        break;
    case OPTION_CHOICE:
        take_choice(p, o, text);
        break;
    case OPTION_NUMBER:
        take_number(p, o, text);
        break;
    case OPTION_FLAG:
        message("--%s takes no value: '%s'", o->name, text);
        p->errors++;
        break;
    }
}

static void tell_unknown(struct parser *p, const char *argument)
{
    const char *names[32];
    char known[32][32], wrong[64], meant[NEAREST_ROOM];
    size_t count = 0;
    for (const struct option *o = p->usage->options; o && o->name && count < 30; o++)
        snprintf(known[count++], sizeof *known, "--%.29s", o->name);
    snprintf(known[count++], sizeof *known, "--help");
    snprintf(known[count++], sizeof *known, "--version");
    for (size_t i = 0; i < count; i++)
        names[i] = known[i];
    snprintf(wrong, sizeof wrong, "%.*s", (int)strcspn(argument, "="), argument);
    message("unknown option: '%s'%s", argument, nearest_hint(wrong, names, count, meant));
    p->errors++;
}

/* Handles the option at argv[i]; returns the index of the last argument used. */
static int take_option(struct parser *p, int argc, char **argv, int i)
{
    const char *name = argv[i] + (argv[i][1] == '-' ? 2 : 1);
    const char *equals = argv[i][1] == '-' ? strchr(name, '=') : NULL;
    size_t length = equals ? (size_t)(equals - name) : strlen(name);

    if (!strcmp(argv[i], "--help") || !strcmp(argv[i], "-h")) {
        p->help = true;
        return i;
    }
    if (!strcmp(argv[i], "--version")) {
        p->version = true;
        return i;
    }
    const struct option *o = find_option(p->usage, name, length);
    if (!o || (argv[i][1] != '-' && length != 1)) {
        tell_unknown(p, argv[i]);
    } else if (equals) {
        take_value(p, o, equals + 1);
    } else if (o->type == OPTION_FLAG) {
        *(bool *)o->value = true;
    } else if (i + 1 < argc) {
        take_value(p, o, argv[++i]);
    } else {
        message("--%s needs a value (%s)", o->name, o->unit ? o->unit : "VALUE");
        p->errors++;
    }
    return i;
}

int options_parse(const struct usage *usage, int argc, char **argv, struct option_list *operands)
{
    struct parser p = {.usage = usage, .operands = operands};
    bool only_operands = false;

    operands->items = NULL;
    operands->count = 0;
    for (int i = 1; i < argc; i++) {
        if (!only_operands && !strcmp(argv[i], "--"))
            only_operands = true;
        else if (!only_operands && argv[i][0] == '-' && argv[i][1])
            i = take_option(&p, argc, argv, i);
        else if (list_add(operands, argv[i]) < 0)
            p.errors++;
    }
    if (p.help) {
        options_help(usage);
        return OPTIONS_STOP;
    }
    if (p.version) {
        printf("lopside %s\n", LOPSIDE_VERSION);
        return OPTIONS_STOP;
    }
    if (p.errors > 0) /* an argument may be missing only because an option was not understood */
        return OPTIONS_MISUSE;
    if (operands->count < usage->least) {
        message("missing argument: %s (see 'lopside help%s%s')", usage->operands,
                usage->stage ? " " : "", usage->stage ? usage->stage : "");
        p.errors++;
    } else if (operands->count > usage->most) {
        message("too many arguments: '%s'", operands->items[usage->most]);
        p.errors++;
    }
    return p.errors ? OPTIONS_MISUSE : OPTIONS_GO;
}

static void help_option(const struct option *o)
{
    char left[64];
    char letter[8] = "";
    if (o->letter)
        snprintf(letter, sizeof letter, "-%c, ", o->letter);
    snprintf(left, sizeof left, "%s--%s%s%s", letter, o->name, o->unit ? " " : "",
             o->unit ? o->unit : "");
    printf("  %-22s %s", left, o->help);
    if (o->type == OPTION_CHOICE)
        for (int i = 0; o->choices[i]; i++)
            printf("%s%s", i ? ", " : ": ", o->choices[i]);
    if (o->type == OPTION_NUMBER)
        printf(" (%g to %g)", o->min, o->max);
    if (o->fallback)
        printf(" [%s]", o->fallback);
    putchar('\n');
}

void options_help(const struct usage *usage)
{
    printf("lopside%s%s - %s\n\nUsage: lopside%s%s%s%s%s\n", usage->stage ? " " : "",
           usage->stage ? usage->stage : "", usage->summary, usage->stage ? " " : "",
           usage->stage ? usage->stage : "",
           usage->options && usage->options->name ? " [OPTION...]" : "",
           *usage->operands ? " " : "", usage->operands);
    puts("\nOptions:");
    for (const struct option *o = usage->options; o && o->name; o++)
        help_option(o);
    puts("  -h, --help             print this and stop\n  --version              print the version "
         "and stop");
    if (usage->details)
        printf("\n%s\n", usage->details);
}
