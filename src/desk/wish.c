#include "desk/wish.h"

#include <stdlib.h>
#include <string.h>

static char *join(const char *folder, const char *file)
{
    const bool plain = file[0] == '/' || !strcmp(folder, ".");
    char *path = malloc(strlen(folder) + strlen(file) + 2);
    if (!path)
        return NULL;
    strcpy(path, plain ? "" : folder);
    strcat(path, plain ? "" : "/");
    return strcat(path, file);
}

static int list_paths(struct wish *wish, const struct sheet *sheet, const struct sheet_run *run,
                      const char *path)
{
    const size_t count = path ? 1 : run->file_count;
    wish->paths = calloc(count + 1, sizeof *wish->paths);
    if (!wish->paths)
        return -1;
    for (size_t f = 0; f < count; f++) {
        wish->paths[f] = path ? join(".", path) : join(sheet->folder, run->files[f]);
        if (!wish->paths[f])
            return -1;
    }
    wish->recording.paths = wish->paths;
    wish->recording.path_count = count;
    return 0;
}

/* `run` is NULL for a recording that is none of the sheet's. True where some channel is column 1.
 */
static bool list_columns(struct wish *wish, const struct sheet *sheet, const struct sheet_run *run,
                         const bool *without)
{
    const struct job *job = &sheet->job;
    size_t count = 0;
    bool first = false;
    for (size_t s = 0; s < job->sensor_count; s++) {
        if (without && without[s])
            continue;
        const struct sheet_scale *scale = run ? &run->scales[s] : &sheet->scales[s];
        const char *channel = run ? run->channels[s] : job->sensors[s].channel;
        first = first || !strcmp(channel, "1");
        wish->sensors[count] = (int)s;
        wish->columns[count++] =
            (struct recording_column){.name = job->sensors[s].name,
                                      .channel = channel,
                                      .volts = scale->given,
                                      .si = scale->given ? scale->si_per_volt : scale->si_per_unit};
    }
    wish->tacho = job->has_tacho ? (int)count : -1;
    if (job->has_tacho) {
        first = first || !strcmp(job->tacho_channel, "1");
        wish->sensors[count] = -1;
        wish->columns[count++] = (struct recording_column){
            .name = "tacho", .channel = job->tacho_channel, .volts = true, .plain = true, .si = 1};
    }
    wish->recording.columns = wish->columns;
    wish->recording.column_count = count;
    return first;
}

int wish_init(struct wish *wish, const struct sheet *sheet, size_t run, const char *path)
{
    const struct sheet_run *sheet_run = path ? NULL : &sheet->runs[run];
    const struct sheet_layout *layout = path ? &sheet->layout : &sheet_run->layout;
    const bool *without = path ? NULL : sheet->job.runs[run].without;
    *wish = (struct wish){.tacho = -1};
    wish->columns = calloc(sheet->job.sensor_count + 1, sizeof *wish->columns);
    wish->sensors = calloc(sheet->job.sensor_count + 1, sizeof *wish->sensors);
    if (!wish->columns || !wish->sensors || list_paths(wish, sheet, sheet_run, path) != 0)
        return -1;
    const bool first = list_columns(wish, sheet, sheet_run, without);
    wish->recording.full_scale = layout->full_scale;
    wish->recording.rate_hz = layout->rate;
    wish->recording.csv = (struct csv_wish){.separator = layout->separator,
                                            .decimal = layout->decimal,
                                            .skip = layout->skip,
                                            .time_column = layout->time_column,
                                            .first_is_channel = first};
    return 0;
}

const char *wish_lacks_weight(const struct job *job)
{
    size_t runs = 0, weights = 0;
    for (size_t i = 0; i < job->run_count; i++) {
        runs += !job->runs[i].role[0];
        weights += job->runs[i].weight_count;
    }
    const bool lacks = job->plane_count > 0 && runs > 1 && weights == 0 && job->response_count == 0;
    return lacks ? job->planes[0].name : NULL;
}

void wish_release(struct wish *wish)
{
    for (size_t f = 0; wish->paths && f < wish->recording.path_count; f++)
        free(wish->paths[f]);
    free(wish->paths);
    free(wish->columns);
    free(wish->sensors);
    *wish = (struct wish){.tacho = -1};
}
