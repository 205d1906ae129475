#define _XOPEN_SOURCE 700 /* realpath */
#include "desk/new.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/buffer.h"
#include "base/message.h"
#include "base/nearest.h"
#include "base/options.h"
#include "base/status.h"
#include "desk/channels.h"
#include "desk/interview.h"
#include "desk/look.h"
#include "desk/outline.h"
#include "desk/wish.h"
#include "read/names.h"
#include "sheet/sheet.h"

struct draft {
    struct outline outline;
    struct channels channels;
    const char *output;            /* -o; NULL: standard output */
    struct option_list recordings; /* as named */
    struct option_list planes;
    struct option_list weight_texts; /* RUN=WEIGHT or RUN:PLANE=WEIGHT */
    char (*runs)[NAME_ROOM];         /* owned */
    char **files;                    /* owned, as the sheet names them */
    struct outline_weight *weights;  /* owned */
    struct interview interview;
};

/* ---- what the options say ---- */

static int find_name(const char *name, size_t length, const char *const *names, size_t count)
{
    for (size_t i = 0; i < count; i++)
        if (strlen(names[i]) == length && !strncmp(names[i], name, length))
            return (int)i;
    return -1;
}

static int find_run(const struct draft *draft, const char *name, size_t length)
{
    for (size_t i = 0; i < draft->recordings.count; i++)
        if (strlen(draft->runs[i]) == length && !strncmp(draft->runs[i], name, length))
            return (int)i;
    return -1;
}

static void tell_no_run(const struct draft *draft, const char *text, size_t length)
{
    const char *names[32];
    char name[NAME_ROOM], hint[NEAREST_ROOM];
    size_t count = 0;
    snprintf(name, sizeof name, "%.*s", (int)length, text);
    for (; count < draft->recordings.count && count < sizeof names / sizeof *names; count++)
        names[count] = draft->runs[count];
    message("no run of that name: '%.*s'%s (runs are named after their recordings)", (int)length,
            text, nearest_hint(name, names, count, hint));
}

/* "trial=60 g at position 2", "trial:left=60 g at position 2" */
static int take_weight(struct draft *draft, const char *text)
{
    struct outline *outline = &draft->outline;
    const size_t head = strcspn(text, "="), run = strcspn(text, ":=");
    if (text[head] != '=' || !text[head + 1]) {
        message("no weight of the form RUN=WEIGHT: '%s'", text);
        return STATUS_USAGE;
    }
    const int r = find_run(draft, text, run);
    const int p = run < head ? find_name(text + run + 1, head - run - 1, outline->planes,
                                         outline->plane_count)
                             : 0;
    if (r < 0)
        tell_no_run(draft, text, run);
    else if (p < 0)
        message("no plane of that name: '%.*s'", (int)(head - run - 1), text + run + 1);
    else
        draft->weights[outline->weight_count++] =
            (struct outline_weight){(size_t)r, (size_t)p, text + head + 1};
    return r < 0 || p < 0 ? STATUS_USAGE : STATUS_DONE;
}

/* "against" and "with" will do. */
static int take_angles(struct outline_answers *answers)
{
    static const char *const senses[] = {"against rotation", "with rotation"};
    const char *said = answers->angles;
    if (!said || !*said)
        return STATUS_DONE;
    for (int i = 0; i < 2; i++)
        if (!strncmp(said, senses[i], strlen(said))) {
            answers->angles = senses[i];
            return STATUS_DONE;
        }
    message("neither 'against rotation' nor 'with rotation': '%s'", said);
    return STATUS_USAGE;
}

/* A recording's path as seen from the sheet's folder. New; NULL: no memory. */
static char *path_from_sheet(const char *path, const char *output)
{
    const char *slash = output ? strrchr(output, '/') : NULL;
    const size_t folder = slash ? (size_t)(slash - output) + 1 : 0;
    char *full = NULL;
    if (folder > 0 && path[0] != '/') {
        if (!strncmp(path, output, folder))
            return strdup(path + folder);
        full = realpath(path, NULL);
    }
    return full ? full : strdup(path);
}

static int name_runs(struct draft *draft)
{
    const size_t count = draft->recordings.count;
    draft->runs = calloc(count, sizeof *draft->runs);
    if (!draft->runs ||
        names_from_paths((char *const *)draft->recordings.items, count, draft->runs) != 0)
        return message_no_memory();
    draft->outline.runs = (const char(*)[NAME_ROOM])draft->runs;
    draft->outline.run_count = count;
    return STATUS_DONE;
}

static int name_files(struct draft *draft)
{
    const size_t count = draft->recordings.count;
    draft->files = calloc(count, sizeof *draft->files);
    if (!draft->files)
        return message_no_memory();
    for (size_t i = 0; i < count; i++) {
        draft->files[i] = path_from_sheet(draft->recordings.items[i], draft->output);
        if (!draft->files[i])
            return message_no_memory();
    }
    draft->outline.files = (const char *const *)draft->files;
    return STATUS_DONE;
}

/* ---- questions, on terminals only ---- */

/* What the options left open. */
static int ask_for_the_rest(struct draft *draft)
{
    draft->interview =
        (struct interview){.outline = &draft->outline,
                           .channels = &draft->channels,
                           .output = &draft->output,
                           .planes_given = draft->planes.count > 0 || draft->weight_texts.count > 0,
                           .weights_given = draft->weight_texts.count > 0};
    return interview_hold(&draft->interview);
}

static int answer(struct draft *draft)
{
    static const char *const plane[] = {"rotor"};
    struct outline *outline = &draft->outline;
    const size_t weights = draft->weight_texts.count + 1;
    outline->channels = &draft->channels;
    outline->planes = draft->planes.count ? draft->planes.items : plane;
    outline->plane_count = draft->planes.count ? draft->planes.count : 1;
    draft->weights = calloc(weights, sizeof *draft->weights);
    if (!draft->weights)
        return message_no_memory();
    outline->weights = draft->weights;
    int status = STATUS_DONE;
    for (size_t i = 0; i < draft->weight_texts.count; i++)
        if (take_weight(draft, draft->weight_texts.items[i]) != STATUS_DONE)
            status = STATUS_USAGE;
    if (status == STATUS_DONE && isatty(STDIN_FILENO) && isatty(STDOUT_FILENO))
        status = ask_for_the_rest(draft);
    return status == STATUS_DONE ? take_angles(&outline->answers) : status;
}

/* ---- the sheet ---- */

/* Said before anything is looked at or asked for. */
static int file_is_free(const char *path)
{
    if (!path || access(path, F_OK) != 0)
        return STATUS_DONE;
    message("is there already, and stays as it is: '%s'", path);
    return STATUS_USAGE;
}

static int write_file(const char *path, const struct buffer *text)
{
    int fd = open(path, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (fd < 0 && errno == EEXIST) {
        message("is there already, and stays as it is: '%s'", path);
        return STATUS_USAGE;
    }
    FILE *file = fd < 0 ? NULL : fdopen(fd, "w");
    bool good = file && fwrite(text->bytes, 1, text->length, file) == text->length;
    good = file && fclose(file) == 0 && good;
    if (good)
        return STATUS_DONE;
    message("cannot write: '%s' (%s)", path, strerror(errno));
    if (fd >= 0)
        unlink(path);
    return STATUS_SYSTEM;
}

/* Each line behind `head`; those that hold one of `but` (NULL: none) are left out. */
static void say_lines(struct buffer *lines, const char *head, const char *const *but)
{
    for (char *at = lines->bytes; at && *at;) {
        char *end = strchr(at, '\n');
        bool left_out = false;
        if (end)
            *end = '\0';
        for (size_t i = 0; but && but[i]; i++)
            left_out = left_out || strstr(at, but[i]);
        if (!left_out)
            message("%s%s", head, at);
        at = end ? end + 1 : NULL;
    }
}

/* What `check` would find wrong with the recording of a run. True where there is something. */
static bool say_recording(const struct sheet *sheet, size_t run)
{
    const struct job *job = &sheet->job;
    struct fault fault = {0};
    struct wish wish;
    struct look look = {0};
    const struct look_tacho tacho_less = {.column = -1, .level = NAN, .service_rpm = NAN};
    if (wish_init(&wish, sheet, run, NULL) != 0)
        fault_no_memory(&fault);
    else if (wish.recording.column_count == 0)
        fault_set(&fault, STATUS_USAGE, "no sensor and no tacho is on: '%s'", wish.paths[0]);
    else if (look_at(&look, &wish.recording, &tacho_less, &fault) == STATUS_DONE)
        look_release(&look);
    if (fault.status != STATUS_DONE)
        message("%s (run '%s' of '%s')", fault.text, job->runs[run].name, sheet->path);
    wish_release(&wish);
    return fault.status != STATUS_DONE;
}

/* A sheet that reads well: are its recordings there and as it says, and is there a trial? */
static void say_what_check_finds(const struct sheet *sheet, bool open)
{
    const char *plane = wish_lacks_weight(&sheet->job);
    for (size_t i = 0; i < sheet->job.run_count; i++)
        if (say_recording(sheet, i))
            open = true;
    if (plane)
        message("no run says what was mounted: add 'weight %s = ... at ...' to the trial run's "
                "section",
                plane);
    if (open || plane)
        message("written, and to be completed: '%s'", sheet->path);
    else
        message("written, and complete: '%s' (look at it with lopside check)", sheet->path);
}

/* Says all that the sheet still lacks. */
static int say_open_ends(const struct draft *draft)
{
    static const char *const listed[] = {"missing key in", "missing: ", "missing section", NULL};
    struct sheet sheet = {0};
    struct buffer errors = BUFFER_INIT, missing = BUFFER_INIT;
    int count = sheet_read(&sheet, draft->output, false, &errors);
    outline_missing(&draft->outline, count > 0, &missing);
    const bool open = missing.length > 0;
    buffer_add(&missing, "", 1);
    buffer_add(&errors, "", 1);
    if (errors.failed || missing.failed)
        count = -1;
    if (count > 0)
        message("written, and to be completed: '%s'", draft->output);
    if (count >= 0)
        say_lines(&missing, "missing: ", NULL);
    if (count > 0)
        say_lines(&errors, "", open ? listed : NULL);
    if (count == 0)
        say_what_check_finds(&sheet, open);
    buffer_release(&missing);
    buffer_release(&errors);
    sheet_release(&sheet);
    return count < 0 ? message_no_memory() : STATUS_DONE;
}

static int write_sheet(struct draft *draft)
{
    struct buffer text = BUFFER_INIT;
    int status = STATUS_DONE;
    outline_write(&draft->outline, &text);
    if (text.failed)
        status = message_no_memory();
    else if (draft->output)
        status = write_file(draft->output, &text);
    else
        fwrite(text.bytes, 1, text.length, stdout); /* checked when the program ends */
    if (status == STATUS_DONE && draft->output)
        status = say_open_ends(draft);
    buffer_release(&text);
    return status;
}

static int look_at_channels(struct draft *draft)
{
    struct fault fault = {0};
    if (channels_find(&draft->channels, draft->recordings.items[0], &fault) != STATUS_DONE)
        message("%s", fault.text);
    return fault.status;
}

static void release(struct draft *draft)
{
    for (size_t i = 0; draft->files && i < draft->recordings.count; i++)
        free(draft->files[i]);
    interview_release(&draft->interview);
    free(draft->weights);
    free(draft->files);
    free(draft->runs);
    channels_release(&draft->channels);
    option_list_release(&draft->weight_texts);
    option_list_release(&draft->planes);
    option_list_release(&draft->recordings);
}

#define TEXT(name, unit, help, value)                                                              \
    {                                                                                              \
        name, 0, OPTION_TEXT, unit, NULL, 0, 0, NULL, help, value                                  \
    }

int desk_new(int argc, char **argv)
{
    struct draft draft = {.output = NULL};
    struct outline_answers *a = &draft.outline.answers;
    const struct option options[] = {
        {"output", 'o', OPTION_TEXT, "FILE", NULL, 0, 0, NULL,
         "write the sheet there, if it is not there yet", &draft.output},
        TEXT("title", "TEXT", "what the job is called", &a->title),
        TEXT("units", "SYSTEM", "of what is shown: metric or US [metric]", &a->units),
        TEXT("angles", "SENSE", "how angles of weights count: against or with rotation",
             &a->angles),
        TEXT("tacho", "CHANNEL", "the once-per-turn channel, or none [found by its pulses]",
             &a->tacho),
        TEXT("unit", "UNIT", "what the sensors measure: g, mm/s, ...", &a->unit),
        TEXT("scale", "SCALE", "of the sensors: '100 mV/g'", &a->scale),
        TEXT("show", "UNIT", "how their vibration is shown: 'mm/s rms', 'um pk-pk', ...", &a->show),
        TEXT("full-scale", "VOLTS", "at digital full scale: '10 V'", &a->full_scale),
        TEXT("rate", "RATE", "of columns without a time: '12800 Hz'", &a->rate),
        TEXT("mass", "MASS", "of the rotor: '340 kg'", &a->mass),
        TEXT("speed", "SPEED", "in service: '1480 rpm'", &a->speed),
        TEXT("grade", "GRADE", "of balance quality, ISO 21940-11: G6.3", &a->grade),
        {"plane", 0, OPTION_LIST, "NAME", "rotor", 0, 0, NULL, "where weights go (may repeat)",
         &draft.planes},
        TEXT("radius", "LENGTH", "of the planes: '410 mm'", &a->radius),
        TEXT("positions", "LIST", "on them: '12 from 0 deg'", &a->positions),
        TEXT("stock", "PIECES", "at hand: '10 20 50 g'", &a->stock),
        {"weight", 0, OPTION_LIST, "RUN=WEIGHT", NULL, 0, 0, NULL,
         "mounted: 'trial=60 g at 30 deg', 'RUN:PLANE=...' (may repeat)", &draft.weight_texts},
        TEXT("target", "LEVEL", "to be met: '1.8 mm/s rms'", &a->target),
        {NULL, 0, OPTION_FLAG, NULL, NULL, 0, 0, NULL, NULL, NULL}};
    const struct usage usage = {
        "new",
        "RECORDING...",
        "a first job sheet out of recordings and a few answers",
        options,
        1,
        SIZE_MAX,
        "Each recording becomes a run, named after its file. What is not said stands in the sheet "
        "as\n"
        "a comment, to be completed. Asks for it where standard input and output are terminals."};
    int parsed = options_parse(&usage, argc, argv, &draft.recordings);
    int status = parsed == OPTIONS_MISUSE ? STATUS_USAGE : STATUS_DONE;
    if (parsed == OPTIONS_GO) {
        status = file_is_free(draft.output);
        if (status == STATUS_DONE)
            status = look_at_channels(&draft);
        if (status == STATUS_DONE)
            status = name_runs(&draft);
        if (status == STATUS_DONE)
            status = answer(&draft);
        if (status == STATUS_DONE)
            status = name_files(&draft);
        if (status == STATUS_DONE)
            status = write_sheet(&draft);
    }
    release(&draft);
    return status;
}
