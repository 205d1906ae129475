#include "base/nearest.h"

#include <ctype.h>
#include <dirent.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#define LETTERS_MOST 100 /* of a name; a longer one is near to none */
#define FAR 1000

static size_t least(size_t a, size_t b)
{
    return a < b ? a : b;
}

/* Letters to insert, drop or change between two short texts (Wagner & Fischer, J. ACM 21 (1974)
 * 168-173), case aside; FAR where one is too long. */
static size_t distance(const char *a, const char *b)
{
    size_t row[LETTERS_MOST + 1], m = strlen(a), n = strlen(b);
    if (m > LETTERS_MOST || n > LETTERS_MOST)
        return FAR;
    for (size_t j = 0; j <= n; j++)
        row[j] = j;
    for (size_t i = 1; i <= m; i++) {
        size_t corner = row[0];
        row[0] = i;
        for (size_t j = 1; j <= n; j++) {
            bool same = tolower((unsigned char)a[i - 1]) == tolower((unsigned char)b[j - 1]);
            size_t change = corner + !same;
            corner = row[j];
            row[j] = least(change, least(row[j], row[j - 1]) + 1);
        }
    }
    return row[n];
}

/* A name must be nearer than this to be meant. */
static size_t reach(const char *wrong)
{
    return strlen(wrong) < 4 ? 2 : 3;
}

static const char *say(const char *name, char *room)
{
    const int length = snprintf(room, NEAREST_ROOM, " (did you mean '%s'?)", name);
    if (length >= NEAREST_ROOM)
        room[0] = '\0';
    return room;
}

const char *nearest_hint(const char *wrong, const char *const *names, size_t count, char *room)
{
    const char *nearest = NULL;
    size_t best = reach(wrong);
    for (size_t i = 0; i < count; i++) {
        size_t d = distance(wrong, names[i]);
        if (d < best && d < strlen(names[i])) {
            best = d;
            nearest = names[i];
        }
    }
    room[0] = '\0';
    return nearest ? say(nearest, room) : room;
}

/* Length without the ending. */
static size_t stem(const char *name)
{
    const char *point = strrchr(name, '.');
    return point && point > name ? (size_t)(point - name) : strlen(name);
}

static size_t file_distance(const char *wrong, const char *name)
{
    const size_t d = distance(wrong, name), length = stem(wrong);
    const bool ending_only = length == stem(name) && strncmp(wrong, name, length) == 0;
    return ending_only ? least(d, 1) : d;
}

const char *nearest_file(const char *path, char *room)
{
    const char *slash = strrchr(path, '/'), *wrong = slash ? slash + 1 : path;
    char folder[1024] = ".", nearest[LETTERS_MOST + 1] = "";
    size_t best = reach(wrong);
    room[0] = '\0';
    if (slash && snprintf(folder, sizeof folder, "%.*s", (int)(slash - path) + 1, path) >=
                     (int)sizeof folder)
        return room;
    DIR *listing = opendir(folder);
    if (!listing)
        return room;
    for (const struct dirent *entry; (entry = readdir(listing)) != NULL;) {
        const char *name = entry->d_name;
        const size_t d = name[0] == '.' ? FAR : file_distance(wrong, name);
        /* A folder lists in any order: of equally near names the first in the alphabet. */
        if (d < best || (d == best && nearest[0] && strcmp(name, nearest) < 0)) {
            best = d;
            snprintf(nearest, sizeof nearest, "%s", name);
        }
    }
    closedir(listing);
    return nearest[0] ? say(nearest, room) : room;
}
