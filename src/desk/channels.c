#include "desk/channels.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "desk/look.h"
#include "read/audio.h"
#include "read/csv_file.h"
#include "read/digest.h"
#include "read/names.h"
#include "sheet/units.h"

#define CHANNELS_MOST 64 /* more are not looked at one by one */
#define COARSE 0.002     /* as in `read`, which wants to be told a rate that is less certain */
/* Hz, where the rate is not known: pulses are found in any unit of time. */
#define RATE_STAND_IN 1e3

/* ---- words ---- */

const char *channels_unit(const char *text)
{
    static const struct {
        const char *said, *unit;
    } known[] = {
        {"m/s\xC2\xB2", "m/s2"}, {"m/s^2", "m/s2"},   {"mm/sec", "mm/s"},  {"in/sec", "in/s"},
        {"ips", "in/s"},         {"\xC2\xB5m", "um"}, {"\xCE\xBCm", "um"}, {"micron", "um"},
        {"mils", "mil"},         {"G", "g"},          {"g", "g"},          {"m/s2", "m/s2"},
        {"mm/s", "mm/s"},        {"in/s", "in/s"},    {"um", "um"},        {"mil", "mil"}};
    for (size_t i = 0; i < sizeof known / sizeof *known; i++)
        if (!strcmp(text, known[i].said))
            return known[i].unit;
    return NULL;
}

void channels_name(const char *text, char name[NAME_ROOM])
{
    size_t length = 0;
    text += strspn(text, " \t");
    for (; *text && length < NAME_ROOM - 1; text++)
        name[length++] =
            (unsigned char)*text < 0x20 || *text == 0x7F || strchr(":=;#][\"", *text) ? '_' : *text;
    while (*text && length > 0 &&
           ((unsigned char)*text & 0xC0) == 0x80) /* cut within a character */
        text--, length--;
    while (length > 0 && name[length - 1] == ' ')
        length--;
    name[length] = '\0';
    names_make_utf8(name);
}

/* "Left H [mm/s]" to "Left H" and "mm/s". Both have NAME_ROOM bytes. */
static void split_header(const char *header, char *name, char *unit)
{
    const char *open = strpbrk(header, "[(");
    const size_t length = strlen(header);
    char before[NAME_ROOM] = "";
    unit[0] = '\0';
    if (open && open > header && length > 0 && strchr("])", header[length - 1])) {
        snprintf(before, sizeof before, "%.*s", (int)(open - header), header);
        snprintf(unit, NAME_ROOM, "%.*s", (int)(header + length - 1 - (open + 1)), open + 1);
        channels_name(before, name);
    } else {
        channels_name(header, name);
    }
}

static bool names_tacho(const char *name)
{
    static const char *const words[] = {"tach", "mark", "trigger", "once per", "1/rev"};
    for (size_t i = 0; i < sizeof words / sizeof *words; i++)
        for (const char *at = name; *at; at++)
            if (!strncasecmp(at, words[i], strlen(words[i])))
                return true;
    return false;
}

/* ---- what the file says ---- */

static int make_items(struct channels *channels, size_t count, struct fault *fault)
{
    channels->items = calloc(count ? count : 1, sizeof *channels->items);
    if (!channels->items)
        return fault_no_memory(fault);
    channels->count = count;
    for (size_t i = 0; i < count; i++) {
        snprintf(channels->items[i].channel, NAME_ROOM, "%zu", i + 1);
        snprintf(channels->items[i].name, NAME_ROOM, "channel %zu", i + 1);
    }
    return STATUS_DONE;
}

static bool is_taken(const struct channels *channels, size_t index, const char *name)
{
    for (size_t i = 0; i < index; i++)
        if (!strcmp(channels->items[i].name, name))
            return true;
    return false;
}

/* The unit in words is what it is in: nothing, volts, vibration or something else. */
static void judge_unit(struct channels_one *item, const char *unit)
{
    const char *known = channels_unit(unit);
    if (known)
        strcpy(item->unit, known);
    else if (*unit && strcasecmp(unit, "V") != 0 && strcasecmp(unit, "mV") != 0 &&
             strcasecmp(unit, "volt") != 0 && strcasecmp(unit, "volts") != 0)
        item->use = CHANNELS_OTHER;
}

static void take_header(struct channels *channels, const struct csv_layout *layout, size_t i)
{
    struct channels_one *item = &channels->items[i];
    const char *header = layout->name_rows > 0 ? layout->names[i] : "";
    char name[NAME_ROOM], unit[NAME_ROOM];
    split_header(header, name, unit);
    if (!*unit && layout->name_rows > 1)
        snprintf(unit, sizeof unit, "%.40s", layout->names[layout->width + i]);
    const size_t length = strlen(unit);
    if (length > 1 && strchr("[(", unit[0]) && strchr("])", unit[length - 1])) {
        memmove(unit, unit + 1, length - 2);
        unit[length - 2] = '\0';
    }
    judge_unit(item, unit);
    if (*name && !is_taken(channels, i, name)) {
        strcpy(item->name, name);
        if (name[strspn(name, "0123456789")] && csv_layout_column(layout, name) == (int)i)
            strcpy(item->channel, name);
    }
}

static int list_text(struct channels *channels, const char *path, const struct digest *digest,
                     struct fault *fault)
{
    const struct csv_wish wish = {.skip = -1, .time_column = ""};
    struct csv_file file = {.fd = -1};
    if (csv_file_open(&file, path, &wish, digest, fault) == STATUS_DONE &&
        make_items(channels, file.layout.width, fault) == STATUS_DONE) {
        channels->text = true;
        channels->has_rate = !isnan(file.rate_hz) && file.uncertainty <= COARSE;
        channels->coarse_hz = channels->has_rate ? NAN : file.rate_hz;
        for (size_t i = 0; i < channels->count; i++)
            take_header(channels, &file.layout, i);
        if (file.layout.has_time)
            channels->items[file.layout.time_column].use = CHANNELS_TIME;
    }
    csv_file_close(&file);
    return fault->status;
}

static int list_sound(struct channels *channels, const char *path, struct fault *fault)
{
    struct audio audio;
    if (audio_open(&audio, path, fault) == STATUS_DONE &&
        make_items(channels, (size_t)audio.channels, fault) == STATUS_DONE)
        channels->has_rate = true;
    audio_close(&audio);
    return fault->status;
}

static int list(struct channels *channels, const char *path, struct fault *fault)
{
    char *paths[] = {(char *)path};
    struct digest_queue *queue = digest_queue_new(paths, 1);
    if (!queue)
        return fault_no_memory(fault);
    const struct digest *digest = digest_queue_wait(queue, 0);
    if (digest->fault.status != STATUS_DONE)
        *fault = digest->fault;
    else if (digest->text)
        (void)list_text(channels, path, digest, fault);
    else
        (void)list_sound(channels, path, fault);
    digest_queue_free(queue);
    return fault->status;
}

/* ---- what its signals say ---- */

/* Marks the only tacho: of those with pulses, or with the name of one. Nothing where it is open. */
static void choose_tacho(struct channels *channels, const double *speeds)
{
    size_t pulses = 0, named = 0, both = 0, only[3] = {0, 0, 0};
    for (size_t i = 0; i < channels->count; i++) {
        const struct channels_one *item = &channels->items[i];
        if (item->use != CHANNELS_SENSOR)
            continue;
        const bool name = names_tacho(item->name);
        if (item->pulses && name)
            both++, only[0] = i;
        if (item->pulses)
            pulses++, only[1] = i;
        if (name)
            named++, only[2] = i;
    }
    const size_t tacho = both == 1 ? only[0] : pulses == 1 ? only[1] : only[2];
    if (both == 1 || pulses == 1 || (pulses == 0 && named == 1)) {
        channels->items[tacho].use = CHANNELS_TACHO;
        channels->speed_rpm = channels->has_rate ? speeds[tacho] : NAN;
    }
}

/* What cannot be looked at (a column of words beside) is described all the same. */
static void look_for_tacho(struct channels *channels, const char *path)
{
    struct recording_column columns[CHANNELS_MOST];
    size_t index[CHANNELS_MOST], count = 0;
    double *speeds = calloc(channels->count + 1, sizeof *speeds);
    char numbers[CHANNELS_MOST][24];
    char *paths[] = {(char *)path};
    struct look look = {0};
    struct fault fault = {0};
    for (size_t i = 0; i < channels->count && count < CHANNELS_MOST; i++) {
        if (channels->items[i].use == CHANNELS_TIME)
            continue;
        snprintf(numbers[count], sizeof numbers[count], "%zu", i + 1);
        columns[count] = (struct recording_column){.name = channels->items[i].name,
                                                   .channel = numbers[count],
                                                   .volts = true,
                                                   .plain = true,
                                                   .si = 1};
        index[count++] = i;
    }
    const double rate = channels->has_rate           ? NAN
                        : isnan(channels->coarse_hz) ? RATE_STAND_IN
                                                     : channels->coarse_hz;
    const struct recording_wish wish = {.paths = paths,
                                        .path_count = 1,
                                        .columns = columns,
                                        .column_count = count,
                                        .full_scale = NAN,
                                        .rate_hz = rate,
                                        .csv = {.skip = -1, .time_column = ""}};
    const struct look_tacho tacho = {
        .column = LOOK_EACH, .edge = 1, .marks = 1, .level = NAN, .service_rpm = NAN};
    if (speeds && count > 0 && look_at(&look, &wish, &tacho, &fault) == STATUS_DONE) {
        for (size_t c = 0; c < count; c++) {
            channels->items[index[c]].pulses = look.columns[c].pulses && look.columns[c].two_levels;
            speeds[index[c]] = look.columns[c].speed_rpm;
        }
    }
    if (speeds)
        choose_tacho(channels, speeds);
    look_release(&look);
    free(speeds);
}

int channels_find(struct channels *channels, const char *path, struct fault *fault)
{
    *channels = (struct channels){.speed_rpm = NAN, .coarse_hz = NAN};
    if (list(channels, path, fault) == STATUS_DONE)
        look_for_tacho(channels, path);
    else
        channels_release(channels);
    return fault->status;
}

void channels_release(struct channels *channels)
{
    free(channels->items);
    *channels = (struct channels){.speed_rpm = NAN, .coarse_hz = NAN};
}
