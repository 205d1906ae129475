#include "sheet/sheet_keys.h"

#include <stdio.h>
#include <string.h>

#include "base/nearest.h"
#include "stream/job.h"

#define COUNT(array) (sizeof(array) / sizeof((array)[0]))
#define KEYS_MOST 32

#define LAYOUT_KEYS                                                                                \
    {"full scale", 0, NULL}, {"rate", 0, NULL}, {"time column", 0, NULL}, {"separator", 0, NULL},  \
        {"decimal", 0, NULL},                                                                      \
    {                                                                                              \
        "skip", 0, NULL                                                                            \
    }

static const struct sheet_key JOB[] = {
    {"title", 0, NULL}, {"angles", 0, NULL}, {"phase", 0, NULL}, {"units", 0, NULL}};
static const struct sheet_key ROTOR[] = {{"mass", 0, NULL},         {"service speed", 0, NULL},
                                         {"rotation", 0, NULL},     {"seen from", 0, NULL},
                                         {"grade", 0, NULL},        {"support", 0, NULL},
                                         {"bearing span", 0, NULL}, {"mass centre", 0, NULL}};
static const struct sheet_key RECORDING[] = {LAYOUT_KEYS};
static const struct sheet_key TACHO[] = {
    {"channel", 0, NULL}, {"edge", 0, NULL}, {"marks", 0, NULL}, {"level", 0, NULL}};
static const struct sheet_key SENSOR[] = {{"channel", 0, NULL},
                                          {"unit", 0, NULL},
                                          {"scale", 0, NULL},
                                          {"show", 0, NULL},
                                          {"at", 0, NULL}};
static const struct sheet_key PLANE[] = {
    {"radius", 0, NULL}, {"positions", 0, NULL},   {"stock", 0, NULL}, {"pieces", 0, NULL},
    {"most", 0, NULL},   {"most in all", 0, NULL}, {"taken", 0, NULL}, {"work", 0, NULL},
    {"hole", 0, NULL},   {"density", 0, NULL},     {"depth", 0, NULL}};
static const struct sheet_key RUN[] = {{"file", SHEET_KEY_AGAIN, NULL},
                                       {"when", 0, NULL},
                                       {"weight", SHEET_KEY_SUBJECT | SHEET_KEY_AGAIN, NULL},
                                       {"without", SHEET_KEY_SUBJECT, NULL},
                                       {"channel", SHEET_KEY_SUBJECT, NULL},
                                       {"scale", SHEET_KEY_SUBJECT, NULL},
                                       {"speed", 0, NULL},
                                       {"reading", SHEET_KEY_SUBJECT, NULL},
                                       {"condition", 0, NULL},
                                       {"role", 0, NULL},
                                       {"speeds", 0, NULL},
                                       LAYOUT_KEYS};
static const struct sheet_key AIM[] = {{"target", 0, NULL},
                                       {"target", SHEET_KEY_SUBJECT, NULL},
                                       {"minimise", 0, NULL},
                                       {"mounted", 0, NULL},
                                       {"repeatability", 0, NULL},
                                       {"responses", 0, NULL},
                                       {"tolerance", 0, NULL},
                                       {"zones", 0, NULL},
                                       {"importance", SHEET_KEY_SUBJECT, NULL}};
/* The checks and the units of their figures. */
static const struct sheet_key LIMITS[] = {{"readable", 0, NULL},
                                          {"same-recording", 0, NULL},
                                          {"length", 0, "turns"},
                                          {"service-speed", 0, "%"},
                                          {"speed-steady", 0, "%"},
                                          {"speed-match", 0, "%"},
                                          {"amplitude-steady", 0, "%"},
                                          {"phase-steady", 0, "deg"},
                                          {"drift", 0, "%"},
                                          {"beat", 0, "%"},
                                          {"one-x-share", 0, "%"},
                                          {"two-x", 0, "%"},
                                          {"half-order", 0, "%"},
                                          {"neighbour", 0, "%"},
                                          {"clipping", 0, "samples"},
                                          {"sensor-dead", 0, NULL},
                                          {"tacho", 0, "%"},
                                          {"phase-reference", 0, NULL},
                                          {"repeat", 0, "%"},
                                          {"trial-effect", 0, "%"},
                                          {"weight-force", 0, "%"},
                                          {"correction-force", 0, "%"},
                                          {"tape-moved", 0, ""},
                                          {"sensor-swapped", 0, ""},
                                          {"sensor-turned", 0, ""},
                                          {"near-resonance", 0, "deg"},
                                          {"low-level", 0, NULL},
                                          {"linearity", 0, "s.e."},
                                          {"conditioning", 0, ""},
                                          {"lag-follows-weight", 0, "s.e."},
                                          {"response-changed", 0, "s.e."}};

struct kind {
    const char *name;
    bool named;
    const struct sheet_key *keys;
    size_t count;
};

static const struct kind KINDS[SHEET_KINDS] = {
    [SHEET_JOB] = {"job", false, JOB, COUNT(JOB)},
    [SHEET_ROTOR] = {"rotor", false, ROTOR, COUNT(ROTOR)},
    [SHEET_RECORDING] = {"recording", false, RECORDING, COUNT(RECORDING)},
    [SHEET_TACHO] = {"tacho", false, TACHO, COUNT(TACHO)},
    [SHEET_SENSOR] = {"sensor", true, SENSOR, COUNT(SENSOR)},
    [SHEET_PLANE] = {"plane", true, PLANE, COUNT(PLANE)},
    [SHEET_RUN] = {"run", true, RUN, COUNT(RUN)},
    [SHEET_AIM] = {"aim", false, AIM, COUNT(AIM)},
    [SHEET_LIMITS] = {"limits", false, LIMITS, COUNT(LIMITS)}};

_Static_assert(COUNT(LIMITS) <= KEYS_MOST && COUNT(RUN) <= KEYS_MOST, "KEYS_MOST too small");

/* ---- sections ---- */

const char *sheet_keys_name_fault(const char *name)
{
    size_t length = strlen(name);
    if (length == 0)
        return "no name";
    if (length >= NAME_ROOM)
        return "name longer than 40 bytes";
    if (strpbrk(name, ":=;#]"))
        return "a name may hold none of ':', '=', ';', '#', ']'";
    if (strchr(" \t", name[0]) || strchr(" \t", name[length - 1]))
        return "name with a blank at an end";
    return NULL;
}

static int find_kind(const char *word, size_t length)
{
    for (int i = 0; i < SHEET_KINDS; i++)
        if (strlen(KINDS[i].name) == length && !strncmp(KINDS[i].name, word, length))
            return i;
    return -1;
}

static void tell_unknown_section(const struct sheet_section *s, size_t length,
                                 struct sheet_errors *errors)
{
    const char *names[SHEET_KINDS];
    char word[48], hint[NEAREST_ROOM];
    for (int i = 0; i < SHEET_KINDS; i++)
        names[i] = KINDS[i].name;
    snprintf(word, sizeof word, "%.*s", length < 47 ? (int)length : 47, s->text);
    sheet_errors_add(errors, s->line, "unknown section: '[%.100s]'%s", s->text,
                     nearest_hint(word, names, SHEET_KINDS, hint));
}

/* What a section of that kind cannot do without; NULL: no single key. */
static const char *needed_in(int kind)
{
    switch (kind) {
    case SHEET_PLANE:
        return "'radius'";
    case SHEET_SENSOR:
        return "'channel' and 'unit'";
    case SHEET_TACHO:
        return "'channel'";
    default:
        return NULL;
    }
}

static void classify_section(struct sheet_section *s, struct sheet_errors *errors)
{
    size_t length = strcspn(s->text, " \t");
    const char *name = s->text + length + strspn(s->text + length, " \t");
    int kind = find_kind(s->text, length);
    if (kind < 0) {
        tell_unknown_section(s, length, errors);
        return;
    }
    if (!KINDS[kind].named && *name) {
        sheet_errors_add(errors, s->line, "section takes no name: '[%.100s]'", s->text);
        return;
    }
    const char *fault = KINDS[kind].named ? sheet_keys_name_fault(name) : NULL;
    if (fault) {
        sheet_errors_add(errors, s->line, "%s: '[%.100s]'", fault, s->text);
        return;
    }
    if (s->entries == 0 && needed_in(kind))
        sheet_errors_add(errors, s->line, "missing: %s in '[%.100s]'", needed_in(kind), s->text);
    else if (s->entries == 0)
        sheet_errors_add(errors, s->line, "empty section: '[%.100s]'", s->text);
    s->kind = kind;
    s->name = name;
}

/* The first section of the same kind and name, or `index` itself. */
static size_t first_of(const struct sheet_lines *lines, size_t index)
{
    const struct sheet_section *s = &lines->sections[index];
    for (size_t i = 0; s->kind >= 0 && i < index; i++)
        if (lines->sections[i].kind == s->kind && !strcmp(lines->sections[i].name, s->name))
            return i;
    return index;
}

static void check_sections(struct sheet_lines *lines, struct sheet_errors *errors)
{
    for (size_t i = 0; i < lines->section_count; i++)
        classify_section(&lines->sections[i], errors);
    for (size_t i = lines->section_count; i-- > 0;) {
        size_t first = first_of(lines, i);
        if (first == i)
            continue;
        sheet_errors_add(errors, lines->sections[i].line,
                         "section given twice: '[%.100s]' (first in line %d)",
                         lines->sections[i].text, lines->sections[first].line);
        for (size_t e = 0; e < lines->entry_count; e++)
            if (lines->entries[e].section == i)
                lines->entries[e].section = first;
        lines->sections[i].kind = -1;
    }
}

/* ---- keys ---- */

/* The key's text with each run of blanks as one; false where it is longer than any key. */
static bool squeeze(const char *text, char *out, size_t room)
{
    size_t length = 0;
    for (; *text; text++) {
        if (strchr(" \t", *text) && length > 0 && out[length - 1] == ' ')
            continue;
        if (length + 1 >= room)
            return false;
        out[length++] = strchr(" \t", *text) ? ' ' : *text;
    }
    out[length] = '\0';
    return true;
}

static const struct sheet_key *find_key(const struct kind *kind, const char *name, bool subject)
{
    for (size_t i = 0; i < kind->count; i++)
        if (!strcmp(kind->keys[i].name, name) &&
            subject == ((kind->keys[i].flags & SHEET_KEY_SUBJECT) != 0))
            return &kind->keys[i];
    return NULL;
}

static void tell_unknown_key(const struct sheet_entry *e, const struct kind *kind,
                             struct sheet_errors *errors)
{
    const char *names[KEYS_MOST];
    char hint[NEAREST_ROOM];
    if (e->text[0] == ';') {
        sheet_errors_add(errors, e->line, "a comment begins with '#', not with ';': '%.100s'",
                         e->text);
        return;
    }
    for (size_t i = 0; i < kind->count; i++)
        names[i] = kind->keys[i].name;
    sheet_errors_add(errors, e->line, "unknown key in [%s]: '%.100s'%s", kind->name, e->text,
                     nearest_hint(e->text, names, kind->count, hint));
}

/* `word` alone, a key that needs a name behind it: says so. */
static bool lacks_subject(const struct sheet_entry *e, const struct kind *kind, const char *word,
                          struct sheet_errors *errors)
{
    if (!find_key(kind, word, true))
        return false;
    sheet_errors_add(errors, e->line, "a %s's name must stand behind the key: '%s'",
                     !strcmp(word, "weight")       ? "plane"
                     : !strcmp(word, "importance") ? "condition"
                                                   : "sensor",
                     word);
    return true;
}

static void classify_key(struct sheet_entry *e, const struct kind *kind,
                         struct sheet_errors *errors)
{
    char plain[128] = "", word[48];
    bool short_enough = squeeze(e->text, plain, sizeof plain);
    const struct sheet_key *key = short_enough ? find_key(kind, plain, false) : NULL;
    if (!key) {
        size_t length = strcspn(e->text, " \t");
        snprintf(word, sizeof word, "%.*s", length < 47 ? (int)length : 47, e->text);
        key = e->text[length] ? find_key(kind, word, true) : NULL;
        e->subject = e->text + length + strspn(e->text + length, " \t");
        if (!key && !(!e->text[length] && lacks_subject(e, kind, word, errors)))
            tell_unknown_key(e, kind, errors);
    }
    e->key = key;
}

static void check_doubled(const struct sheet_lines *lines, size_t index,
                          struct sheet_errors *errors)
{
    const struct sheet_entry *e = &lines->entries[index];
    if (!e->key || e->key->flags & SHEET_KEY_AGAIN)
        return;
    for (size_t i = 0; i < index; i++) {
        const struct sheet_entry *other = &lines->entries[i];
        if (other->key == e->key && other->section == e->section &&
            (!(e->key->flags & SHEET_KEY_SUBJECT) || !strcmp(other->subject, e->subject))) {
            sheet_errors_add(errors, e->line, "key given twice: '%.100s' (first in line %d)",
                             e->text, other->line);
            return;
        }
    }
}

void sheet_keys_check(struct sheet_lines *lines, struct sheet_errors *errors)
{
    check_sections(lines, errors);
    for (size_t i = 0; i < lines->entry_count; i++) {
        int kind = lines->sections[lines->entries[i].section].kind;
        if (kind >= 0)
            classify_key(&lines->entries[i], &KINDS[kind], errors);
    }
    for (size_t i = 0; i < lines->entry_count; i++)
        check_doubled(lines, i, errors);
}
