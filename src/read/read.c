/* read.c - the stage `read`: job sheet and recordings become one calibrated sample stream. */
#include "read/read.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/message.h"
#include "base/nearest.h"
#include "base/options.h"
#include "base/status.h"
#include "read/adopt.h"
#include "read/digest.h"
#include "read/names.h"
#include "read/recording.h"
#include "sheet/sheet.h"
#include "stream/records.h"
#include "stream/stream.h"

#if __BYTE_ORDER__ != __ORDER_LITTLE_ENDIAN__
#error "samples in the stream are little-endian; this machine needs a swap before sink_bytes"
#endif

#define BLOCK_FRAMES 16384u        /* more gain nothing in speed */
#define BLOCK_BYTES (512u * 1024u) /* bounds the memory of many columns */
#define COLUMN_BYTES (sizeof(float))
#define HELD_BYTES (4u * 1024u * 1024u) /* decoded ahead of the hash; a text's is there by then */

struct stage {
    struct sheet sheet;
    bool audit;
    bool *chosen; /* per run */
    char **paths; /* of the files of the chosen runs, in order; openable from here */
    size_t path_count;
    struct digest_queue *queue;
    struct sink *sink;
    struct line line;
    float *block;
    float *held; /* HELD_BYTES: samples that wait for the hashes, which come before them in the stream */
    bool failed; /* audit: some recording could not be read */
};

/* ---- how far it is ---- */

static struct read_progress *watched; /* borrowed; NULL: nobody looks */

void stage_read_watch(struct read_progress *progress)
{
    watched = progress;
}

static long long size_of(char *const *paths, size_t count)
{
    long long size = 0;
    struct stat s;
    for (size_t i = 0; i < count; i++)
        size += stat(paths[i], &s) == 0 ? (long long)s.st_size : 0;
    return size;
}

/* ---- before the stream ---- */

static int print_errors(struct buffer *errors)
{
    for (char *line = errors->bytes; line && *line;) {
        char *end = strchr(line, '\n');
        if (end)
            *end = '\0';
        message("%s", line);
        line = end ? end + 1 : NULL;
    }
    return STATUS_USAGE;
}

static int read_sheet(struct stage *stage, const char *path)
{
    struct buffer errors = BUFFER_INIT;
    int status = STATUS_DONE;
    int count = sheet_read(&stage->sheet, path, stage->audit, &errors);
    if (count < 0 || errors.failed)
        status = message_no_memory();
    else if (count > 0)
        status = print_errors(&errors);
    buffer_release(&errors);
    return status;
}

static int adopt(struct stage *stage, char *const *paths, size_t count)
{
    return adopt_recordings(&stage->sheet, paths, count) == 0 ? STATUS_DONE : message_no_memory();
}

static void tell_no_run(const struct stage *stage, const char *name)
{
    const struct job *job = &stage->sheet.job;
    const char *names[32];
    char hint[NEAREST_ROOM];
    size_t count = 0;
    for (; count < job->run_count && count < sizeof names / sizeof *names; count++)
        names[count] = job->runs[count].name;
    message("no run of that name in the sheet: '%s'%s (%s)", name,
            nearest_hint(name, names, count, hint), stage->sheet.path);
}

static int choose_runs(struct stage *stage, const struct option_list *names)
{
    const struct job *job = &stage->sheet.job;
    int status = STATUS_DONE;
    stage->chosen = calloc(job->run_count ? job->run_count : 1, sizeof *stage->chosen);
    if (!stage->chosen)
        return message_no_memory();
    for (size_t i = 0; i < job->run_count; i++)
        stage->chosen[i] = names->count == 0;
    for (size_t i = 0; i < names->count; i++) {
        int run = job_find_run(job, names->items[i]);
        if (run >= 0) {
            stage->chosen[run] = true;
        } else {
            tell_no_run(stage, names->items[i]);
            status = STATUS_USAGE;
        }
    }
    return status;
}

/* A remark, no error: the answer is for the rotor without the weights that this run lists. */
static void remark_as_found(const struct stage *stage)
{
    const int run = stage->audit ? -1 : job_found_loaded(&stage->sheet.job);
    if (run >= 0 && stage->chosen[run])
        message("run '%s' carries weights, as found is taken as the rotor without them (%s)",
                stage->sheet.job.runs[run].name, stage->sheet.path);
}

static char *join_path(const struct stage *stage, const char *file)
{
    const char *folder = stage->sheet.folder;
    if (stage->audit || file[0] == '/' || !strcmp(folder, "."))
        return strdup(file);
    char *path = malloc(strlen(folder) + strlen(file) + 2);
    if (path) {
        strcpy(path, folder);
        strcat(path, "/");
        strcat(path, file);
    }
    return path;
}

static int list_paths(struct stage *stage)
{
    const size_t runs = stage->sheet.job.run_count;
    size_t count = 0;
    for (size_t i = 0; i < runs; i++)
        count += stage->chosen[i] ? stage->sheet.runs[i].file_count : 0;
    stage->paths = calloc(count ? count : 1, sizeof *stage->paths);
    if (!stage->paths)
        return message_no_memory();
    for (size_t i = 0; i < runs; i++)
        for (size_t f = 0; stage->chosen[i] && f < stage->sheet.runs[i].file_count; f++) {
            char *path = join_path(stage, stage->sheet.runs[i].files[f]);
            if (!path)
                return message_no_memory();
            stage->paths[stage->path_count++] = path;
        }
    if (count > 0 && isatty(STDOUT_FILENO)) {
        message("will not write samples to a terminal: give a file or a pipe");
        return STATUS_USAGE;
    }
    return STATUS_DONE;
}

/* ---- one run ---- */

struct task { /* one run while it is read */
    size_t run;
    struct recording_column *columns;
    const struct digest **digests, **hashed; /* what decoding rests on; the same with their hashes */
    struct recording_wish wish;
    struct recording recording;
    size_t held; /* frames */
};

static bool is_first_column(const char *channel)
{
    return !strcmp(channel, "1");
}

/* The sheet's words for a run as a wish. `columns` has room for all sensors and the tacho. */
static void make_wish(const struct stage *stage, struct task *task, char *const *paths)
{
    const struct job *job = &stage->sheet.job;
    const struct sheet_run *run = &stage->sheet.runs[task->run];
    size_t count = 0;
    bool first = false;
    for (size_t s = 0; s < job->sensor_count; s++) {
        if (job->runs[task->run].without[s])
            continue;
        const struct sheet_scale *scale = &run->scales[s];
        first = first || is_first_column(run->channels[s]);
        task->columns[count++] =
            (struct recording_column){.name = job->sensors[s].name,
                                      .channel = run->channels[s],
                                      .volts = scale->given,
                                      .si = scale->given ? scale->si_per_volt : scale->si_per_unit};
    }
    if (job->has_tacho) {
        first = first || is_first_column(job->tacho_channel);
        task->columns[count++] = (struct recording_column){
            .name = "tacho", .channel = job->tacho_channel, .volts = true, .plain = true, .si = 1};
    }
    task->wish = (struct recording_wish){.paths = paths,
                                         .digests = task->digests,
                                         .path_count = run->file_count,
                                         .columns = task->columns,
                                         .column_count = count,
                                         .full_scale = run->layout.full_scale,
                                         .rate_hz = run->layout.rate,
                                         .csv = {.separator = run->layout.separator,
                                                 .decimal = run->layout.decimal,
                                                 .skip = run->layout.skip,
                                                 .time_column = run->layout.time_column,
                                                 .first_is_channel = first}};
}

/* What decoding needs to know of the files; their hashes come while it goes on. */
static int wait_for_scans(const struct stage *stage, struct task *task, size_t first_path,
                          struct fault *fault)
{
    for (size_t f = 0; f < task->wish.path_count; f++) {
        task->digests[f] = digest_queue_scanned(stage->queue, first_path + f);
        if (task->digests[f]->fault.status != STATUS_DONE)
            return fault_set(fault, task->digests[f]->fault.status, "%s",
                             task->digests[f]->fault.text);
    }
    return STATUS_DONE;
}

static int wait_for_hashes(const struct stage *stage, struct task *task, size_t first_path,
                           struct fault *fault)
{
    for (size_t f = 0; f < task->wish.path_count; f++) {
        task->hashed[f] = digest_queue_wait(stage->queue, first_path + f);
        if (task->hashed[f]->fault.status != STATUS_DONE)
            return fault_set(fault, task->hashed[f]->fault.status, "%s",
                             task->hashed[f]->fault.text);
    }
    return STATUS_DONE;
}

/* The `run` record; without `task` that of readings by hand. */
static int print_run(struct stage *stage, size_t run, const struct task *task)
{
    const struct job_run *job_run = &stage->sheet.job.runs[run];
    struct run_record record = {.job_run = job_run};
    memcpy(record.run, job_run->name, NAME_ROOM);
    memcpy(record.condition, job_run->condition, NAME_ROOM);
    memcpy(record.when, job_run->when, NAME_ROOM);
    int status = STATUS_DONE;
    if (task) {
        record.files = calloc(task->wish.path_count, sizeof *record.files);
        if (!record.files)
            return message_no_memory();
        record.file_count = task->wish.path_count;
        for (size_t f = 0; f < record.file_count; f++) {
            struct file_record *file = &record.files[f];
            file->path = strdup(stage->sheet.runs[run].files[f]);
            if (!file->path) {
                status = message_no_memory();
                continue;
            }
            names_make_utf8(file->path);
            memcpy(file->sha256, task->hashed[f]->sha256, sizeof file->sha256);
            file->frames = task->recording.frames;
            file->rate_hz = task->recording.rate_hz;
        }
    }
    if (status == STATUS_DONE) {
        run_print(&record, &stage->sheet.job, &stage->line);
        status = sink_line(stage->sink, &stage->line);
    }
    run_release(&record);
    return status;
}

static int print_wave(struct stage *stage, const struct task *task)
{
    const struct job *job = &stage->sheet.job;
    const struct job_run *run = &job->runs[task->run];
    struct wave_record wave = {.rate_hz = task->recording.rate_hz,
                               .column_count = task->wish.column_count};
    memcpy(wave.run, run->name, NAME_ROOM);
    wave.columns = calloc(wave.column_count, sizeof *wave.columns);
    if (!wave.columns)
        return message_no_memory();
    size_t c = 0;
    for (size_t s = 0; s < job->sensor_count; s++)
        if (!run->without[s]) {
            memcpy(wave.columns[c].name, job->sensors[s].name, NAME_ROOM);
            wave.columns[c++].quantity = job->sensors[s].quantity;
        }
    if (job->has_tacho) {
        memcpy(wave.columns[c].name, "tacho", sizeof "tacho");
        wave.columns[c].quantity = QUANTITY_TACHO;
    }
    for (c = 0; c < wave.column_count; c++)
        wave.columns[c].rail = task->recording.rails[c];
    wave_print(&wave, &stage->line);
    wave_release(&wave);
    return sink_line(stage->sink, &stage->line);
}

static size_t block_frames(size_t columns)
{
    const size_t most = BLOCK_BYTES / (columns * COLUMN_BYTES);
    return most < 1 ? 1 : most < BLOCK_FRAMES ? most : BLOCK_FRAMES;
}

/* Bytes that hold a block of up to that many columns. */
static size_t block_room(size_t columns)
{
    return columns * COLUMN_BYTES > BLOCK_BYTES ? columns * COLUMN_BYTES : BLOCK_BYTES;
}

/* One block of samples. */
static int print_block(struct stage *stage, const struct task *task, const float *samples,
                       size_t frames)
{
    block_print(stage->sheet.job.runs[task->run].name, (long)frames, &stage->line);
    int status = sink_line(stage->sink, &stage->line);
    if (status == STATUS_DONE)
        status = sink_bytes(stage->sink, samples,
                            frames * task->wish.column_count * COLUMN_BYTES);
    return status;
}

/* Decodes into the held blocks until the hashes stand, the room or the recording ends. */
static void hold_blocks(struct stage *stage, struct task *task, size_t last_path,
                        struct fault *fault)
{
    const size_t columns = task->wish.column_count, most = block_frames(columns);
    const size_t room = HELD_BYTES / (columns * COLUMN_BYTES);
    while (task->held + most <= room && fault->status == STATUS_DONE &&
           !digest_queue_ready(stage->queue, last_path)) {
        size_t got = 0;
        if (recording_read(&task->recording, stage->held + task->held * columns, most, &got,
                           fault) != STATUS_DONE ||
            got == 0)
            break;
        task->held += got;
    }
}

static int print_held(struct stage *stage, const struct task *task)
{
    const size_t columns = task->wish.column_count, most = block_frames(columns);
    int status = STATUS_DONE;
    for (size_t at = 0; at < task->held && status == STATUS_DONE; at += most) {
        const size_t frames = task->held - at < most ? task->held - at : most;
        status = print_block(stage, task, stage->held + at * columns, frames);
    }
    return status;
}

/* The samples that are not held. A fault of the recording is in `fault`; the return value is the sink's
 * status. */
static int print_blocks(struct stage *stage, struct task *task, struct fault *fault)
{
    const size_t most = block_frames(task->wish.column_count);
    const long long before = watched ? watched->done : 0;
    const double size = watched ? (double)size_of(task->wish.paths, task->wish.path_count) : 0;
    double frames = (double)task->held;
    int status = STATUS_DONE;
    while (status == STATUS_DONE) {
        size_t got = 0;
        if (recording_read(&task->recording, stage->block, most, &got, fault) != STATUS_DONE ||
            got == 0)
            break;
        status = print_block(stage, task, stage->block, got);
        frames += (double)got;
        if (watched)
            watched->done = before + (long long)(size * frames / (double)task->recording.frames);
    }
    return status;
}

/* The fault, and where in the sheet the recording is asked for. */
static void tell(const struct stage *stage, size_t run, const struct fault *fault)
{
    if (fault->status == STATUS_SYSTEM)
        message("%s", fault->text);
    else if (stage->audit)
        message("%s (sheet '%s')", fault->text, stage->sheet.path);
    else
        message("%s (run '%s' of '%s')", fault->text, stage->sheet.job.runs[run].name,
                stage->sheet.path);
}

/* What is wrong with a recording: the end of a job, a finding of an audit. */
static int give_up(struct stage *stage, size_t run, struct fault *fault)
{
    tell(stage, run, fault);
    if (!stage->audit || fault->status == STATUS_SYSTEM)
        return fault->status;
    stage->failed = true;
    struct finding_record finding = {.stage = "read",
                                     .check = "readable",
                                     .verdict = VERDICT_REFUSE,
                                     .basis = "common practice",
                                     .sensor = -1,
                                     .value = NAN,
                                     .limit = NAN};
    memcpy(finding.run, stage->sheet.job.runs[run].name, NAME_ROOM);
    names_make_utf8(fault->text);
    memcpy(finding.text, fault->text, sizeof fault->text);
    finding_print(&finding, &stage->sheet.job, &stage->line);
    return sink_line(stage->sink, &stage->line);
}

_Static_assert(FAULT_ROOM <= sizeof((struct finding_record *)0)->text, "a reason fits a finding");

/* An open recording: its records and samples. What goes wrong before a sample was written ends it there. */
static int stream_samples_of(struct stage *stage, struct task *task, size_t first_path,
                             struct fault *fault)
{
    hold_blocks(stage, task, first_path + task->wish.path_count - 1, fault);
    if (fault->status != STATUS_DONE ||
        wait_for_hashes(stage, task, first_path, fault) != STATUS_DONE)
        return STATUS_DONE;
    int status = print_run(stage, task->run, task);
    if (status == STATUS_DONE)
        status = print_wave(stage, task);
    if (status == STATUS_DONE)
        status = print_held(stage, task);
    if (status == STATUS_DONE)
        status = print_blocks(stage, task, fault);
    return status;
}

static int stream_run(struct stage *stage, size_t run, size_t first_path)
{
    const size_t sensors = stage->sheet.job.sensor_count;
    const size_t files = stage->sheet.runs[run].file_count;
    struct fault fault = {0};
    struct task task = {.run = run};
    int status = STATUS_DONE;
    task.columns = calloc(sensors + 1, sizeof *task.columns);
    task.digests = calloc(files, sizeof *task.digests);
    task.hashed = calloc(files, sizeof *task.hashed);
    if (!task.columns || !task.digests || !task.hashed) {
        status = message_no_memory();
        goto out;
    }
    make_wish(stage, &task, &stage->paths[first_path]);
    if (task.wish.column_count == 0)
        fault_set(&fault, STATUS_USAGE, "no sensor and no tacho is on in run '%s'",
                  stage->sheet.job.runs[run].name);
    else if (wait_for_scans(stage, &task, first_path, &fault) == STATUS_DONE &&
             recording_open(&task.recording, &task.wish, &fault) == STATUS_DONE)
        status = stream_samples_of(stage, &task, first_path, &fault);
    if (status == STATUS_DONE && fault.status != STATUS_DONE)
        status = give_up(stage, run, &fault);
    recording_close(&task.recording);
out:
    free(task.hashed);
    free(task.digests);
    free(task.columns);
    return status;
}

/* ---- the stream ---- */

static int open_stream(struct stage *stage)
{
    const size_t columns = stage->sheet.job.sensor_count + 1;
    stage->sink = sink_new(STDOUT_FILENO);
    stage->block = malloc(block_room(columns));
    stage->held = stage->path_count > 0 ? malloc(HELD_BYTES) : NULL;
    if (stage->path_count > 0)
        stage->queue = digest_queue_new(stage->paths, stage->path_count);
    if (stage->held) /* touched now, so that the peak of memory does not hang on the hash's speed */
        memset(stage->held, 0, HELD_BYTES);
    if (!stage->sink || !stage->block || (stage->path_count > 0 && (!stage->queue || !stage->held)))
        return message_no_memory();
    buffer_clear(&stage->line.text);
    if (job_print(&stage->sheet.job, &stage->line.text) != 0)
        return message_no_memory();
    return sink_line(stage->sink, &stage->line);
}

static int stream_runs(struct stage *stage)
{
    int status = STATUS_DONE;
    size_t path = 0;
    if (watched)
        watched->total = size_of(stage->paths, stage->path_count);
    for (size_t i = 0; status == STATUS_DONE && i < stage->sheet.job.run_count; i++) {
        if (!stage->chosen[i])
            continue;
        const size_t files = stage->sheet.runs[i].file_count;
        status = files == 0 ? print_run(stage, i, NULL) : stream_run(stage, i, path);
        path += files;
    }
    return status;
}

static void release(struct stage *stage)
{
    digest_queue_free(stage->queue);
    free(stage->held);
    free(stage->block);
    line_release(&stage->line);
    sink_free(stage->sink);
    for (size_t i = 0; i < stage->path_count; i++)
        free(stage->paths[i]);
    free(stage->paths);
    free(stage->chosen);
    sheet_release(&stage->sheet);
}

int stage_read(int argc, char **argv)
{
    struct option_list runs = {0}, operands = {0};
    const struct option options[] = {{.name = "run",
                                      .type = OPTION_LIST,
                                      .unit = "NAME",
                                      .value = &runs,
                                      .help = "read this run of the sheet only (may repeat)"},
                                     {0}};
    const struct usage usage = {.stage = "read",
                                .operands = "SHEET [RECORDING...]",
                                .summary =
                                    "job sheet and recordings become one calibrated sample stream",
                                .options = options,
                                .least = 1,
                                .most = SIZE_MAX,
                                .details = "With recordings, the sheet's runs are ignored and each "
                                           "recording is a run of its own."};
    struct stage stage = {.line = LINE_INIT};
    int status = STATUS_DONE;
    int result = options_parse(&usage, argc, argv, &operands);
    if (result != OPTIONS_GO) {
        status = result == OPTIONS_STOP ? STATUS_DONE : STATUS_USAGE;
        goto out;
    }
    stage.audit = operands.count > 1;
    if (stage.audit && runs.count > 0) {
        message("--run is for the sheet's own runs, not with recordings: '%s'", operands.items[1]);
        status = STATUS_USAGE;
        goto out;
    }
    status = read_sheet(&stage, operands.items[0]);
    if (status == STATUS_DONE && stage.audit)
        status = adopt(&stage, (char *const *)&operands.items[1], operands.count - 1);
    stage.sheet.job.audit = stage.audit;
    if (status == STATUS_DONE)
        status = choose_runs(&stage, &runs);
    if (status == STATUS_DONE)
        status = list_paths(&stage);
    if (status == STATUS_DONE)
        remark_as_found(&stage);
    if (status == STATUS_DONE)
        status = open_stream(&stage);
    if (status == STATUS_DONE)
        status = stream_runs(&stage);
    if (status == STATUS_DONE)
        status = sink_finish(stage.sink);
    if (status == STATUS_DONE && stage.failed)
        status = STATUS_RECORDING;
    release(&stage);
out:
    option_list_release(&operands);
    option_list_release(&runs);
    return status;
}
