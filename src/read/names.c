#include "read/names.h"

#include <stdbool.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define NAME_MOST (NAMES_ROOM - 1)
#define HEAD 16 /* recordings are told apart by their endings more often than by their beginnings  \
                 */

/* Bytes of the well-formed UTF-8 character at p (RFC 3629), 0 if there is none. */
static size_t character(const unsigned char *p)
{
    static const unsigned char least[5] = {0, 0, 0xC2, 0xE0, 0xF0};
    if (p[0] < 0x80)
        return 1;
    const size_t length = p[0] >= 0xF0 ? 4 : p[0] >= 0xE0 ? 3 : 2;
    if (p[0] < least[length] || p[0] > 0xF4)
        return 0;
    for (size_t i = 1; i < length; i++)
        if ((p[i] & 0xC0) != 0x80)
            return 0;
    const bool too_long = (p[0] == 0xE0 && p[1] < 0xA0) || (p[0] == 0xF0 && p[1] < 0x90);
    const bool no_character = (p[0] == 0xED && p[1] > 0x9F) || (p[0] == 0xF4 && p[1] > 0x8F);
    return too_long || no_character ? 0 : length;
}

static void replace_bytes(char *text, char with)
{
    for (unsigned char *p = (unsigned char *)text; *p;) {
        const size_t length = character(p);
        if (length == 0)
            *p = (unsigned char)with;
        p += length ? length : 1;
    }
}

void names_make_utf8(char *text)
{
    replace_bytes(text, '?');
}

/* The tail of the path: its last `parts` + 1 parts, with or without the ending. */
static void candidate(const char *path, size_t parts, bool ending, char *name, size_t room)
{
    const char *start = path + strlen(path);
    for (;;) {
        while (start > path && start[-1] != '/')
            start--;
        if (parts == 0 || start <= path + 1)
            break;
        parts--;
        start--;
    }
    snprintf(name, room, "%s", start);
    char *file = strrchr(name, '/') ? strrchr(name, '/') + 1 : name;
    char *dot = strrchr(file, '.');
    if (!ending && dot && dot > file)
        *dot = '\0';
}

static bool is_forbidden(unsigned char c)
{
    return c < 0x20 || c == 0x7F || strchr(":=;#]", c) != NULL;
}

static void clean(char *name)
{
    replace_bytes(name, '_');
    for (char *p = name; *p; p++)
        if (is_forbidden((unsigned char)*p))
            *p = '_';
    const size_t length = strlen(name);
    if (length > 0 && name[0] == ' ')
        name[0] = '_';
    if (length > 0 && name[length - 1] == ' ')
        name[length - 1] = '_';
    if (length == 0)
        memcpy(name, "_", 2);
}

static bool is_inside(const char *text, size_t at)
{
    return ((unsigned char)text[at] & 0xC0) == 0x80;
}

/* At most `most` bytes: head, ~, tail, cut between characters. */
static void shorten(const char *name, size_t most, char *out)
{
    const size_t length = strlen(name);
    if (length <= most) {
        memcpy(out, name, length + 1);
        return;
    }
    size_t head = HEAD, tail = length - (most - HEAD - 1);
    while (head > 0 && is_inside(name, head))
        head--;
    while (tail < length && is_inside(name, tail))
        tail++;
    memcpy(out, name, head);
    out[head] = '~';
    memcpy(out + head + 1, name + tail, length - tail + 1);
    if (out[head + 1 + (length - tail) - 1] == ' ')
        out[head + 1 + (length - tail) - 1] = '_';
}

struct name {
    const char *text;
    size_t index;
};

static int compare(const void *a, const void *b)
{
    const struct name *x = a, *y = b;
    const int order = strcmp(x->text, y->text);
    return order ? order : (x->index > y->index) - (x->index < y->index);
}

/* Marks in `equal` the names that are not alone. Returns their number. */
static size_t find_equal(struct name *sorted, char *const *full, size_t count, bool *equal)
{
    size_t found = 0;
    for (size_t i = 0; i < count; i++)
        sorted[i] = (struct name){full[i], i};
    qsort(sorted, count, sizeof *sorted, compare);
    memset(equal, 0, count * sizeof *equal);
    for (size_t i = 0; i + 1 < count; i++)
        if (strcmp(sorted[i].text, sorted[i + 1].text) == 0)
            equal[sorted[i].index] = equal[sorted[i + 1].index] = true;
    for (size_t i = 0; i < count; i++)
        found += equal[i];
    return found;
}

static size_t count_parts(const char *path)
{
    size_t parts = 0;
    for (; *path; path++)
        parts += *path == '/';
    return parts;
}

/* Lengthens equal names part by part; at last with the files' endings. */
static void tell_apart(char *const *paths, size_t count, char **full, struct name *sorted,
                       bool *equal)
{
    size_t most = 0;
    for (size_t i = 0; i < count; i++)
        if (count_parts(paths[i]) > most)
            most = count_parts(paths[i]);
    for (int ending = 0; ending <= 1; ending++)
        for (size_t parts = 0; parts <= most; parts++) {
            for (size_t i = 0; i < count; i++)
                if (equal[i]) {
                    candidate(paths[i], parts, ending != 0, full[i], strlen(paths[i]) + 2);
                    clean(full[i]);
                }
            if (find_equal(sorted, full, count, equal) == 0)
                return;
        }
}

static bool is_taken(char (*names)[NAMES_ROOM], size_t before, const char *name)
{
    for (size_t i = 0; i < before; i++)
        if (strcmp(names[i], name) == 0)
            return true;
    return false;
}

static void number(const char *full, size_t index, char (*names)[NAMES_ROOM])
{
    shorten(full, NAME_MOST, names[index]);
    for (unsigned n = 2; is_taken(names, index, names[index]); n++) {
        char suffix[12];
        const int length = snprintf(suffix, sizeof suffix, "~%u", n);
        shorten(full, NAME_MOST - (size_t)length, names[index]);
        strcat(names[index], suffix);
    }
}

int names_from_paths(char *const *paths, size_t count, char (*names)[NAMES_ROOM])
{
    int result = -1;
    char **full = calloc(count ? count : 1, sizeof *full);
    struct name *sorted = calloc(count ? count : 1, sizeof *sorted);
    bool *equal = calloc(count ? count : 1, sizeof *equal);
    if (!full || !sorted || !equal)
        goto out;
    for (size_t i = 0; i < count; i++) {
        full[i] = calloc(1, strlen(paths[i]) + 2);
        if (!full[i])
            goto out;
        equal[i] = true;
    }
    tell_apart(paths, count, full, sorted, equal);
    for (size_t i = 0; i < count; i++)
        number(full[i], i, names);
    result = 0;
out:
    for (size_t i = 0; full && i < count; i++)
        free(full[i]);
    free(equal);
    free(sorted);
    free(full);
    return result;
}
